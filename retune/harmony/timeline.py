"""Score to slices: the grid of time that everything else is counted on.

Conventions
-----------
* Boundaries are the distinct onsets and releases of all notes, with the piece's start and end.
  Slice s lies between boundaries s and s + 1.
* Boundaries are exact `Fraction` quarter notes; `time` repeats them as float64 for arithmetic.
* Grace notes are in no slice, and the time they steal counts as held by the note before.
* Metric levels: 4 downbeat, 3 half bar, 2 beat or quarter, 1 half a quarter, 0 finer.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from math import lcm

import numpy as np

from retune.harmony.metre import metric_levels
from retune.harmony.model import Slice
from retune.harmony.neighbours import find_neighbours
from retune.harmony.states import Floats, Ints
from retune.pitch import Pitch
from retune.score.model import Score


@dataclass(frozen=True)
class Timeline:
    """Slices of a score, with the notes in them.

    Parameters
    ----------
    boundaries : tuple of Fraction, length slices + 1
    time : float64 array, shape (slices + 1,)
        The boundaries in quarter notes.
    level : int64 array, shape (slices + 1,)
        Metric level of each boundary.
    notes : int64 array, shape (analysed,)
        Index into `Score.notes` of each analysed note, in the order of the score.
    first, last : int64 arrays, shape (analysed,)
        Slices in which each analysed note sounds, last excluded.
    key, fifths : int64 arrays, shape (analysed,)
        MIDI key, and place of the spelling on the line of fifths.
    into, out : int64 arrays, shape (analysed,)
        Semitones from the note before and to the note after (see `neighbours`).
    """

    boundaries: tuple[Fraction, ...]
    time: Floats
    level: Ints
    notes: Ints
    first: Ints
    last: Ints
    key: Ints
    fifths: Ints
    into: Ints
    out: Ints

    @property
    def count(self) -> int:
        """Number of slices."""
        return len(self.boundaries) - 1


def make_timeline(score: Score) -> Timeline:
    """Cut a score at every onset and release.

    Times are compared as whole ticks of the least common denominator: a `Fraction` comparison
    costs a hundred times as much.
    """
    notes = [i for i, note in enumerate(score.notes) if not note.grace]
    onsets = [score.notes[i].analysed_onset for i in notes]
    ends = [score.notes[i].analysed_end for i in notes]
    end = max([score.end, *ends], default=Fraction(0))
    denominators = {time.denominator for time in (*onsets, *ends, end)}
    resolution = lcm(*denominators)
    steps = {d: resolution // d for d in denominators}
    starts = [t.numerator * steps[t.denominator] for t in onsets]
    stops = [t.numerator * steps[t.denominator] for t in ends]
    last_tick = end.numerator * steps[end.denominator]
    ticks = sorted({0, last_tick, *starts, *stops})
    place = {tick: i for i, tick in enumerate(ticks)}
    boundaries = tuple(Fraction(tick, resolution) for tick in ticks)
    time = np.array([tick / resolution for tick in ticks])
    first = np.array([place[tick] for tick in starts], dtype=np.int64)
    last = np.array([place[tick] for tick in stops], dtype=np.int64)
    part = np.array([score.notes[i].part for i in notes], dtype=np.int64)
    key, fifths = _pitches(score, notes)
    into, out = find_neighbours(part, key, first, last)
    return Timeline(
        boundaries=boundaries,
        time=time,
        level=metric_levels(score.bars, time),
        notes=np.array(notes, dtype=np.int64),
        first=first,
        last=last,
        key=key,
        fifths=fifths,
        into=into,
        out=out,
    )


def _pitches(score: Score, notes: list[int]) -> tuple[Ints, Ints]:
    """MIDI keys and places on the line of fifths; few pitches make up a piece."""
    known: dict[Pitch, tuple[int, int]] = {}
    found = []
    for i in notes:
        pitch = score.notes[i].pitch
        if pitch not in known:
            known[pitch] = (pitch.key, pitch.pitch_class.fifths)
        found.append(known[pitch])
    both = np.array(found, dtype=np.int64).reshape(-1, 2)
    return both[:, 0], both[:, 1]


def make_slices(score: Score, timeline: Timeline) -> tuple[Slice, ...]:
    """The slices as values, notes in part order and low to high in a part."""
    sounding: list[list[int]] = [[] for _ in range(timeline.count)]
    spans = sorted(
        zip(
            (score.notes[i].part for i in timeline.notes.tolist()),
            timeline.key.tolist(),
            timeline.notes.tolist(),
            timeline.first.tolist(),
            timeline.last.tolist(),
            strict=True,
        )
    )
    for _, _, note, first, last in spans:
        for index in range(first, last):
            sounding[index].append(note)
    boundaries = timeline.boundaries
    return tuple(
        Slice(i, boundaries[i], boundaries[i + 1] - boundaries[i], tuple(sounding[i]))
        for i in range(timeline.count)
    )
