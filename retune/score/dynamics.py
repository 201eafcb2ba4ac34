"""Dynamics and hairpins to velocities.

Conventions
-----------
* Velocities run from 1 to 127; between the ends of a hairpin they change in a straight line.
* Times are quarter notes from the start as written; a repeat begins as loud as it is written.
* f is 90, as MusicXML defines a forte; the other levels are common practice, no source.
"""

from __future__ import annotations

import re
from bisect import bisect_right
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from enum import IntEnum

from retune.score.bars import Frame
from retune.score.lines import Line
from retune.score.model import PartKind
from retune.written import Mark, MarkKind, WrittenNote, WrittenPart, WrittenScore

DEFAULT_VELOCITY = 80

LEVELS: dict[str, int] = {
    "pppppp": 6, "ppppp": 12, "pppp": 20, "ppp": 32, "pp": 45, "p": 57, "mp": 69, "mf": 80,
    "f": 90, "ff": 103, "fff": 114, "ffff": 121, "fffff": 124, "ffffff": 127, "n": 4,
}  # fmt: skip

# Loud for the notes of one onset, then soft (or the other way about).
_AT_ONCE_THEN: dict[str, tuple[str, str]] = {
    "fp": ("f", "p"), "sfp": ("ff", "p"), "sfpp": ("ff", "pp"), "sfzp": ("ff", "p"),
    "pf": ("p", "f"),
}  # fmt: skip
_STRESSES = frozenset({"sf", "sfz", "sffz", "fz", "rf", "rfz"})
STRESS = 22
"""How much louder a sforzato makes a note."""

ACCENTS: dict[str, int] = {"accent": 12, "marcato": 18}

ONE_LEVEL = 12
"""How far a hairpin goes that leads to no dynamic."""

LOOK_AHEAD = 4.0
"""Quarter notes after a hairpin within which a dynamic is its goal."""

WORD_REACH = 16.0
"""Quarter notes within which cresc. or dim. in words finds its goal."""

OPEN_LENGTH = 8.0
"""Quarter notes that a hairpin or word lasts which nothing ends."""

_GROWING = re.compile(r"\bcresc", re.IGNORECASE)
_FADING = re.compile(
    r"\b(decresc|dim\.|dim$|dimin|morendo|smorz|calando|perdendosi)", re.IGNORECASE
)


@dataclass(frozen=True, slots=True)
class _Ramp:
    """From `start` on, `first` to `last` until `stop`, then `last`."""

    start: float
    first: float
    stop: float
    last: float

    def at(self, time: float) -> float:
        if time >= self.stop:
            return self.last
        done = (time - self.start) / (self.stop - self.start)
        return self.first + (self.last - self.first) * done


@dataclass(frozen=True, slots=True)
class Loudness:
    """The dynamics of one staff, over the piece as written.

    `starts` says where each ramp starts; `raised` holds, by onset, how much louder notes are,
    `instead` a level that counts for the notes of that onset alone.
    """

    ramps: tuple[_Ramp, ...] = ()
    starts: tuple[float, ...] = ()
    raised: Mapping[float, int] = field(default_factory=dict)
    instead: Mapping[float, int] = field(default_factory=dict)

    def velocity(self, note: WrittenNote, time: float) -> int:
        """The velocity of a note that begins at a written time, 1 to 127."""
        if note.dynamic is not None:
            return min(max(note.dynamic, 1), 127)
        place = bisect_right(self.starts, time) - 1
        level = self.ramps[place].at(time) if place >= 0 else float(DEFAULT_VELOCITY)
        level = self.instead.get(time, level) + self.raised.get(time, 0)
        if note.marks:
            level += max(ACCENTS.get(mark, 0) for mark in note.marks)
        return min(max(round(level), 1), 127)


def loudness_of_lines(
    written: WrittenScore, frames: Sequence[Frame], lines: Sequence[Line]
) -> list[Loudness]:
    """The dynamics of each line: its own, else those of its part, else of the nearest voice."""
    own = [
        loudness(written.parts[line.written], line.staff if line.whole_staff else None, frames)
        for line in lines
    ]
    of_parts = {part: loudness(written.parts[part], None, frames) for part in _parts(lines)}
    voices = [place for place, line in enumerate(lines) if line.kind is PartKind.VOICE]
    found = []
    for place, line in enumerate(lines):
        neighbours = sorted(voices, key=lambda other: (abs(other - place), other))
        choices = (own[place], of_parts[line.written], *(own[other] for other in neighbours))
        found.append(next((level for level in choices if level is not None), Loudness()))
    return found


def _parts(lines: Iterable[Line]) -> set[int]:
    return {line.written for line in lines}


