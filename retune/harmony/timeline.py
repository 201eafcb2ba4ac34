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
from retune.harmony.states import Floats, Ints
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
    """

    boundaries: tuple[Fraction, ...]
    time: Floats
    level: Ints
    notes: Ints
    first: Ints
    last: Ints

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
    onsets = [score.notes[i].onset for i in notes]
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
    return Timeline(
        boundaries=boundaries,
        time=time,
        level=metric_levels(score.bars, time),
        notes=np.array(notes, dtype=np.int64),
        first=np.array([place[tick] for tick in starts], dtype=np.int64),
        last=np.array([place[tick] for tick in stops], dtype=np.int64),
    )


def make_slices(score: Score, timeline: Timeline) -> tuple[Slice, ...]:
    """The slices as values, notes in part order and low to high in a part."""
    sounding: list[list[int]] = [[] for _ in range(timeline.count)]
    spans = sorted(
        zip(timeline.notes.tolist(), timeline.first.tolist(), timeline.last.tolist(), strict=True),
        key=lambda span: (score.notes[span[0]].part, score.notes[span[0]].pitch.key, span[0]),
    )
    for note, first, last in spans:
        for index in range(first, last):
            sounding[index].append(note)
    boundaries = timeline.boundaries
    return tuple(
        Slice(i, boundaries[i], boundaries[i + 1] - boundaries[i], tuple(sounding[i]))
        for i in range(timeline.count)
    )
