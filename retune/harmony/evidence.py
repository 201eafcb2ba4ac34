"""What the segmentation weighs: counts of tones, basses, accents, per slice.

Conventions
-----------
* Pitch classes run along axes of length 12, C = 0.
* Durations are quarter notes; `held` adds up over voices, so a doubled tone counts twice.
* A slice where nothing sounds has bass -1 and attack 0.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from retune.harmony.fragments import cut_notes
from retune.harmony.metre import TOLERANCE, grid_points, metric_levels
from retune.harmony.model import Quality
from retune.harmony.naming import FIFTHS_OF_INTERVAL
from retune.harmony.states import (
    QUALITIES,
    ROOTS,
    STATES,
    TONES,
    Bytes,
    Floats,
    Ints,
)
from retune.harmony.timeline import Timeline
from retune.harmony.written_symbols import read_symbols
from retune.score.model import Score

NEARBY = 8.0
"""Quarter notes to each side that count as the surroundings of a slice."""
_UNHEARD = 99
"""Place on the line of fifths of a pitch class that does not sound."""


@dataclass(frozen=True)
class Evidence:
    """Everything the score of a segment is made from.

    Parameters
    ----------
    time : float64 array, shape (n + 1,)
        Slice boundaries in quarter notes.
    level : int64 array, shape (n + 1,)
        Metric level of the boundaries.
    inner : int64 array, shape (n,)
        Strongest level of a grid point strictly inside each slice, 0 without one.
    attack : float64 array, shape (n,)
        Share of the sounding notes that begin with the slice.
    bass : int64 array, shape (n,)
        Pitch class of the lowest note, -1 in silence.
    held, begun : float64 arrays, shape (n, 12)
        Quarter notes of sounding voices, and pieces that begin, by pitch class.
    sounding : float64 array, shape (n, 12)
        1 where a pitch class sounds.
    profile : float64 array, shape (n, 12)
        Share of each pitch class in the sounding time around the slice.
    misspelt : int8 array, shape (n, 120)
        Tones of augmented and diminished seventh chords that the notation spells as another
        interval above the root.
    symbols : int8 array, shape (n, 120)
        1 for the root of the chord symbol in force, 2 for its root and quality.
    cells, fifths, approaches : int64 arrays, shape (incidences,)
        12 * slice + pitch class, place of the spelling on the line of fifths, and approach, of
        every piece in every slice it touches.
    beginning : int64 array
        Places in `cells` of the incidences that begin a piece.
    """

    time: Floats
    level: Ints
    inner: Ints
    attack: Floats
    bass: Ints
    held: Floats
    begun: Floats
    sounding: Floats
    profile: Floats
    misspelt: Bytes
    symbols: Bytes
    cells: Ints
    fifths: Ints
    approaches: Ints
    beginning: Ints

    @property
    def count(self) -> int:
        """Number of slices."""
        return len(self.bass)

    @property
    def length(self) -> Floats:
        """Length of each slice in quarter notes, shape (n,)."""
        return np.diff(self.time)

    def spread(self, cost_begin: Floats, cost_quarter: Floats) -> Floats:
        """Costs per approach summed into slices and pitch classes, shape (n, 12)."""
        begin = self.cells[self.beginning]
        size = self.count * ROOTS
        counted = np.bincount(begin, cost_begin[self.approaches[self.beginning]], size)
        lengths = self.length[self.cells // ROOTS]
        lasting = np.bincount(self.cells, cost_quarter[self.approaches] * lengths, size)
        total = np.asarray(counted + lasting, dtype=np.float64)
        return total.reshape(-1, ROOTS)


def gather_evidence(score: Score, timeline: Timeline) -> Evidence:
    """Count what sounds in every slice."""
    count = timeline.count
    pieces = cut_notes(score, timeline)
    spans = pieces.last - pieces.first
    piece = np.repeat(np.arange(len(spans)), spans)
    begins = np.cumsum(spans) - spans
    slices = pieces.first[piece] + np.arange(len(piece)) - begins[piece]
    note = pieces.note[piece]
    cells = slices * ROOTS + timeline.key[note] % 12
    voices = _count(cells, count)
    total = voices.sum(axis=1)
    lowest = np.full(count, np.iinfo(np.int64).max)
    np.minimum.at(lowest, slices, timeline.key[note])
    fifths = np.full(count * ROOTS, _UNHEARD)
    fifths[cells] = timeline.fifths[note]
    onsets = np.bincount(timeline.first, minlength=count)[:count]
    held = voices * np.diff(timeline.time)[:, None]
    return Evidence(
        time=timeline.time,
        level=timeline.level,
        inner=_inner_levels(score, timeline),
        attack=onsets / np.maximum(total, 1.0),
        bass=np.where(total > 0, lowest % 12, -1),
        held=held,
        begun=_count(cells[begins], count),
        sounding=(voices > 0).astype(np.float64),
        profile=_profile(held, timeline.time),
        misspelt=_misspelt(fifths.reshape(-1, ROOTS)),
        symbols=read_symbols(score.chord_symbols, timeline.time),
        cells=cells,
        fifths=timeline.fifths[note],
        approaches=pieces.approach[piece],
        beginning=begins,
    )


def _count(cells: Ints, count: int) -> Floats:
    """How often each slice and pitch class occurs, shape (n, 12)."""
    return np.bincount(cells, minlength=count * ROOTS).reshape(-1, ROOTS).astype(np.float64)


def _inner_levels(score: Score, timeline: Timeline) -> Ints:
    points = grid_points(score.bars, float(timeline.time[-1]))
    strength = metric_levels(score.bars, points)
    place = np.searchsorted(timeline.time, points + TOLERANCE, side="right") - 1
    inside = (place >= 0) & (place < timeline.count)
    points, strength, place = points[inside], strength[inside], place[inside]
    proper = points - timeline.time[place] > TOLERANCE
    inner = np.zeros(timeline.count, dtype=np.int64)
    np.maximum.at(inner, place[proper], strength[proper])
    return inner


def _profile(held: Floats, time: Floats) -> Floats:
    """Share of each pitch class in the sounding time around each slice, shape (n, 12)."""
    sums = np.concatenate([np.zeros((1, ROOTS)), np.cumsum(held, axis=0)])
    centre = (time[:-1] + time[1:]) / 2
    first = np.searchsorted(time, centre - NEARBY)
    last = np.searchsorted(time, centre + NEARBY, side="right") - 1
    first = np.minimum(first, np.arange(len(centre)))
    last = np.maximum(last, np.arange(len(centre)) + 1)
    near = sums[last] - sums[first]
    return np.asarray(near / np.maximum(near.sum(axis=1, keepdims=True), TOLERANCE))


def _misspelt(fifths: Ints) -> Bytes:
    """Chord tones per state that the notation spells as another interval, shape (n, 120).

    Only for chords that divide the octave evenly, whose root nothing but the notation tells;
    elsewhere what sounds is better evidence than how it is written.
    """
    heard = fifths != _UNHEARD
    wrong = np.zeros((len(fifths), STATES), dtype=np.int8)
    for quality in (Quality.AUGMENTED, Quality.DIMINISHED_SEVENTH):
        for root in range(ROOTS):
            state = root * len(QUALITIES) + QUALITIES.index(quality)
            for interval in TONES[quality][1:]:
                tone = (root + interval) % 12
                apart = fifths[:, tone] - fifths[:, root] != FIFTHS_OF_INTERVAL[interval]
                wrong[:, state] += heard[:, root] & heard[:, tone] & apart
    return wrong
