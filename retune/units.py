"""Conversions between ratios, cents and frequencies.

Conventions
-----------
* Cents are floats; 1200 cents make an octave, + is sharp.
* Ratios are exact `Fraction` values above their lower note.
* A key number is the MIDI key, 69 = A4; the reference pitch is the frequency of A4.
"""

from __future__ import annotations

import math
from fractions import Fraction

A4_KEY = 69
STANDARD_REFERENCE_HZ = 440.0

SYNTONIC_COMMA = Fraction(81, 80)
SEPTIMAL_COMMA = Fraction(64, 63)


def ratio_to_cents(ratio: Fraction) -> float:
    """Size of a ratio in cents.

    >>> round(ratio_to_cents(Fraction(5, 4)), 6)
    386.313714
    """
    return 1200.0 * (math.log2(ratio.numerator) - math.log2(ratio.denominator))


def octave_reduced(ratio: Fraction) -> Fraction:
    """The same ratio moved by octaves into 1 <= ratio < 2.

    >>> octave_reduced(Fraction(3, 8))
    Fraction(3, 2)
    """
    while ratio >= 2:
        ratio /= 2
    while ratio < 1:
        ratio *= 2
    return ratio


def largest_prime(ratio: Fraction) -> int:
    """The largest prime in a ratio's numerator and denominator; 1 for 1/1.

    >>> largest_prime(Fraction(45, 32))
    5
    """
    found, number = 1, ratio.numerator * ratio.denominator
    prime = 2
    while prime * prime <= number:
        while number % prime == 0:
            found, number = prime, number // prime
        prime += 1
    return max(found, number)


def hz_of(key: float, cents: float, reference_hz: float = STANDARD_REFERENCE_HZ) -> float:
    """Frequency in Hz of a key number, `cents` away from equal temperament.

    >>> round(hz_of(60, 0.0), 4)
    261.6256
    """
    return float(reference_hz * 2.0 ** ((key - A4_KEY) / 12.0 + cents / 1200.0))


def reference_offset(reference_hz: float) -> float:
    """Cents from A4 = 440 Hz to another reference pitch.

    >>> round(reference_offset(442.0), 4)
    7.8514
    """
    return 1200.0 * math.log2(reference_hz / STANDARD_REFERENCE_HZ)
