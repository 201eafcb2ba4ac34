"""Bar, beat and seconds of a time in a score, as the note list and the tables print them."""

from __future__ import annotations

from fractions import Fraction

from retune.tuning.model import TunedScore

DECIMALS = 6
"""Decimals of cents, Hz and seconds."""


def rounded(value: float) -> float:
    """A number to six decimals, never -0.0.

    >>> rounded(-0.0000001), rounded(2 / 3)
    (0.0, 0.666667)
    """
    return round(value, DECIMALS) + 0.0


class Places:
    """Looks up bar, beat and seconds once for each time, since many notes share one."""

    def __init__(self, tuned: TunedScore) -> None:
        self._score = tuned.score
        self._known: dict[Fraction, tuple[str, str]] = {}
        self._known_seconds: dict[Fraction, float] = {}

    def bar_and_beat(self, onset: Fraction) -> tuple[str, str]:
        """Printed bar number and beat, both as text."""
        found = self._known.get(onset)
        if found is None:
            found = (self._score.bar_at(onset).number, str(self._score.beat_at(onset)))
            self._known[onset] = found
        return found

    def seconds(self, onset: Fraction, end: Fraction) -> tuple[float, float]:
        """Seconds of the onset and of the length, to six decimals."""
        start = self._second(onset)
        return rounded(start), rounded(self._second(end) - start)

    def _second(self, time: Fraction) -> float:
        found = self._known_seconds.get(time)
        if found is None:
            found = self._known_seconds[time] = self._score.tempo.seconds(time)
        return found