def loudness(part: WrittenPart, staff: int | None, frames: Sequence[Frame]) -> Loudness | None:
    """The dynamics of a staff of a part (None: of all its staves); None where it has none."""
    marks = list(_marks(part, staff, frames))
    events = sorted(
        (event for time, mark in marks if (event := _event(time, mark)) is not None),
        key=lambda event: (event.time, event.kind),
    )
    if not events:
        return None
    ramps = tuple(_ramps(events))
    dynamics = [(time, str(m.value)) for time, m in marks if m.kind is MarkKind.DYNAMIC]
    return Loudness(
        ramps,
        tuple(ramp.start for ramp in ramps),
        {time: STRESS for time, text in dynamics if text in _STRESSES},
        {time: LEVELS[_AT_ONCE_THEN[text][0]] for time, text in dynamics if text in _AT_ONCE_THEN},
    )


def start_times(frames: Sequence[Frame]) -> list[float]:
    """Where each bar starts as written, in quarter notes."""
    starts = [0.0]
    for frame in frames:
        starts.append(starts[-1] + float(frame.length))
    return starts


def _marks(
    part: WrittenPart, staff: int | None, frames: Sequence[Frame]
) -> Iterator[tuple[float, Mark]]:
    for bar, start in zip(part.bars, start_times(frames), strict=False):
        for mark in bar.marks:
            if staff is None or mark.staff in (0, staff):
                yield start + float(mark.onset), mark


class _Kind(IntEnum):
    """Kinds of events, in the order in which they count at one time."""

    STOP = 0
    LEVEL = 1
    STRESS = 2
    HAIRPIN = 3
    WORD = 4


@dataclass(frozen=True, slots=True)
class _Event:
    """A dynamic sign: `value` is a level, or 1 for growing and -1 for fading."""

    time: float
    kind: _Kind
    value: int = 0


def _event(time: float, mark: Mark) -> _Event | None:
    if mark.kind is MarkKind.HAIRPIN:
        if mark.value == "stop":
            return _Event(time, _Kind.STOP)
        return _Event(time, _Kind.HAIRPIN, 1 if mark.value == "crescendo" else -1)
    if mark.kind is MarkKind.DYNAMIC:
        return _dynamic(time, mark.value)
    if mark.kind is MarkKind.WORDS:
        text = str(mark.value or "")
        if _FADING.search(text):
            return _Event(time, _Kind.WORD, -1)
        if _GROWING.search(text):
            return _Event(time, _Kind.WORD, 1)
    return None


def _dynamic(time: float, value: object) -> _Event | None:
    if isinstance(value, int):
        return _Event(time, _Kind.LEVEL, min(max(value, 1), 127))
    text = str(value)
    text = _AT_ONCE_THEN[text][1] if text in _AT_ONCE_THEN else text
    if text in LEVELS:
        return _Event(time, _Kind.LEVEL, LEVELS[text])
    return _Event(time, _Kind.STRESS) if text in _STRESSES else None


def _ramps(events: Sequence[_Event]) -> Iterator[_Ramp]:
    level = float(DEFAULT_VELOCITY)
    for place, event in enumerate(events):
        if event.kind is _Kind.LEVEL:
            level = float(event.value)
            yield _Ramp(event.time, level, event.time, level)
        elif event.kind in (_Kind.HAIRPIN, _Kind.WORD):
            stop, goal = _goal(events, place, level)
            yield _Ramp(event.time, level, stop, goal)
            level = goal


def _goal(events: Sequence[_Event], place: int, level: float) -> tuple[float, float]:
    """When, and at what level, the hairpin or word at a place in the list ends."""
    event = events[place]
    default = min(max(level + event.value * ONE_LEVEL, 1.0), 127.0)
    ending = _ending(events, place)
    if ending is None:
        return event.time + OPEN_LENGTH, default
    stop = events[ending].time
    for later in events[ending:]:
        if later.time > stop + LOOK_AHEAD or later.kind in (_Kind.HAIRPIN, _Kind.WORD):
            break
        if later.kind is _Kind.LEVEL:
            fits = (later.value - level) * event.value > 0
            return stop, float(later.value) if fits else default
    return stop, default


def _ending(events: Sequence[_Event], place: int) -> int | None:
    """The place of what ends a hairpin or word; None where nothing does."""
    event = events[place]
    for later in range(place + 1, len(events)):
        candidate = events[later]
        if event.kind is _Kind.WORD and candidate.time > event.time + WORD_REACH:
            return None
        if candidate.time <= event.time or candidate.kind is _Kind.STRESS:
            continue
        if candidate.kind is not _Kind.STOP or event.kind is _Kind.HAIRPIN:
            return later
    return None
