"""ABC music while it is read, and the bars it becomes.

Conventions
-----------
* Lengths and onsets are `Fraction` quarter notes.
* Pitches of drafts are as written; `shift` semitones lead to the sounding pitch.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field, replace
from fractions import Fraction

from retune.errors import LimitError
from retune.pitch import Pitch, PitchClass
from retune.written import (
    Mark,
    MarkKind,
    MarkValue,
    WrittenBar,
    WrittenLyric,
    WrittenNote,
    WrittenRest,
)

MOST_BARS = 100_000
"""So many bars in one voice are taken for a damaged file."""

# A bar longer than so many full ones is a stretch without bar lines.
_STRETCH = 2


def too_many_bars() -> LimitError:
    """The error for more than `MOST_BARS`."""
    return LimitError(f"the tune has more than {MOST_BARS} bars")


@dataclass
class Event:
    """A note, chord (pitches) or rest (none), with its length; grace notes have none."""

    length: Fraction
    pitches: list[Pitch] = field(default_factory=list)
    tied: set[int] = field(default_factory=set)
    stops: set[int] = field(default_factory=set)
    hidden: bool = False
    grace: bool = False
    signs: set[str] = field(default_factory=set)
    lyrics: list[WrittenLyric] = field(default_factory=list)


@dataclass
class BarDraft:
    """A bar while it is read; marks stand before an event, counted from 0."""

    events: list[Event] = field(default_factory=list)
    marks: list[tuple[int, MarkKind, MarkValue]] = field(default_factory=list)
    metre: tuple[int, int] | None = None
    key: tuple[int, str | None] | None = None
    repeat_start: bool = False
    repeat_end: int = 0
    ending: tuple[int, ...] = ()
    ending_stop: bool = False

    @property
    def length(self) -> Fraction:
        """Quarter notes of all events."""
        return sum((event.length for event in self.events), Fraction(0))


def bar_length(metre: tuple[int, int]) -> Fraction:
    """Quarter notes of a full bar."""
    return Fraction(4 * metre[0], metre[1])


def in_bars(bars: Sequence[BarDraft]) -> list[BarDraft]:
    """The bars that hold anything; long stretches without bar lines are cut up by the metre.

    Raises `LimitError` for more than `MOST_BARS`.
    """
    cut: list[BarDraft] = []
    metre: tuple[int, int] | None = None
    for bar in bars:
        metre = bar.metre or metre
        if metre and bar.length > _STRETCH * bar_length(metre):
            cut.extend(_cut(bar, bar_length(metre)))
        elif bar.events:
            cut.append(bar)
    return cut


def _cut(bar: BarDraft, length: Fraction) -> list[BarDraft]:
    if bar.length > MOST_BARS * length:
        raise too_many_bars()
    cut = [replace(bar, events=[], marks=[], repeat_end=0, ending_stop=False)]
    marks = sorted(bar.marks, key=lambda mark: mark[0])
    for place, event in enumerate(bar.events):
        if cut[-1].length == length:
            cut.append(BarDraft())
        while marks and marks[0][0] == place:
            _, kind, value = marks.pop(0)
            cut[-1].marks.append((len(cut[-1].events), kind, value))
        left = event
        while left.length > length - cut[-1].length:
            head, left = _split(left, length - cut[-1].length)
            cut[-1].events.append(head)
            cut.append(BarDraft())
        cut[-1].events.append(left)
    cut[-1].marks += [(len(cut[-1].events), kind, value) for _, kind, value in marks]
    cut[-1].repeat_end, cut[-1].ending_stop = bar.repeat_end, bar.ending_stop
    return cut


def _split(event: Event, length: Fraction) -> tuple[Event, Event]:
    """An event in two, tied; words go with the first, signs with the second."""
    every = set(range(len(event.pitches)))
    head = replace(event, length=length, tied=every, signs=set())
    return head, replace(event, length=event.length - length, stops=every, lyrics=[])


def written_bars(bars: Sequence[BarDraft], shift: int, voice: int) -> tuple[WrittenBar, ...]:
    """The bars of one voice; `voice` makes its sources unique in the score."""
    written: list[WrittenBar] = []
    heads = 0
    metre: tuple[int, int] | None = None
    for bar, (number, implicit) in zip(bars, _numbers(bars), strict=True):
        metre = bar.metre or metre
        notes: list[WrittenNote] = []
        rests: list[WrittenRest] = []
        onset = Fraction(0)
        onsets = [onset]
        for event in bar.events:
            if not event.pitches:
                signs = frozenset(event.signs)
                rests.append(WrittenRest(onset, event.length, hidden=event.hidden, marks=signs))
            for place, pitch in enumerate(event.pitches):
                heads += 1
                notes.append(
                    WrittenNote(
                        onset,
                        event.length,
                        transposed(pitch, shift),
                        tie_start=place in event.tied,
                        tie_stop=place in event.stops,
                        grace=event.grace,
                        lyrics=() if place else tuple(event.lyrics),
                        marks=frozenset(event.signs),
                        source=f"{voice}.{heads}",
                    )
                )
            onset += event.length
            onsets.append(onset)
        written.append(
            WrittenBar(
                number,
                onset,
                tuple(notes),
                tuple(rests),
                tuple(Mark(kind, onsets[place], value) for place, kind, value in bar.marks),
                implicit=implicit,
                metre=bar.metre,
                key=_transposed_key(bar.key, shift),
                repeat_start=bar.repeat_start,
                repeat_end=bar.repeat_end,
                ending=bar.ending,
                ending_stop=bar.ending_stop,
            )
        )
    return tuple(written)


def _numbers(bars: Sequence[BarDraft]) -> Iterator[tuple[str, bool]]:
    """Bar numbers: a pick-up is 0, and the second part of a bar goes by the first part's."""
    number, room, metre = 0, Fraction(0), None
    for place, bar in enumerate(bars):
        metre = bar.metre or metre
        full = bar_length(metre) if metre else bar.length
        continues = bool(place) and bar.length == room
        if place == 0 and bar.length < full:
            yield "0", True
            continue
        number += not continues
        yield str(number), continues
        room = full - bar.length if bar.length < full and not continues else Fraction(0)


def _fifths_of(shift: int) -> int:
    """Steps along the line of fifths of a transposition, whole octaves being none."""
    return (7 * shift + 6) % 12 - 6


def transposed(pitch: Pitch, shift: int) -> Pitch:
    """A pitch moved by semitones, spelled as near as may be."""
    spelled = PitchClass.from_fifths(pitch.pitch_class.fifths + _fifths_of(shift))
    return Pitch.at_key(pitch.key + shift, spelled)


def _transposed_key(
    key: tuple[int, str | None] | None, shift: int
) -> tuple[int, str | None] | None:
    return None if key is None else (key[0] + _fifths_of(shift), key[1])
