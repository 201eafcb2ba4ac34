"""A tempo that the user wishes instead of the score's own."""

from __future__ import annotations

import re
from dataclasses import dataclass
from fractions import Fraction

from retune.errors import WishError

_TEXT = re.compile(r"(\d{1,4}(?:\.\d{1,3})?)\s*(%?)", re.ASCII)
SLOWEST, FASTEST = 10, 400
"""Both for percent and for beats a minute."""

_HINT = (
    f"Write 80% for a share of the score's own, or 92 for beats a minute; {SLOWEST} to {FASTEST}"
)


@dataclass(frozen=True, slots=True)
class Pace:
    """Either `share` of the score's own tempo, or one steady tempo of `beats` a minute.

    Beats are those that are counted in the first full bar: dotted quarters in 6/8. Fermatas are
    held in both. Raises `WishError` outside `SLOWEST` to `FASTEST`.
    """

    share: Fraction = Fraction(1)
    beats: Fraction | None = None

    def __post_init__(self) -> None:
        number = self.share * 100 if self.beats is None else self.beats
        if not SLOWEST <= number <= FASTEST:
            unit = "%" if self.beats is None else ""
            raise WishError(f"'{float(number):g}{unit}' is no tempo", hint=_HINT)

    @classmethod
    def parse(cls, text: str) -> Pace:
        """Read 80% or 92; raises `WishError`.

        >>> Pace.parse("80%").share, Pace.parse("92").beats
        (Fraction(4, 5), Fraction(92, 1))
        """
        match = _TEXT.fullmatch(text.strip())
        if match is None:
            raise WishError(f"'{text}' is no tempo", hint=_HINT)
        number = Fraction(match[1])
        return cls(share=number / 100) if match[2] else cls(beats=number)
