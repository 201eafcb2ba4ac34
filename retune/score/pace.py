"""A tempo that the user wishes instead of the score's own."""

from __future__ import annotations

import re
from dataclasses import dataclass
from fractions import Fraction

from retune.errors import WishError

_TEXT = re.compile(r"(\d{1,4}(?:\.\d{1,3})?)\s*(%?)")
SLOWEST, FASTEST = 10, 400
"""Both for percent and for beats a minute."""


@dataclass(frozen=True, slots=True)
class Pace:
    """Either `share` of the score's own tempo, or one steady tempo of `beats` a minute.

    Beats are those that are counted: dotted quarters in 6/8.
    """

    share: Fraction = Fraction(1)
    beats: Fraction | None = None

    @classmethod
    def parse(cls, text: str) -> Pace:
        """Read 80% or 92; raises `WishError`.

        >>> Pace.parse("80%").share, Pace.parse("92").beats
        (Fraction(4, 5), Fraction(92, 1))
        """
        match = _TEXT.fullmatch(text.strip())
        if match is None or not SLOWEST <= Fraction(match[1]) <= FASTEST:
            raise WishError(
                f"no tempo '{text}'",
                hint=f"Write 80% of the score's own, or 92 beats a minute; {SLOWEST} to {FASTEST}",
            )
        number = Fraction(match[1])
        return cls(share=number / 100) if match[2] else cls(beats=number)
