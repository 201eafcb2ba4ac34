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
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from retune.score.bars import Frame
from retune.written import Mark, MarkKind, WrittenNote, WrittenPart

DEFAULT_VELOCITY = 80

LEVELS: dict[str, int] = {
    "pppppp": 6, "ppppp": 12, "pppp": 20, "ppp": 32, "pp": 45, "p": 57, "mp": 69, "mf": 80,
    "f": 90, "ff": 103, "fff": 114, "ffff": 121, "fffff": 124, "ffffff": 127, "n": 4,
}  # fmt: skip

# Loud at one onset, then soft.
_LOUD_THEN: dict[str, tuple[int, int]] = {
    "fp": (LEVELS["f"], LEVELS["p"]),
    "sfp": (LEVELS["ff"], LEVELS["p"]),
    "sfpp": (LEVELS["ff"], LEVELS["pp"]),
    "sfzp": (LEVELS["ff"], LEVELS["p"]),
    "pf": (LEVELS["p"], LEVELS["f"]),
}
_STRESSES = frozenset({"sf", "sfz", "sffz", "fz", "rf", "rfz"})
STRESS = 22
"""How much louder sforzato makes a note."""

ACCENTS: dict[str, int] = {"accent": 12, "marcato": 18}

ONE_LEVEL = 12
"""How far a hairpin goes that leads to no dynamic."""

LOOK_AHEAD = 4.0
"""Quarter notes after a hairpin within which a dynamic is its goal."""

WORD_REACH = 16.0
"""Quarter notes that cresc. or dim. in words lasts at most."""

_GROWING = re.compile(r"\bcresc", re.I)
_FADING = re.compile(r"\b(decresc|dim\.|dimin|dim$|morendo|smorz|calando|perdendosi)", re.I)


@dataclass(frozen=True, slots=True)
class _Ramp:
    """From `start` on, `low` to `high` until `stop`, then `high`."""

    start: float
    first: float
    stop: float
    last: float

    def at(self, time: float) -> float:
        if time >= self.stop:
            return self.last
        return self.first + (self.last - self.first) * (time - self.start) / (
            self.stop - self.start
        )


@dataclass(frozen=True, slots=True)
class Loudness:
    """The dynamics of one staff, over the piece as written."""

    ramps: tuple[_Ramp, ...] = ()
    stresses: tuple[tuple[float, int], ...] = ()
    """Onsets with the velocity that their notes are raised to or by (negative: by)."""

    def velocity(self, note: WrittenNote, time: float) -> int:
        """The velocity of a note that begins at a written time, 1 to 127."""
        if note.dynamic is not None:
            return min(max(note.dynamic, 1), 127)
        place = bisect_right(self.ramps, time, key=lambda ramp: ramp.start) - 1
        level = self.ramps[place].at(time) if place >= 0 else float(DEFAULT_VELOCITY)
        if self.stresses:
            level = self._stressed(level, time)
        if note.marks:
            level += max((ACCENTS.get(mark, 0) for mark in note.marks), default=0)
        return min(max(round(level), 1), 127)

    def _stressed(self, level: float, time: float) -> float:
        place = bisect_right(self.stresses, time, key=lambda stress: stress[0]) - 1
        if place < 0 or self.stresses[place][0] != time:
            return level
        value = self.stresses[place][1]
        return level - value if value < 0 else float(value)


def loudness(part: WrittenPart, staff: int | None, frames: Sequence[Frame]) -> Loudness | None:
    """The dynamics of a staff of a part (None: of all its staves); None where it has none."""
    events = sorted(_events(part, staff, frames), key=lambda event: (event[0], event[2]))
    if not events:
        return None
    stresses = dict(_stresses(events))
    return Loudness(tuple(_ramps(events)), tuple(sorted(stresses.items())))


_Event = tuple[float, Mark, int]
"""Written time, mark, and its place among marks of one time: stops, dynamics, beginnings."""


def _events(part: WrittenPart, staff: int | None, frames: Sequence[Frame]) -> Iterable[_Event]:
    start = 0.0
    for bar, frame in zip(part.bars, frames, strict=False):
        for mark in bar.marks:
            if staff is None or mark.staff in (0, staff):
                rank = _rank(mark)
                if rank is not None:
                    yield start + float(mark.onset), mark, rank
        start += float(frame.length)


def _rank(mark: Mark) -> int | None:
    if mark.kind is MarkKind.HAIRPIN:
        return 0 if mark.value == "stop" else 2
    if mark.kind is MarkKind.DYNAMIC:
        return 1
    return 2 if mark.kind is MarkKind.WORDS and _direction(mark) else None


def _direction(mark: Mark) -> int:
    """1 for growing, -1 for fading, 0 for neither."""
    text = str(mark.value or "")
    if mark.kind is MarkKind.HAIRPIN:
        return {"crescendo": 1, "diminuendo": -1}.get(text, 0)
    if _GROWING.search(text) and not _FADING.search(text):
        return 1
    return -1 if _FADING.search(text) else 0


def _level(mark: Mark) -> int | None:
    """The level that holds from a dynamic on; None for a mere stress or another sign."""
    if mark.kind is not MarkKind.DYNAMIC:
        return None
    if isinstance(mark.value, int):
        return min(max(mark.value, 1), 127)
    text = str(mark.value)
    return _LOUD_THEN[text][1] if text in _LOUD_THEN else LEVELS.get(text)


def _stresses(events: Sequence[_Event]) -> Iterable[tuple[float, int]]:
    for time, mark, _ in events:
        if mark.kind is MarkKind.DYNAMIC:
            if mark.value in _LOUD_THEN:
                yield time, _LOUD_THEN[str(mark.value)][0]
            elif mark.value in _STRESSES:
                yield time, -STRESS


def _ramps(events: Sequence[_Event]) -> Iterable[_Ramp]:
    level = float(DEFAULT_VELOCITY)
    for place, (time, mark, _) in enumerate(events):
        fixed = _level(mark)
        if fixed is not None:
            level = float(fixed)
            yield _Ramp(time, level, time, level)
            continue
        direction = _direction(mark)
        if direction:
            stop, goal = _goal(events, place, level, direction)
            if stop > time:
                yield _Ramp(time, level, stop, goal)
                level = goal


def _goal(
    events: Sequence[_Event], place: int, level: float, direction: int
) -> tuple[float, float]:
    """When and at what level the hairpin or word at a place in the list ends."""
    time, mark, _ = events[place]
    in_words = mark.kind is MarkKind.WORDS
    stop: float | None = None
    for later, other, rank in events[place + 1 :]:
        if later > (stop + LOOK_AHEAD if stop is not None else time + 4 * WORD_REACH):
            break
        fixed = _level(other)
        if fixed is not None:
            end = later if stop is None else stop
            fits = (fixed - level) * direction > 0
            if in_words and later > time + WORD_REACH:
                break
            return end, float(fixed) if fits else _one_level_on(level, direction)
        if other.kind is MarkKind.HAIRPIN and stop is None and not (in_words and rank == 0):
            stop = later
        elif rank == 2 and later > time:
            stop = later if stop is None else stop
            break
    if stop is None:
        stop = time + WORD_REACH / 2
    return stop, _one_level_on(level, direction)


def _one_level_on(level: float, direction: int) -> float:
    return min(max(level + direction * ONE_LEVEL, 1.0), 127.0)


def start_times(frames: Sequence[Frame]) -> list[float]:
    """Where each bar starts as written, in quarter notes."""
    starts = [0.0]
    for frame in frames:
        starts.append(starts[-1] + float(frame.length))
    return starts
