"""Beats between the sounding tones of a chord.

Two tones f1 and f2 near the ratio p:q beat where partial p of the lower meets partial q of the
higher: at |p f1 - q f2| Hz, and k times that at their multiples (H. v. Helmholtz; handbook,
voice.md 3.1).

Conventions
-----------
* Ratios of a pair are the higher above the lower, octaves kept: 5/2 for a major tenth.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import combinations
from math import inf, log2, log10

from retune.units import ratio_to_cents
from retune.voice.partials import (
    HIGHEST_PARTIAL,
    NEAR_CENTS,
    SharedPartial,
    coincidences,
    nearest_just,
)

__all__ = [
    "FASTEST_COUNTED_HZ",
    "Pair",
    "SharedPartial",
    "SoundingTone",
    "beat_depth_db",
    "beat_rate",
    "countable",
    "pairs",
]

FASTEST_COUNTED_HZ = 10.0
"""Faster beats run together (Zwicker and Fastl, from memory)."""

_NAMED = 3


@dataclass(frozen=True, slots=True)
class SoundingTone:
    """One tone: its frequency here and in equal temperament, its ratio above the root.

    The ratio is octave-reduced; None for tempered and lone tones, and for an accompaniment.
    """

    hz: float
    equal_hz: float
    ratio: Fraction | None


@dataclass(frozen=True, slots=True)
class Pair:
    """Two tones, by their indices, the lower first.

    `ratio` is the just interval that the tones are meant to make, or the nearest one. `beat_hz`
    and `equal_hz` are how fast the first shared partials beat here and in equal temperament.
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


def beat_depth_db(level_difference_db: float) -> float:
    """From the softest to the loudest moment of a beat, in dB, by the difference of the two
    partials' levels; infinite where they are equal, for then the sound stops in between.

    >>> round(beat_depth_db(6.0), 1)
    9.6
    """
    softer = 10.0 ** (-abs(level_difference_db) / 20.0)
    return 20.0 * log10((1.0 + softer) / (1.0 - softer)) if softer < 1.0 else inf


def countable(beat_hz: float, seconds: float) -> bool:
    """Whether beats can be counted while a chord lasts: one whole beat, none too fast."""
    return beat_hz * seconds >= 1.0 and beat_hz <= FASTEST_COUNTED_HZ


def pairs(tones: Sequence[SoundingTone], limit: int = 5) -> tuple[Pair, ...]:
    """Every pair of tones whose first shared partials may be heard, simplest intervals first.

    Parameters
    ----------
    tones : sequence of SoundingTone
    limit : int
        Prime limit of the just intervals sought for tones without a ratio.

    Returns
    -------
    tuple of Pair
        Without unisons, and without pairs that are near no just interval, or share only partials
        beyond the `HIGHEST_PARTIAL`-th: nothing can be said of their beats.
    """
    found = []
    for first, second in combinations(range(len(tones)), 2):
        low, high = sorted((first, second), key=lambda index: tones[index].hz)
        pair = _pair(tones, low, high, limit)
        if pair is not None:
            found.append(pair)
    return tuple(sorted(found, key=_complexity))


def _complexity(pair: Pair) -> tuple[int, int, int]:
    return pair.ratio.numerator + pair.ratio.denominator, pair.low, pair.high


def _pair(tones: Sequence[SoundingTone], low: int, high: int, limit: int) -> Pair | None:
    below, above = tones[low], tones[high]
    ratio = _meant(below, above) or nearest_just(above.hz / below.hz, limit)
    if ratio is None or ratio <= 1 or ratio.numerator > HIGHEST_PARTIAL:
        return None
    shared = coincidences(ratio, below.hz, most=min(_NAMED, HIGHEST_PARTIAL // ratio.numerator))
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


def _meant(below: SoundingTone, above: SoundingTone) -> Fraction | None:
    """The interval between two tones of given ratios, where their pitches are near it."""
    if below.ratio is None or above.ratio is None:
        return None
    ratio = above.ratio / below.ratio
    size = above.hz / below.hz
    ratio *= Fraction(2) ** round(log2(size / float(ratio)))
    return ratio if abs(1200.0 * log2(size) - ratio_to_cents(ratio)) <= NEAR_CENTS else None
