"""Metric level of a moment, by the bar's own metre.

Conventions
-----------
* Levels: 4 downbeat, 3 half bar or half note, 2 beat or quarter, 1 half a quarter, 0 finer.
* Compound metres (6/8, 9/8, 12/8 and their kin over 4 and 16) have their dotted beats at level
  2, and their half bar at 3 where the beats are an even number.
* A moment is on a grid point if it is within `TOLERANCE` quarter notes of it.
"""

from __future__ import annotations

from functools import cache

import numpy as np

from retune.harmony.states import Bools, Floats, Ints
from retune.score.model import Bar

TOLERANCE = 1e-6
DOWNBEAT = 4
FINEST_PULSE = 0.5
"""Quarter notes; the grid that notes are cut on."""


@cache
def pulses(metre: tuple[int, int]) -> tuple[float, float, float]:
    """Distance between points of level 3, 2 and 1, in quarter notes.

    >>> pulses((4, 4)), pulses((3, 4)), pulses((6, 8)), pulses((3, 2))
    ((2.0, 1.0, 0.5), (3.0, 1.0, 0.5), (1.5, 1.5, 0.5), (2.0, 1.0, 0.5))
    """
    beats, unit = metre
    bar = 4.0 * beats / unit
    compound = beats % 3 == 0 and beats > 3
    if compound and unit >= 8:
        beat = 12.0 / unit
        return (bar / 2 if beats % 2 == 0 else bar), beat, min(FINEST_PULSE, beat / 3)
    if compound and unit == 4:
        return 3.0, 1.0, FINEST_PULSE
    return (2.0 if bar % 2 == 0 else bar), 1.0, FINEST_PULSE


def _on_grid(position: Floats, pulse: Floats) -> Bools:
    return np.abs(position - np.round(position / pulse) * pulse) < TOLERANCE


def metric_levels(bars: tuple[Bar, ...], time: Floats) -> Ints:
    """Level of each time, shape (n,); times are quarter notes, ascending or not."""
    if not bars:
        return np.where(_on_grid(time, np.full(len(time), 1.0)), 2, 0)
    onsets = np.array([float(bar.onset) for bar in bars])
    shifts = np.array([float(bar.begins) for bar in bars])
    grids = np.array([pulses(bar.metre) for bar in bars])
    inside = np.clip(np.searchsorted(onsets, time + TOLERANCE, side="right") - 1, 0, None)
    position = time - onsets[inside] + shifts[inside]
    level = np.zeros(len(time), dtype=np.int64)
    for pulse, value in ((2, 1), (1, 2), (0, 3)):
        level[_on_grid(position, grids[inside, pulse])] = value
    level[np.abs(position) < TOLERANCE] = DOWNBEAT
    return level


def grid_points(bars: tuple[Bar, ...], end: float) -> Floats:
    """All points of the finest pulse of every bar, up to `end`, in quarter notes, ascending."""
    if not bars:
        return np.arange(0.0, end, FINEST_PULSE)
    points: list[Floats] = []
    for i, bar in enumerate(bars):
        stop = float(bars[i + 1].onset) if i + 1 < len(bars) else max(end, float(bar.end))
        pulse = pulses(bar.metre)[2]
        onset, begins = float(bar.onset), float(bar.begins)
        offset = -begins % pulse if begins % pulse > TOLERANCE else 0.0
        points.append(np.arange(onset + offset, stop - TOLERANCE, pulse))
    return np.concatenate(points)
