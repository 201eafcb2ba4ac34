"""The tempo map of a piece, from metronome marks, tempo words and fermatas.

Conventions
-----------
* Tempo is in quarter notes a minute; times are quarter notes from the start as written.
* The tempo of a bar is the one that holds there as written, so that a repeat or a D.C. begins
  again in the tempo of its first bar.
* Tempo words count beats of the time signature: half notes in x/2, dotted quarters in 6/8, 9/8
  and 12/8, else quarter notes.
* rit. and accel. are steps of a quarter note each.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import accumulate, zip_longest
from math import ceil

from retune.errors import Weight
from retune.score.bars import Frame
from retune.score.fermatas import HeldSpan
from retune.score.ledger import Ledger
from retune.score.model import counted_beat
from retune.score.options import TempoAt
from retune.score.order import Step
from retune.score.pace import Pace
from retune.score.tempo import DEFAULT_QPM, TempoChange, TempoMap
from retune.score.tempo_words import TempoWord, Turn, metronome_in, tempo_word
from retune.written import Mark, MarkKind, WrittenScore

SLOWEST, FASTEST = Fraction(4), Fraction(2000)
"""Marks outside are taken for mistakes."""

RAMP_REACH = Fraction(16)
"""Quarter notes that rit. or accel. lasts at most where nothing ends it."""


@dataclass(frozen=True, slots=True)
class _Event:
    """Something that bears on the tempo, at a written time."""

    time: Fraction
    bar: int
    word: TempoWord


def tempo_map(
    written: WrittenScore,
    frames: Sequence[Frame],
    steps: Sequence[Step],
    fermatas: Sequence[tuple[HeldSpan, ...]],
    ledger: Ledger,
    pace: Pace,
    wished: Sequence[TempoAt] = (),
) -> TempoMap:
    """The tempo of the piece as played.

    Parameters
    ----------
    fermatas : sequence of tuples
        The stretched spans of each bar.
    wished : sequence of TempoAt
        Tempi that stand before those of the score.
    """
    starts = list(accumulate((frame.length for frame in frames), initial=Fraction(0)))
    if pace.beats is not None:
        curve = [(Fraction(0), pace.beats * _counted_beat(frames))]
    else:
        events = _events(written, frames, starts, ledger, wished)
        curve = _curve(events, starts, fermatas, ledger)
        curve = [(time, qpm * pace.share) for time, qpm in curve]
    bars = [
        list(_in_bar(curve, start, frame.length, spans))
        for start, frame, spans in zip(starts[:-1], frames, fermatas, strict=True)
    ]
    changes: list[TempoChange] = []
    onset = Fraction(0)
    for step in steps:
        for inside, qpm in bars[step.written]:
            if not changes or changes[-1].qpm != qpm:
                changes.append(TempoChange(onset + inside, qpm))
        onset += frames[step.written].length
    return TempoMap(tuple(changes)) if changes else TempoMap()


def _counted_beat(frames: Sequence[Frame]) -> Fraction:
    """The beat that is counted in the first full bar, in quarter notes."""
    full = next((frame for frame in frames if frame.begins == 0), frames[0])
    return counted_beat(full.metre)


def _events(
    written: WrittenScore,
    frames: Sequence[Frame],
    starts: Sequence[Fraction],
    ledger: Ledger,
    wished: Sequence[TempoAt],
) -> list[_Event]:
    """Tempo events of all parts in order, one at a time; numbers win over words."""
    numbers: dict[Fraction, _Event] = {}
    words: dict[Fraction, _Event] = {}
    for part in written.parts:
        for frame, bar in zip(frames, part.bars, strict=False):
            for mark in bar.marks:
                time = starts[frame.index] + mark.onset
                qpm = _number(mark)
                if qpm is not None:
                    _add_number(numbers, time, frame, qpm, ledger)
                elif mark.kind is MarkKind.WORDS and (word := tempo_word(str(mark.value or ""))):
                    scaled = _in_quarters(word, frame)
                    words.setdefault(time, _Event(time, frame.index, scaled))
    for one in wished:
        time, frame = starts[one.written] + one.inside, frames[one.written]
        qpm = one.beats * counted_beat(frame.metre)
        numbers[time] = _Event(time, frame.index, TempoWord(Turn.SET, qpm))
        words.pop(time, None)
    merged = {**words, **numbers}
    for time in words.keys() & numbers.keys():
        if words[time].word.turn is Turn.RAMP:
            # A metronome mark where a rit. begins says where it begins from.
            merged[time] = numbers[time]
            merged[time + Fraction(1, 1024)] = words[time]
    return [merged[time] for time in sorted(merged)]


def _number(mark: Mark) -> Fraction | None:
    if mark.kind is MarkKind.TEMPO and isinstance(mark.value, (int, Fraction)):
        return Fraction(mark.value)
    return metronome_in(str(mark.value)) if mark.kind is MarkKind.WORDS else None


def _add_number(
    numbers: dict[Fraction, _Event], time: Fraction, frame: Frame, qpm: Fraction, ledger: Ledger
) -> None:
    beat = frame.beat(Fraction(0))
    if not SLOWEST <= qpm <= FASTEST:
        what = f"tempo of {float(qpm):g} quarter notes a minute was not believed"
        ledger.add(Weight.LOSS, what, bar=frame.index, beat=beat)
        return
    known = numbers.setdefault(time, _Event(time, frame.index, TempoWord(Turn.SET, qpm)))
    if known.word.value != qpm:
        what = "the parts give different tempi; the first one was taken"
        ledger.add(Weight.DOUBT, what, bar=frame.index, beat=beat)


def _in_quarters(word: TempoWord, frame: Frame) -> TempoWord:
    """A word's beats a minute as quarter notes a minute."""
    if word.turn is not Turn.SET:
        return word
    beats, unit = frame.metre
    if unit >= 8 and beats > 3 and beats % 3 == 0:
        quarters = Fraction(12, unit)
    else:
        quarters = Fraction(4, unit) if unit < 4 else Fraction(1)
    return TempoWord(Turn.SET, word.value * quarters)


