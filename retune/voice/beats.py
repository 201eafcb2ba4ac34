"""Beats between the sounding tones of a chord, and the partials that make them.

Two tones f1 and f2 near the ratio p:q beat where partial p of the lower meets partial q of the
higher: at |p f1 - q f2| Hz, and k times that at their multiples (H. v. Helmholtz; handbook,
voice.md 3.1 and 4.1).

Conventions
-----------
* Ratios of a pair are the higher above the lower, octaves kept: 5/2 for a major tenth.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import combinations
from math import gcd, log2

HIGHEST_PARTIAL = 12
"""Partials beyond are too soft in a sung tone to beat audibly (voice.md 2.3, 3.1)."""

HIGHEST_HZ = 4000.0
_NEAR_CENTS = 40.0
_NAMED = 3


@dataclass(frozen=True, slots=True)
class SoundingTone:
    """One tone: its frequency here and in equal temperament, its ratio above the root.

    The ratio is octave-reduced; None for tempered and lone tones.
    """

    hz: float
    equal_hz: float
    ratio: Fraction | None


@dataclass(frozen=True, slots=True)
class SharedPartial:
    """Where a partial of the lower tone meets one of the higher, in Hz of the lower."""

    low_partial: int
    high_partial: int
    hz: float


@dataclass(frozen=True, slots=True)
class Pair:
    """Two tones, by their indices, the lower first.

    `beat_hz` and `equal_hz` are how fast the first shared partials beat here and in equal
    temperament.
    """

    low: int
    high: int
    ratio: Fraction
    shared: tuple[SharedPartial, ...]
    beat_hz: float
    equal_hz: float


def beat_rate(low_hz: float, high_hz: float, p: int, q: int, k: int = 1) -> float:
    """Beats a second of the kp-th partial of the lower tone and the kq-th of the higher.

    >>> round(beat_rate(130.8128, 164.8138, 5, 4), 3)
    5.191
    """
    return k * abs(p * low_hz - q * high_hz)


def shared_partials(ratio: Fraction, low_hz: float) -> tuple[SharedPartial, ...]:
    """The lowest partials that two tones share, up to `HIGHEST_PARTIAL` and `HIGHEST_HZ`.

    >>> [(s.low_partial, s.high_partial) for s in shared_partials(Fraction(5, 2), 100.0)]
    [(5, 2), (10, 4)]
    """
    p, q = ratio.numerator, ratio.denominator
    found = []
    for k in range(1, _NAMED + 1):
        if k * p > HIGHEST_PARTIAL or k * p * low_hz > HIGHEST_HZ:
            break
        found.append(SharedPartial(k * p, k * q, k * p * low_hz))
    return tuple(found)


def pairs(tones: Sequence[SoundingTone]) -> tuple[Pair, ...]:
    """Every pair of different tones that shares a partial, the simplest intervals first.

    Tones without a ratio make no pair; unisons and pairs without audible shared partials neither.
    """
    found = []
    for first, second in combinations(range(len(tones)), 2):
        low, high = sorted((first, second), key=lambda index: tones[index].hz)
        pair = _pair(tones, low, high)
        if pair is not None:
            found.append(pair)
    return tuple(sorted(found, key=_complexity))


def whole_chord_partial(ratios: Sequence[Fraction], root_hz: float) -> float | None:
    """The lowest partial that all tones of a chord share, in Hz: lcm(a1, a2, ...) times the
    fundamental that they are multiples of; None where it is too high to be heard.

    `ratios` are above the tone at `root_hz`, octaves kept.

    >>> whole_chord_partial([Fraction(1), Fraction(5, 4), Fraction(3, 2)], 100.0)
    1500.0
    """
    common = Fraction(1)
    for ratio in ratios:
        common = Fraction(
            _lcm(common.numerator, ratio.numerator), gcd(common.denominator, ratio.denominator)
        )
    hz = float(common) * root_hz
    return hz if hz <= HIGHEST_HZ else None


def _lcm(a: int, b: int) -> int:
    return a * b // gcd(a, b)


def _complexity(pair: Pair) -> tuple[int, int, int]:
    return pair.ratio.numerator + pair.ratio.denominator, pair.low, pair.high


def _pair(tones: Sequence[SoundingTone], low: int, high: int) -> Pair | None:
    below, above = tones[low], tones[high]
    if below.ratio is None or above.ratio is None:
        return None
    ratio = above.ratio / below.ratio
    size = above.hz / below.hz
    octaves = round(log2(size / float(ratio)))
    ratio *= Fraction(2) ** octaves
    if ratio <= 1 or abs(1200.0 * log2(size / float(ratio))) > _NEAR_CENTS:
        return None
    shared = shared_partials(ratio, below.hz)
    if not shared:
        return None
    p, q = ratio.numerator, ratio.denominator
    return Pair(
        low,
        high,
        ratio,
        shared,
        beat_rate(below.hz, above.hz, p, q),
        beat_rate(below.equal_hz, above.equal_hz, p, q),
    )
