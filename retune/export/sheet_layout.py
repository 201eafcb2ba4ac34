"""Systems set on pages: which stand together, and how far apart.

Conventions
-----------
* Lengths are millimetres.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

LEAST_GAP, MOST_GAP = 4.0, 22.0
"""Between two systems; what a page has left beyond the most stays at its foot."""


@dataclass(frozen=True, slots=True)
class SetPage:
    """A page: its systems, from `first` to before `stop`, and the gap between any two."""

    first: int
    stop: int
    gap: float


def set_pages(heights: Sequence[float], first_room: float, room: float) -> tuple[SetPage, ...]:
    """The pages of systems with these heights, as few as can be, and none of them too empty.

    `first_room` is the height that the first page has for systems, under its heading. A system
    that is higher than a page stands on one by itself.

    >>> [(p.first, p.stop) for p in set_pages([80] * 7, 200, 260)]
    [(0, 2), (2, 5), (5, 7)]
    """
    best: list[tuple[int, float, int]] = [(0, 0.0, 0)]
    for stop in range(1, len(heights) + 1):
        choices = []
        for first in range(stop - 1, -1, -1):
            left = (room if first else first_room) - _needed(heights[first:stop])
            if left < 0 and first < stop - 1:
                break
            pages, cost, _ = best[first]
            # What is left on the last page is no fault.
            fault = 0.0 if stop == len(heights) else max(left, 0.0) ** 2
            choices.append((pages + 1, cost + fault, first))
        best.append(min(choices))
    cuts = [len(heights)]
    while cuts[-1]:
        cuts.append(best[cuts[-1]][2])
    return tuple(
        SetPage(first, stop, _gap(heights[first:stop], room if first else first_room))
        for first, stop in pairwise(reversed(cuts))
    )


def _needed(heights: Sequence[float]) -> float:
    return sum(heights) + LEAST_GAP * (len(heights) - 1)


def _gap(heights: Sequence[float], room: float) -> float:
    if len(heights) < 2:
        return LEAST_GAP
    even = LEAST_GAP + (room - _needed(heights)) / (len(heights) - 1)
    return min(max(even, LEAST_GAP), MOST_GAP)
