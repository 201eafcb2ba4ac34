"""Partials that sounding tones share.

Partial m of a lower tone meets partial n of a higher one where m:n is the interval's ratio p:q, so
at (p, q), (2p, 2q) and so on; a whole chord a1:a2:... meets at lcm(a1, a2, ...) times the
fundamental that all its tones are multiples of (H. v. Helmholtz; handbook, voice.md 4.1).

Conventions
-----------
* Ratios are above the lower tone, octaves kept: 5/2 for a major tenth.
* Partials count from 1, the fundamental.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cache
from math import gcd, lcm, log2

from retune.units import largest_prime, ratio_to_cents

HIGHEST_HZ = 5000.0
"""Above the fifth formant a sung tone has no partials to speak of (voice.md 1.3)."""

HIGHEST_PARTIAL = 12
"""Partials beyond are too soft, and too close together for the ear, to be named."""

NEAR_CENTS = 40.0
"""An interval is meant to be a just one only within this distance (our choice; the widest of the
equal intervals against its just one, the seventh 7/4, has 31)."""


@dataclass(frozen=True, slots=True)
class SharedPartial:
    """Where a partial of the lower tone meets one of the higher, in Hz of the lower."""

    low_partial: int
    high_partial: int
    hz: float


@dataclass(frozen=True, slots=True)
class ChordPartial:
    """The lowest partial that all tones of a chord share: its number in each tone, and Hz."""

    numbers: tuple[int, ...]
    hz: float


def coincidences(
    ratio: Fraction, low_hz: float, highest_hz: float = HIGHEST_HZ, most: int = 4
) -> tuple[SharedPartial, ...]:
    """The partials that two tones share, lowest first, at most `most` and up to `highest_hz`.

    >>> [(s.low_partial, s.high_partial) for s in coincidences(Fraction(5, 2), 100.0)]
    [(5, 2), (10, 4), (15, 6), (20, 8)]
    """
    p, q = ratio.numerator, ratio.denominator
    count = min(most, int(highest_hz / (p * low_hz)))
    return tuple(SharedPartial(k * p, k * q, k * p * low_hz) for k in range(1, count + 1))


def chord_partial(
    ratios: Sequence[Fraction], root_hz: float, highest_hz: float = HIGHEST_HZ
) -> ChordPartial | None:
    """The lowest partial that all tones of a chord share; None where it lies above `highest_hz`.

    Parameters
    ----------
    ratios : sequence of Fraction, not empty
        Above the tone at `root_hz`, octaves kept.
    root_hz : float

    >>> chord_partial([Fraction(1), Fraction(5, 4), Fraction(3, 2)], 100.0)
    ChordPartial(numbers=(15, 12, 10), hz=1500.0)
    """
    common = Fraction(
        lcm(*(ratio.numerator for ratio in ratios)), gcd(*(ratio.denominator for ratio in ratios))
    )
    hz = float(common) * root_hz
    if hz > highest_hz:
        return None
    return ChordPartial(tuple(int(common / ratio) for ratio in ratios), hz)


def ordinal(number: int) -> str:
    """The number of a partial in words.

    >>> [ordinal(number) for number in (1, 2, 3, 4, 11, 12, 22)]
    ['1st', '2nd', '3rd', '4th', '11th', '12th', '22nd']
    """
    ends = {1: "st", 2: "nd", 3: "rd"} if number % 100 not in (11, 12, 13) else {}
    return f"{number}{ends.get(number % 10, 'th')}"


def nearest_just(size: float, limit: int) -> Fraction | None:
    """The just interval nearest to a frequency ratio above 1, the simpler one of two as near.

    Taken from the ratios within a prime limit whose first shared partials number no more than
    `HIGHEST_PARTIAL`; None where none is within `NEAR_CENTS`, and for a unison.

    >>> nearest_just(2 ** (16 / 12), 5)
    Fraction(5, 2)
    """
    cents = 1200.0 * log2(size)
    off, _, ratio = min(
        (round(abs(cents - just), 6), ratio.numerator, ratio) for just, ratio in _just(limit)
    )
    return ratio if off <= NEAR_CENTS and ratio > 1 else None


@cache
def _just(limit: int) -> tuple[tuple[float, Fraction], ...]:
    """Sizes in cents and ratios, from the unison up; the unison so that it is nobody's third."""
    return tuple((ratio_to_cents(ratio), ratio) for ratio in _ratios(limit))


def _ratios(limit: int) -> Iterator[Fraction]:
    for p in range(1, HIGHEST_PARTIAL + 1):
        for q in range(1, p + 1):
            if gcd(p, q) == 1 and largest_prime(Fraction(p, q)) <= limit:
                yield Fraction(p, q)
