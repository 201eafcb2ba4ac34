"""The director's decisions about one score as played, which the rows above read.

Conventions
-----------
* Times are quarter notes as played; spans are half open. A decision about a bar that is repeated
  stands once for each time it is played.
* Parts are indices into `Score.parts`.
* Roots, tonics and pedals are spelled as the score sounds, its transposition included.
* Qualities and drift policies are told by their names; `choicesfile` has made sure of them.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from retune.pitch import PitchClass


@dataclass(frozen=True, slots=True)
class Span:
    """From `onset` to `end`, which it leaves out."""

    onset: Fraction
    end: Fraction

    def holds(self, onset: Fraction) -> bool:
        """Whether a time lies inside."""
        return self.onset <= onset < self.end


@dataclass(frozen=True, slots=True)
class ChordChoice:
    """How the chord that sounds at `onset` is read, up to `end` or else to its own end.

    `quality` None leaves the likeliest over the root; `limit` is the prime limit of its ratios.
    """

    onset: Fraction
    end: Fraction | None = None
    root: PitchClass | None = None
    quality: str | None = None
    limit: int | None = None


@dataclass(frozen=True, slots=True)
class RatioChoice:
    """The ratio above the root that a part's note takes in the chord at `onset`."""

    onset: Fraction
    part: int
    ratio: Fraction


@dataclass(frozen=True, slots=True)
class PassageChoice:
    """Another policy for the chords that begin in a span; None leaves that of the piece."""

    span: Span
    prime_limit: int | None = None
    drift: str | None = None
    held_shift: float | None = None
    melody: int | None = None


@dataclass(frozen=True, slots=True)
class PedalChoice:
    """A pitch that everything in a span is tuned to; `cents` None is its place in the scale."""

    span: Span
    pitch: PitchClass
    cents: float | None = None


@dataclass(frozen=True, slots=True)
class CentreChoice:
    """From the chord at `onset` on the tonic stands at `cents`, whatever came before.

    `tonic` None is the home tonic.
    """

    onset: Fraction
    cents: float = 0.0
    tonic: PitchClass | None = None


@dataclass(frozen=True, slots=True)
class Choices:
    """All decisions that bear on the analysis and the tuning."""

    chords: tuple[ChordChoice, ...] = ()
    ratios: tuple[RatioChoice, ...] = ()
    passages: tuple[PassageChoice, ...] = ()
    pedals: tuple[PedalChoice, ...] = ()
    centres: tuple[CentreChoice, ...] = ()


NO_CHOICES = Choices()
