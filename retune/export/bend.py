"""Pitch bend arithmetic: cents to 14-bit values and back, and the key nearest a pitch.

Conventions
-----------
* A pitch is a float key number on the grid of A4 = 440 Hz: 69.5 is a quarter tone above A4.
* A bend value runs from 0 to 16383; 8192 leaves the key's pitch alone.
* A bend range is in semitones each way.

Formulas: MPE specification M1-100-UM v1.1, appendix C.3 and C.5; General MIDI 2 (RP-024) 3.6.
"""

from __future__ import annotations

import math

MIDDLE = 8192
HIGHEST = 16383
DEFAULT_RANGE = 2
"""The range of a synth that was told none (General MIDI 2, 3.4.1)."""


def bend_value(cents: float, semitones: int) -> int:
    """The value nearest a bend in cents, held within what 14 bits can say.

    >>> bend_value(700.0, 48), bend_value(-13.686286, 2)
    (9387, 7631)
    """
    value = MIDDLE + math.floor(cents * MIDDLE / (100.0 * semitones) + 0.5)
    return min(max(value, 0), HIGHEST)


def bend_cents(value: int, semitones: float) -> float:
    """The cents a value bends by.

    >>> bend_cents(8192, 2), bend_cents(0, 2)
    (0.0, -200.0)
    """
    return (value - MIDDLE) * 100.0 * semitones / MIDDLE


def bend_step(semitones: float) -> float:
    """Cents between two neighbouring values.

    >>> round(bend_step(2), 6)
    0.024414
    """
    return 100.0 * semitones / MIDDLE


def nearest_key(pitch: float) -> int:
    """The key nearest a pitch; halfway between two, the upper.

    >>> nearest_key(68.5), nearest_key(69.49)
    (69, 69)
    """
    return math.floor(pitch + 0.5)
