"""What the user wishes of the reading of a score."""

from __future__ import annotations

from dataclasses import dataclass, field

from retune.limits import Limits
from retune.score.pace import Pace


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
    """

    repeats: bool = True
    fermatas: bool = True
    accompaniment: tuple[str, ...] = ()
    limits: Limits = field(default_factory=Limits)
    piece: int | None = None
    transpose: int = 0
    tempo: Pace = field(default_factory=Pace)
