"""Findings of the builder, gathered and grouped: one line for one kind of doubt in a part.

Conventions
-----------
* Bars are indices into the bars as written, from 0; beats count from 1.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from fractions import Fraction

from retune.errors import Finding, Place, Weight


def bar_ranges(bars: Iterable[int], numbers: Sequence[str]) -> str:
    """Printed bar numbers, neighbours drawn together.

    >>> bar_ranges([0, 2, 3, 4], ["1", "2", "3", "4", "5"])
    '1, 3-5'
    """
    runs: list[list[int]] = []
    for bar in sorted(set(bars)):
        if runs and runs[-1][1] == bar - 1:
            runs[-1][1] = bar
        else:
            runs.append([bar, bar])
    ends = ((numbers[first], numbers[last]) for first, last in runs)
    return ", ".join(first if first == last else f"{first}-{last}" for first, last in ends)


@dataclass(slots=True)
class Ledger:
    """Collects findings; equal ones of one part become one, which lists its bars."""

    file: str | None = None
    _places: dict[tuple[Weight, str, str | None], list[tuple[int, Fraction | None]]] = field(
        default_factory=dict
    )

    def add(
        self,
        weight: Weight,
        what: str,
        part: str | None = None,
        bar: int | None = None,
        beat: Fraction | None = None,
    ) -> None:
        """Note a finding; call it once for every place."""
        places = self._places.setdefault((weight, what, part), [])
        if bar is not None:
            places.append((bar, beat))

    def findings(self, numbers: Sequence[str]) -> tuple[Finding, ...]:
        """All findings, in the order in which they first came up."""
        return tuple(
            self._grouped(weight, what, part, sorted(places, key=_written_order), numbers)
            for (weight, what, part), places in self._places.items()
        )

    def _grouped(
        self,
        weight: Weight,
        what: str,
        part: str | None,
        places: Sequence[tuple[int, Fraction | None]],
        numbers: Sequence[str],
    ) -> Finding:
        if not places:
            return Finding(weight, what, Place(self.file, part))
        bar, beat = places[0]
        where = Place(self.file, part, numbers[bar], None if beat is None else str(beat))
        others = bar_ranges((index for index, _ in places), numbers)
        several = others != numbers[bar]
        return Finding(weight, f"{what} (bars {others})" if several else what, where)


def _written_order(place: tuple[int, Fraction | None]) -> tuple[int, Fraction]:
    return place[0], place[1] or Fraction(0)
