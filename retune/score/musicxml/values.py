"""Numbers and texts of MusicXML, taken with care: a file may hold any text anywhere."""

from __future__ import annotations

import re
from fractions import Fraction
from functools import lru_cache

from retune.adapters.xml import Element

MAX_STAVES = 64
MAX_LABEL = 80
"""Longest id, number or name of a thing that is looked at, in characters."""
MAX_TEXT = 1000
"""Longest text that is kept of an element, in characters."""

MAX_DIGITS = 24
"""Longest number that is looked at; longer ones are hostile or broken."""

_MAX_PADDED = 4 * MAX_DIGITS

_DECIMAL = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)")

QUARTERS_OF_TYPE = {
    "maxima": Fraction(32),
    "long": Fraction(16),
    "breve": Fraction(8),
    "whole": Fraction(4),
    "half": Fraction(2),
    "quarter": Fraction(1),
    "eighth": Fraction(1, 2),
    "16th": Fraction(1, 4),
    "32nd": Fraction(1, 8),
    "64th": Fraction(1, 16),
    "128th": Fraction(1, 32),
    "256th": Fraction(1, 64),
    "512th": Fraction(1, 128),
    "1024th": Fraction(1, 256),
}
"""Quarter notes in each note-type value of MusicXML."""


def decimal(text: str | None) -> Fraction | None:
    """The value of an xs:decimal, exactly; None where the text is none or too long.

    >>> decimal(" -1.5 "), decimal("1e99"), decimal(None)
    (Fraction(-3, 2), None, None)
    """
    return None if text is None or len(text) > _MAX_PADDED else _decimal(text)


@lru_cache(maxsize=4096)
def _decimal(padded: str) -> Fraction | None:
    text = padded.strip()
    if len(text) > MAX_DIGITS or _DECIMAL.fullmatch(text) is None:
        return None
    return Fraction(text)


def whole(text: str | None, low: int, high: int) -> int | None:
    """An integer within low to high, both included; None for anything else.

    >>> whole("2", 1, 9), whole("2.0", 1, 9), whole("2.5", 1, 9), whole("10", 1, 9)
    (2, 2, None, None)
    """
    value = decimal(text)
    if value is None or value.denominator != 1:
        return None
    return value.numerator if low <= value.numerator <= high else None


def words(element: Element | None) -> str:
    """Text of an element with white space settled; "" for none."""
    if element is None or not element.text:
        return ""
    return " ".join(element.text.split())[:MAX_TEXT]


def dotted(base: Fraction, dots: int) -> Fraction:
    """A length with augmentation dots.

    >>> dotted(Fraction(2), 2)
    Fraction(7, 2)
    """
    return base * (2 - Fraction(1, 2 ** min(dots, 8)))


def velocity(percent: str | None) -> int | None:
    """A velocity, 1 to 127, from a percentage of forte: 100 % is 90 (MusicXML, sound dynamics)."""
    value = decimal(percent)
    if value is None or value < 0:
        return None
    return max(1, min(127, round(value * 90 / 100)))
