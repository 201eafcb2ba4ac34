"""Just intervals by size: the nearest consonance, step or other just interval.

Conventions
-----------
* Tables are float64 arrays indexed by semitones 0 to 11; every value is the distance in cents of
  one just size from that many tempered semitones, padded by repetition to equal length.
* Sizes are taken upwards; a falling interval is measured as the rising one of its size.
"""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from functools import cache

import numpy as np
import numpy.typing as npt

from retune.tuning.ratios import just_intervals
from retune.units import ratio_to_cents

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

CONSONANT = np.isin(np.arange(12), (0, 3, 4, 5, 7, 8, 9))
"""By semitones: unison, thirds, fourth, fifth, sixths."""

# By semitones: what one tunes to. 27/20 or 32/27 are just too, but no choir aims at them.
_PURE: dict[int, dict[int, str]] = {
    3: {0: "1", 3: "32/27", 4: "81/64", 5: "4/3", 7: "3/2", 8: "128/81", 9: "27/16"},
    5: {0: "1", 3: "6/5", 4: "5/4", 5: "4/3", 7: "3/2", 8: "8/5", 9: "5/3"},
    7: {0: "1", 3: "6/5 7/6", 4: "5/4", 5: "4/3", 7: "3/2", 8: "8/5", 9: "5/3 12/7"},
}
# By semitones: the spellings whose just sizes a step or leap may take. Rarer ones, such as the
# augmented second, are heard by their size.
_SPELLINGS = ((0,), (-5, 7), (2,), (-3,), (4,), (-1,), (6, -6), (1,), (-4,), (3,), (-2,), (5,))


def _table(rows: list[list[float]]) -> Floats:
    width = max(map(len, rows))
    return np.array([row + row[-1:] * (width - len(row)) for row in rows])


def _offsets(fifths: int, limit: int) -> list[float]:
    tempered = 100.0 * (7 * fifths % 12)
    return [
        (ratio_to_cents(ratio) - tempered + 600.0) % 1200.0 - 600.0
        for ratio in just_intervals(fifths, limit)
    ]


@cache
def consonances(limit: int) -> Floats:
    """Pure consonances within a prime limit, shape (12, k); dissonances stand at 0.

    Limit 5: 6/5, 5/4, 4/3, 3/2, 8/5, 5/3. Limit 7 also takes 7/6 and 12/7 for pure.
    """
    pure = _PURE[limit]
    return _table(
        [
            [ratio_to_cents(Fraction(text)) - 100.0 * count for text in pure.get(count, "").split()]
            or [0.0]
            for count in range(12)
        ]
    )


@cache
def steps(limit: int) -> Floats:
    """Just melodic sizes within a prime limit, shape (12, k).

    Limit 5: tone 9/8 or 10/9; semitone 16/15, 27/25, 25/24 or 135/128; leaps likewise.
    """
    return _table(
        [
            [cents for fifths in spellings for cents in _offsets(fifths, limit)]
            for spellings in _SPELLINGS
        ]
    )


def nearest(table: Floats, semitones: Ints, cents: Floats) -> Floats:
    """The entry of a table nearest to each interval's distance from equal temperament.

    Parameters
    ----------
    table : ndarray, shape (12, k)
    semitones, cents : ndarray, shape (n,)
        Tempered size modulo 12, and the interval's distance from it.
    """
    choices = table[semitones]
    best = np.abs(choices - cents[:, None]).argmin(axis=1)
    found: Floats = choices[np.arange(len(semitones)), best]
    return found


def nearest_directed(table: Floats, distance: Ints, cents: Floats) -> Floats:
    """As `nearest`, for signed distances in semitones and the change that goes with them."""
    rising = np.where(distance < 0, -1.0, 1.0)
    found: Floats = rising * nearest(table, np.abs(distance) % 12, rising * cents)
    return found


def each_within(
    table: Callable[[int], Floats],
    limits: Ints,
    search: Callable[[Floats, Ints, Floats], Floats],
    semitones: Ints,
    cents: Floats,
) -> Floats:
    """`nearest` or `nearest_directed` where every interval has a prime limit of its own.

    Parameters
    ----------
    table : callable
        `consonances` or `steps`.
    limits : ndarray of int, shape (n,)
    """
    if len(limits) == 0 or limits.min() == limits.max():
        return search(table(int(limits[0]) if len(limits) else 5), semitones, cents)
    found = np.zeros(len(limits))
    for limit in np.unique(limits).tolist():
        own = limits == limit
        found[own] = search(table(limit), semitones[own], cents[own])
    return found
