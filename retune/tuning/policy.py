"""What the director may ask of the tuning."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum

from retune.errors import WishError
from retune.pitch import PitchClass
from retune.units import STANDARD_REFERENCE_HZ

DEFAULT_HELD_SHIFT = 4.9
"""Cents; the most a sounding note may move from one slice to the next."""

DEFAULT_DRIFT_WITHIN = 22.0
"""Cents; about a comma."""

PRIME_LIMITS = (3, 5, 7)

NO_BOUND = math.inf
"""`Policy.held_shift` for notes that may move as far as the chords lead."""


class Drift(StrEnum):
    """How the piece is kept from drifting."""

    FOLLOW = "follow"
    WITHIN = "within"
    GENTLE = "gentle"
    ANCHORED = "anchored"


class Temperament(StrEnum):
    """Just, or one of the temperaments for comparison."""

    JUST = "just"
    EQUAL = "equal"
    PYTHAGOREAN = "pythagorean"
    MEANTONE = "meantone"


class Pull(StrEnum):
    """Which notes of the voices are drawn to a fixed accompaniment."""

    ROOTS = "roots"
    ALL = "all"


@dataclass(frozen=True, slots=True)
class FixedTuning:
    """A tuning that does not move: cents off equal temperament for the 12 keys from C up."""

    name: str
    cents: tuple[float, ...]


EQUAL_TUNING = FixedTuning("equal", (0.0,) * 12)


@dataclass(frozen=True, slots=True)
class Policy:
    """The tuning policy of a piece.

    Parameters
    ----------
    prime_limit : int
        3, 5 or 7: the largest prime in any ratio used.
    drift : Drift
        How the piece is kept from drifting; README says it in a director's words.
    drift_within : float
        Cents, for `Drift.WITHIN`.
    held_shift : float
        Cents, 0 (a sounding note never moves) to infinity (no bound).
    temperament : Temperament
        Just, or a temperament for comparison.
    reference_hz : float
        Frequency of A4, Hz.
    tonic : PitchClass or None
        The home tonic; None to find it.
    melody : str or None
        Name of the part whose line is kept smoothest.
    accompaniment_tuning : FixedTuning or None
        How parts that cannot move are tuned; None for quarter-comma meantone placed by
        spelling on the home tonic.
    accompaniment_pull : Pull
        Which notes of the voices are drawn to them.

    Raises
    ------
    WishError
        For a prime limit, a number of cents or a frequency that cannot be.
    """

    prime_limit: int = 5
    drift: Drift = Drift.GENTLE
    drift_within: float = DEFAULT_DRIFT_WITHIN
    held_shift: float = DEFAULT_HELD_SHIFT
    temperament: Temperament = Temperament.JUST
    reference_hz: float = STANDARD_REFERENCE_HZ
    tonic: PitchClass | None = None
    melody: str | None = None
    accompaniment_tuning: FixedTuning | None = EQUAL_TUNING
    accompaniment_pull: Pull = Pull.ROOTS

    def __post_init__(self) -> None:
        if self.prime_limit not in PRIME_LIMITS:
            raise WishError(f"no prime limit {self.prime_limit}", hint="Choose 3, 5 or 7")
        if not self.held_shift >= 0.0:
            raise WishError(f"a held shift of {self.held_shift} cents", hint="0 or more is needed")
        if not 0.0 <= self.drift_within < math.inf:
            raise WishError(f"drift within {self.drift_within} cents", hint="0 or more is needed")
        if not 0.0 < self.reference_hz < math.inf:
            raise WishError(f"a reference pitch of {self.reference_hz} Hz", hint="440 is usual")
