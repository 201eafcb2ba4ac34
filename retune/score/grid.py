"""Whole ticks for exact times: sums and comparisons of integers, where fractions are slow."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field
from fractions import Fraction
from math import lcm


@dataclass(frozen=True, slots=True)
class Grid:
    """A grid fine enough that every time of a score is a whole number of ticks.

    >>> grid = Grid.of([Fraction(1, 2), Fraction(4, 3)])
    >>> grid.ticks(Fraction(4, 3)), grid.quarters(3)
    (8, Fraction(1, 2))
    """

    per_quarter: int
    _quarters: dict[int, Fraction] = field(default_factory=dict, repr=False, compare=False)

    @classmethod
    def of(cls, times: Iterable[Fraction]) -> Grid:
        """The coarsest grid on which all the given times lie."""
        return cls(lcm(*{time.denominator for time in times}))

    def ticks(self, quarters: Fraction) -> int:
        """Quarter notes as ticks; the time must lie on the grid."""
        return quarters.numerator * (self.per_quarter // quarters.denominator)

    def quarters(self, ticks: int) -> Fraction:
        """Ticks as quarter notes."""
        known = self._quarters.get(ticks)
        if known is None:
            known = self._quarters[ticks] = Fraction(ticks, self.per_quarter)
        return known