_Curve = list[tuple[Fraction, Fraction]]
"""Written times and the quarter notes a minute from there on; times ascend from 0."""


def _curve(
    events: Sequence[_Event],
    starts: Sequence[Fraction],
    fermatas: Sequence[tuple[HeldSpan, ...]],
    ledger: Ledger,
) -> _Curve:
    first = next((event for event in events if event.word.turn is Turn.SET), None)
    opening = first.word.value if first is not None else DEFAULT_QPM
    if first is None or first.time >= starts[-1]:
        what = f"no tempo given; {DEFAULT_QPM} quarter notes a minute were taken"
        ledger.add(Weight.NOTE, what)
    ends = [
        start + stop
        for start, spans in zip(starts[:-1], fermatas, strict=True)
        for _, stop, _ in spans
    ]
    curve: _Curve = [(Fraction(0), opening)]
    base = current = opening
    for event, following in zip_longest(events, events[1:]):
        word = event.word
        if word.turn is Turn.RAMP:
            ramp = _ramp(event, following, current, base, ends, starts[-1], ledger)
            curve.extend(ramp)
            current = ramp[-1][1]
            continue
        if word.turn is Turn.SHIFT:
            current *= word.value
        else:
            base = current = {Turn.SET: word.value, Turn.FIRST: opening}.get(word.turn, base)
        curve.append((event.time, current))
    return curve


def _ramp(
    event: _Event,
    following: _Event | None,
    current: Fraction,
    base: Fraction,
    fermata_ends: Sequence[Fraction],
    end: Fraction,
    ledger: Ledger,
) -> _Curve:
    """The steps of a rit. or accel.; the tempo comes back where nothing says what follows."""
    goal = current * event.word.value
    reach = min(event.time + RAMP_REACH, end)
    place = bisect_right(fermata_ends, event.time)
    if place < len(fermata_ends):
        reach = min(reach, fermata_ends[place])
    stop = reach
    if following is not None and following.time <= event.time + RAMP_REACH:
        stop = following.time
        if (
            following.word.turn is Turn.SET
            and (following.word.value - current) * (goal - current) > 0
        ):
            goal = following.word.value
    count = max(ceil(stop - event.time), 1)
    steps = [
        (event.time + index, current + (goal - current) * Fraction(index + 1, count))
        for index in range(count)
    ]
    if stop == reach and stop < end and (following is None or following.time > stop):
        what = "nothing ends this change of tempo; a tempo was assumed"
        ledger.add(Weight.NOTE, what, bar=event.bar)
        steps.append((stop, base))
    return steps


def _in_bar(
    curve: _Curve, start: Fraction, length: Fraction, spans: Sequence[HeldSpan]
) -> Iterator[tuple[Fraction, Fraction]]:
    """Tempo changes inside a bar from its start on, fermatas stretched."""
    first = max(bisect_right(curve, start, key=lambda entry: entry[0]) - 1, 0)
    inside = [(Fraction(0), curve[first][1])]
    for time, qpm in curve[first + 1 :]:
        if time >= start + length:
            break
        inside.append((time - start, qpm))
    cuts = sorted(
        {Fraction(0), *(time for time, _ in inside), *(t for span in spans for t in span[:2])}
    )
    for cut in cuts:
        if cut < length:
            qpm = inside[bisect_right(inside, cut, key=lambda entry: entry[0]) - 1][1]
            times = next((t for begin, stop, t in spans if begin <= cut < stop), Fraction(1))
            yield cut, qpm / times
