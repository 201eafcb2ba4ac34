"""Comma accidentals: the signs that say by which commas a ratio leaves the chain of fifths.

An arrow lowers or raises by the syntonic comma 81/80, the septimal sign by 64/63, counted from
the chord's root. Names are those of SMuFL 1.4, "Extended Helmholtz-Ellis accidentals (just
intonation)", U+E2C0 to U+E2DF.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

_BASES = {-2: "DoubleFlat", -1: "Flat", 0: "Natural", 1: "Sharp", 2: "DoubleSharp"}
_ARROWS = {1: "OneArrow", 2: "TwoArrows", 3: "ThreeArrows"}
_SEPTIMAL = {1: "OneSeptimalComma", 2: "TwoSeptimalCommas"}
_LIMIT = 7


@dataclass(frozen=True, slots=True)
class Commas:
    """How many syntonic and septimal commas a ratio lies above the chain of fifths."""

    syntonic: int = 0
    septimal: int = 0


def commas_of(ratio: Fraction) -> Commas | None:
    """The commas of a ratio; None where it has a prime above 7.

    81/80 = 3^4/(2^4 5) and 64/63 = 2^6/(3^2 7): the powers of 5 and 7 count the commas.

    >>> commas_of(Fraction(5, 4)), commas_of(Fraction(7, 4))
    (Commas(syntonic=-1, septimal=0), Commas(syntonic=0, septimal=-1))
    """
    powers = {prime: _power(ratio, prime) for prime in (2, 3, 5, _LIMIT)}
    rest = ratio
    for prime, power in powers.items():
        rest /= Fraction(prime) ** power
    return Commas(-powers[5], -powers[_LIMIT]) if rest == 1 else None


def _power(ratio: Fraction, prime: int) -> int:
    power, above, below = 0, ratio.numerator, ratio.denominator
    while above % prime == 0:
        above //= prime
        power += 1
    while below % prime == 0:
        below //= prime
        power -= 1
    return power


def arrow_glyph(alter: int, commas: int) -> str:
    """The glyph of an accidental with arrows; empty where there is none.

    >>> arrow_glyph(0, -1), arrow_glyph(1, 2), arrow_glyph(0, 0)
    ('accidentalNaturalOneArrowDown', 'accidentalSharpTwoArrowsUp', '')
    """
    base, arrows = _BASES.get(alter), _ARROWS.get(abs(commas))
    if base is None or arrows is None:
        return ""
    return f"accidental{base}{arrows}{'Down' if commas < 0 else 'Up'}"


def septimal_glyph(commas: int) -> str:
    """The glyph of septimal commas; empty where there is none.

    >>> septimal_glyph(-1)
    'accidentalLowerOneSeptimalComma'
    """
    count = _SEPTIMAL.get(abs(commas))
    if count is None:
        return ""
    return f"accidental{'Lower' if commas < 0 else 'Raise'}{count}"
