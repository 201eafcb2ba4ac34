"""What the user wishes of the reading of a score."""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction

from retune.limits import Limits
from retune.score.pace import Pace


@dataclass(frozen=True, slots=True)
class TempoAt:
    """Beats a minute, as they are counted, from a place on: the bar's number in the file from 0,
    and quarter notes from its start."""

    written: int
    inside: Fraction
    beats: Fraction


@dataclass(frozen=True, slots=True)
class Hold:
    """What sounds at a place lasts `times` as long; 1 takes a fermata away."""

    written: int
    inside: Fraction
    times: Fraction


@dataclass(frozen=True, slots=True)
class ReadOptions:
    """How a score is read.

    Parameters
    ----------
    repeats : bool
        Play out repeats, endings and jumps; False plays every bar once, as written.
    fermatas : bool
        Stretch fermatas in the tempo map.
    accompaniment : tuple of str
        Names of parts whose pitch cannot move, case ignored. Naming a reduction that would be
        left out makes it sound.
    limits : Limits
        The largest input that is accepted.
    piece : int or None
        Which piece of a file that holds several, from 1.
    transpose : int
        Semitones by which all is moved, see `transpose.FURTHEST`.
    tempo : Pace
        The score's own tempo, a share of it, or a steady one.
    voices, doubled : tuple of str
        Names of parts that follow the just targets, and of parts that only double others and do
        not sound, whatever the file says of them.
    tempi : tuple of TempoAt
        Tempi besides those of the score.
    holds : tuple of Hold
        How long single fermatas last.
    """

    repeats: bool = True
    fermatas: bool = True
    accompaniment: tuple[str, ...] = ()
    limits: Limits = field(default_factory=Limits)
    piece: int | None = None
    transpose: int = 0
    tempo: Pace = field(default_factory=Pace)
    voices: tuple[str, ...] = ()
    doubled: tuple[str, ...] = ()
    tempi: tuple[TempoAt, ...] = ()
    holds: tuple[Hold, ...] = ()
