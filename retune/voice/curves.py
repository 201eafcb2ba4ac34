"""Curves in time, and the phase of a tone whose pitch follows one.

Conventions
-----------
* Time is in whole samples from the start of the stem.
* Between two points a curve goes by a raised cosine; before the first and after the last it is
  level. Levels between equal points are exactly level, so held pitches are exact.
"""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

BLOCK = 8_192
"""Most samples worked on at once: work arrays stay in the cache."""

_COUNT = np.arange(BLOCK, dtype=np.float64)


@dataclass(slots=True)
class Curve:
    """Points in time; `to` adds one, times ascend."""

    at: list[int] = field(default_factory=list)
    values: list[float] = field(default_factory=list)

    def to(self, at: int, value: float) -> None:
        """Go to a value; at a time that is there already, the later value counts."""
        if self.at and at <= self.at[-1]:
            self.at.append(self.at[-1])
        else:
            self.at.append(at)
        self.values.append(value)

    def span(self, start: int, stop: int) -> float | Floats:
        """The values of samples `start` to `stop` (excluded), between which no point lies: a
        number where they are level, else an array."""
        place = bisect_right(self.at, start)
        if place == 0:
            return self.values[0]
        if place == len(self.at) or self.values[place] == self.values[place - 1]:
            return self.values[place - 1]
        first, last = self.values[place - 1], self.values[place]
        length = self.at[place] - self.at[place - 1]
        done = (_COUNT[: stop - start] + (start - self.at[place - 1])) / length
        return first + (last - first) * (0.5 - 0.5 * np.cos(math.pi * done))


@dataclass(frozen=True, slots=True)
class Block:
    """A stretch in which no curve has a point: samples, Hz and phase of each in periods."""

    start: int
    stop: int
    hz: float | Floats
    phase: Floats


def blocks(
    pitch: Curve, start: int, stop: int, rate: int, others: Iterable[Curve] = ()
) -> Iterator[Block]:
    """The phase of a tone block by block.

    Parameters
    ----------
    pitch : Curve
        log2 of the frequency in Hz.
    start, stop : int
        Samples, `stop` excluded.
    rate : int
        Samples a second.
    others : curves
        Blocks end at their points as well.

    The phase begins as if the first pitch had sounded from sample 0 on: a tone that stops and
    comes back is in step with itself.
    """
    points = {point for curve in (pitch, *others) for point in curve.at if start < point < stop}
    phase = math.fmod(2.0 ** pitch.values[0] * start / rate, 1.0) + _HEADROOM
    for begin, end in _pieces([start, *sorted(points), stop]):
        height = pitch.span(begin, end)
        hz: float | Floats
        if isinstance(height, float):
            hz = 2.0**height
            step = 2.0**height / rate
            phases = _COUNT[: end - begin] * step
            phases += phase
            phase += step * (end - begin)
        else:
            hz = np.exp2(height)
            steps = np.cumsum(hz) / rate
            phases = np.concatenate(([phase], phase + steps[:-1]))
            phase += float(steps[-1])
        yield Block(begin, end, hz, phases)


_HEADROOM = 64.0
"""Periods that every phase is ahead, so that a singer's own deviation leaves it above 0."""


def _pieces(points: Sequence[int]) -> Iterator[tuple[int, int]]:
    for begin, end in pairwise(points):
        for at in range(begin, end, BLOCK):
            yield at, min(at + BLOCK, end)
