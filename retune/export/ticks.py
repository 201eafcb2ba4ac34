"""Ticks: the whole numbers in which a MIDI file counts time.

A division (ticks a quarter note) is chosen so that every time of the piece is a whole tick.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction

from retune.tuning.model import TunedScore

MOST = 32767
"""The finest division a Standard MIDI File can state (RP-001: 15 bits)."""

_USUAL = 480
_FALLBACK = 2**5 * 3**3 * 5 * 7
"""For times no division holds exactly: 30240, exact for all usual tuplets."""


@dataclass(frozen=True, slots=True)
class Ticks:
    """Ticks a quarter note, and the greatest error of any time of the piece in quarter notes."""

    division: int
    error: Fraction = Fraction(0)

    def at(self, quarters: Fraction) -> int:
        """The tick nearest a time in quarter notes.

        >>> Ticks(480).at(Fraction(1, 3))
        160
        """
        doubled = 2 * quarters.denominator
        return (2 * quarters.numerator * self.division + quarters.denominator) // doubled


def ticks_for(tuned: TunedScore) -> Ticks:
    """The division for a piece: exact where one is, and no coarser than 480."""
    denominators = {time.denominator for time in _times(tuned)}
    exact = _USUAL
    for denominator in denominators:
        exact = math.lcm(exact, denominator)
        if exact > MOST:
            break
    if exact <= MOST:
        return Ticks(exact)
    bare = math.lcm(*denominators)
    if bare <= MOST:
        return Ticks(bare * max(1, -(-_USUAL // bare)))
    rough = Ticks(_FALLBACK)
    error = max(abs(time - Fraction(rough.at(time), _FALLBACK)) for time in _times(tuned))
    return Ticks(_FALLBACK, error)


def _times(tuned: TunedScore) -> Iterator[Fraction]:
    score = tuned.score
    for note in score.notes:
        yield note.onset
        yield note.duration
    yield from (segment.onset for note in tuned.notes for segment in note.segments)
    for bar in score.bars:
        yield bar.onset
        yield bar.duration
    for change in score.tempo.changes:
        yield change.onset
