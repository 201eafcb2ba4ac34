"""From notes to phrases: what is sung in one breath, and where each note begins and ends.

Conventions
-----------
* Times are whole samples from the start of the stem; heights are log2 of the frequency in Hz.
* Lengths in seconds below are our choice, from common practice, no source.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace

from retune.tuning.model import TunedNote, TunedScore
from retune.voice.curves import Curve

BREATH_SECONDS = 0.25
"""A breath takes this much from the end of a note, but no more than a quarter of it."""

GAP_SECONDS = 0.025
"""Shorter gaps than this are no rests: the line goes on."""

SHORTEST_SECONDS = 0.005
"""What is shorter cannot sound without a click, and does not."""

SHORTEST_STACCATO = 0.08

GLIDE_SECONDS = 0.04
"""A held note moves in this time, or in half of the stretch at its new height."""

_BREATHS = frozenset({"breath", "caesura", "fermata"})
_SHORTENED = {"staccatissimo": 0.45, "staccato": 0.6}
_PORTATO = 0.8


@dataclass(frozen=True, slots=True)
class Sung:
    """A note as it is sung.

    Parameters
    ----------
    start, stop : int
        Samples.
    path : tuple of (int, float)
        From when on the note has which height; the first entry is at `start`.
    place : int
        The note's place in the tuned score.
    """

    start: int
    stop: int
    path: tuple[tuple[int, float], ...]
    velocity: int
    key: int
    syllable: bool
    place: int

    @property
    def length(self) -> int:
        """Samples."""
        return self.stop - self.start

    @property
    def first_length(self) -> int:
        """Samples of the first height."""
        return (self.path[1][0] if len(self.path) > 1 else self.stop) - self.start

    @property
    def last_length(self) -> int:
        """Samples of the last height."""
        return max(self.stop - self.path[-1][0], 0)


Placed = tuple[int, TunedNote]
"""A note with its place in the tuned score."""


def notes_of(tuned: TunedScore, part: int) -> list[Placed]:
    """The notes of a part, in order."""
    return [(place, one) for place, one in enumerate(tuned.notes) if one.note.part == part]


def sounding(tuned: TunedScore, place: int, one: TunedNote, rate: int) -> Sung | None:
    """A note at its full written length; None where it is too short to sound."""
    note = one.note
    start = round(tuned.seconds(note.onset) * rate)
    stop = round(tuned.seconds(note.end) * rate)
    if stop - start < SHORTEST_SECONDS * rate:
        return None
    path: list[tuple[int, float]] = []
    for segment in one.segments:
        height = math.log2(tuned.hz(one, segment))
        if not path or height != path[-1][1]:
            path.append((round(tuned.seconds(segment.onset) * rate), height))
    return Sung(start, stop, tuple(path), note.velocity, note.pitch.key, bool(note.lyric), place)


def phrases(tuned: TunedScore, notes: Iterable[Placed], rate: int) -> Iterator[list[Sung]]:
    """What the notes of a part are sung in, breath by breath, each line of a divided part for
    itself."""
    for line in _lines(notes):
        phrase: list[Sung] = []
        for index, (place, one) in enumerate(line):
            sung = sounding(tuned, place, one, rate)
            if sung is None:
                continue
            following = line[index + 1][1] if index + 1 < len(line) else None
            until = None if following is None else round(tuned.seconds(following.note.onset) * rate)
            sung, goes_on = _articulated(sung, one.note.marks, until, rate)
            phrase.append(sung)
            if not goes_on:
                yield phrase
                phrase = []
        if phrase:
            yield phrase


def _lines(notes: Iterable[Placed]) -> list[list[Placed]]:
    """Notes that overlap go into lines of their own, each to the line that is nearest in pitch."""
    lines: list[list[Placed]] = []
    for placed in notes:
        note = placed[1].note
        free = [line for line in lines if line[-1][1].note.end <= note.onset]
        if free:
            joined = [line for line in free if line[-1][1].note.end == note.onset] or free
            min(joined, key=lambda line: abs(line[-1][1].note.pitch.key - note.pitch.key)).append(
                placed
            )
        else:
            lines.append([placed])
    return lines


def _articulated(
    sung: Sung, marks: frozenset[str], until: int | None, rate: int
) -> tuple[Sung, bool]:
    """The note as its marks have it, and whether the next, at `until`, is in the same breath."""
    follows = until is not None and until - sung.stop < GAP_SECONDS * rate
    short = next((share for mark, share in _SHORTENED.items() if mark in marks), 1.0)
    if short < 1.0:
        share = _PORTATO if "tenuto" in marks else short
        length = max(round(sung.length * share), round(SHORTEST_STACCATO * rate))
        return _until(sung, sung.start + min(length, sung.length)), False
    if not follows:
        return sung, False
    assert until is not None
    if marks & _BREATHS:
        breath = min(round(BREATH_SECONDS * rate), sung.length // 4)
        return _until(sung, min(sung.stop, until) - breath), False
    return _until(sung, until), True


def _until(sung: Sung, stop: int) -> Sung:
    path = tuple(step for step in sung.path if step[0] < stop)
    return replace(sung, stop=stop, path=path)


def median_key(notes: Sequence[Placed]) -> float:
    """The median key of notes, by count; middle C where there are none."""
    keys = sorted(one.note.pitch.key for _, one in notes)
    if not keys:
        return 60.0
    return 0.5 * (keys[(len(keys) - 1) // 2] + keys[len(keys) // 2])


def glide(pitch: Curve, sung: Sung, rate: int) -> None:
    """Add the moves of a held note to a curve of heights."""
    for place in range(1, len(sung.path)):
        at, height = sung.path[place]
        end = sung.path[place + 1][0] if place + 1 < len(sung.path) else sung.stop
        pitch.to(at, sung.path[place - 1][1])
        pitch.to(at + min(round(GLIDE_SECONDS * rate), (end - at) // 2), height)
