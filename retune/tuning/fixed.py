"""Tunings that do not move: the temperaments for comparison and accompaniments.

Conventions
-----------
* A fixed tuning gives cents from equal temperament by key or by spelling; the home tonic of a
  tuning placed by spelling stands at 0 cents.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from fractions import Fraction

from retune.pitch import PitchClass
from retune.tuning.policy import FixedTuning, Temperament
from retune.units import ratio_to_cents

PURE_FIFTH = ratio_to_cents(Fraction(3, 2)) - 700.0
"""How much wider than a tempered fifth, in cents."""

MEANTONE_FIFTH = 300.0 * math.log2(5.0) - 700.0
"""Quarter-comma meantone: four fifths make a pure major third, two octaves up (Aron 1523)."""

CentsOf = Callable[[PitchClass], float]
"""Cents of a pitch class in a fixed tuning."""


def by_fifths(fifth: float, tonic: PitchClass) -> CentsOf:
    """A chain of equal fifths through the home tonic, each `fifth` cents off 700."""
    return lambda pitch: fifth * (pitch.fifths - tonic.fifths)


def by_key(tuning: FixedTuning) -> CentsOf:
    """A tuning of twelve keys."""
    return lambda pitch: tuning.cents[pitch.chroma]


def temperament(which: Temperament, tonic: PitchClass) -> CentsOf | None:
    """A temperament for comparison; None for just intonation, which is solved."""
    fifths = {
        Temperament.EQUAL: 0.0,
        Temperament.PYTHAGOREAN: PURE_FIFTH,
        Temperament.MEANTONE: MEANTONE_FIFTH,
    }
    return by_fifths(fifths[which], tonic) if which in fifths else None


def accompaniment(tuning: FixedTuning | None, tonic: PitchClass) -> CentsOf:
    """The tuning of parts that cannot move; quarter-comma meantone where none is given."""
    return by_fifths(MEANTONE_FIFTH, tonic) if tuning is None else by_key(tuning)
