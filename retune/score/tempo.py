"""The tempo map: from quarter notes to seconds and back.

Fermatas are spans of slower tempo in this map; they never change onsets or durations in
quarter notes.
"""

from __future__ import annotations

from bisect import bisect_right
from dataclasses import dataclass, field
from fractions import Fraction
from itertools import pairwise

DEFAULT_QPM = Fraction(100)
"""Quarter notes a minute where a score says nothing (our choice: an easy walking pace)."""


@dataclass(frozen=True, slots=True)
class TempoChange:
    """From `onset` on (quarter notes), the music goes at `qpm` quarter notes a minute."""

    onset: Fraction
    qpm: Fraction


@dataclass(frozen=True)
class TempoMap:
    """Piecewise constant tempo; the first change stands at onset 0, onsets ascend.

    >>> tempo = TempoMap((TempoChange(Fraction(0), Fraction(60)),
    ...                   TempoChange(Fraction(4), Fraction(120))))
    >>> tempo.seconds(Fraction(6))
    5.0
    """

    changes: tuple[TempoChange, ...] = (TempoChange(Fraction(0), DEFAULT_QPM),)
    _onsets: tuple[float, ...] = field(init=False, repr=False, compare=False)
    _seconds: tuple[float, ...] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        starts, seconds = self.changes, [0.0]
        if not starts or starts[0].onset != 0:
            raise ValueError("the first tempo change must stand at onset 0")
        for change, following in pairwise(starts):
            if following.onset <= change.onset:
                raise ValueError("tempo changes must ascend")
            length = float((following.onset - change.onset) * 60 / change.qpm)
            seconds.append(seconds[-1] + length)
        object.__setattr__(self, "_onsets", tuple(float(c.onset) for c in starts))
        object.__setattr__(self, "_seconds", tuple(seconds))

    def seconds(self, onset: Fraction | float) -> float:
        """Seconds from the start to an onset in quarter notes."""
        quarters = float(onset)
        index = max(bisect_right(self._onsets, quarters) - 1, 0)
        per_quarter = 60.0 / float(self.changes[index].qpm)
        return self._seconds[index] + (quarters - self._onsets[index]) * per_quarter

    def quarters(self, seconds: float) -> float:
        """The onset in quarter notes at a time in seconds from the start; inverse of `seconds`.

        >>> TempoMap().quarters(TempoMap().seconds(Fraction(5, 2)))
        2.5
        """
        index = max(bisect_right(self._seconds, seconds) - 1, 0)
        per_second = float(self.changes[index].qpm) / 60.0
        return self._onsets[index] + (seconds - self._seconds[index]) * per_second
