"""Spelled pitches and pitch classes.

Conventions
-----------
* `alter` counts semitones: F# has 1, Bb has -1.
* A pitch is a sounding pitch; octave 4 starts at middle C (C4 = key 60).
* `fifths` is the place on the line of fifths: F -1, C 0, G 1, F# 6, Bb -2.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from retune.errors import WishError

STEPS = "CDEFGAB"
_SEMITONES = {"C": 0, "D": 2, "E": 4, "F": 5, "G": 7, "A": 9, "B": 11}
_FIFTHS = {"F": -1, "C": 0, "G": 1, "D": 2, "A": 3, "E": 4, "B": 5}
_NAME = re.compile(r"([A-Ga-g])(##|bb|x|#|b|)(-?\d+)?")
_ALTER = {"": 0, "#": 1, "##": 2, "x": 2, "b": -1, "bb": -2}


def _signs(alter: int) -> str:
    return "#" * alter if alter >= 0 else "b" * -alter


@dataclass(frozen=True, slots=True)
class PitchClass:
    """A spelled pitch class, such as F# or Bb."""

    step: str
    alter: int = 0

    @property
    def name(self) -> str:
        """Letter and signs, with # and b.

        >>> PitchClass("F", 1).name
        'F#'
        """
        return self.step + _signs(self.alter)

    @property
    def chroma(self) -> int:
        """Semitones above C, 0 to 11."""
        return (_SEMITONES[self.step] + self.alter) % 12

    @property
    def fifths(self) -> int:
        """Place on the line of fifths, C = 0."""
        return _FIFTHS[self.step] + 7 * self.alter

    @classmethod
    def from_fifths(cls, fifths: int) -> PitchClass:
        """The pitch class at a place on the line of fifths.

        >>> PitchClass.from_fifths(6).name
        'F#'
        """
        alter, place = divmod(fifths + 1, 7)
        return cls("FCGDAEB"[place], alter)

    @classmethod
    def parse(cls, text: str) -> PitchClass:
        """Read a name such as 'F#' or 'Bb'; raises `WishError`."""
        match = _NAME.fullmatch(text.strip().replace("♯", "#").replace("♭", "b"))
        if match is None or match[3] is not None:
            raise WishError(f"'{text}' is not a pitch name", hint="Write it like D, F# or Bb")
        return cls(match[1].upper(), _ALTER[match[2]])

    def __str__(self) -> str:
        return self.name


@dataclass(frozen=True, slots=True)
class Pitch:
    """A spelled sounding pitch, such as F#4."""

    step: str
    alter: int
    octave: int

    @property
    def key(self) -> int:
        """MIDI key number; 60 for C4 and for B#3.

        >>> Pitch("B", 1, 3).key
        60
        """
        return 12 * (self.octave + 1) + _SEMITONES[self.step] + self.alter

    @property
    def pitch_class(self) -> PitchClass:
        """The pitch without its octave."""
        return PitchClass(self.step, self.alter)

    @property
    def name(self) -> str:
        """Letter, signs and octave, such as 'F#4'."""
        return f"{self.step}{_signs(self.alter)}{self.octave}"

    @classmethod
    def parse(cls, text: str) -> Pitch:
        """Read a name such as 'F#4' or 'Bb3'; raises `WishError`."""
        match = _NAME.fullmatch(text.strip().replace("♯", "#").replace("♭", "b"))
        if match is None or match[3] is None:
            raise WishError(
                f"'{text}' is not a pitch with its octave", hint="Write it like D3, F#4 or Bb3"
            )
        return cls(match[1].upper(), _ALTER[match[2]], int(match[3]))

    @classmethod
    def at_key(cls, key: int, spelling: PitchClass) -> Pitch:
        """The pitch of a key number under a spelling of its pitch class.

        >>> Pitch.at_key(59, PitchClass("C", -1)).name
        'Cb4'
        """
        natural = key - spelling.alter
        return cls(spelling.step, spelling.alter, natural // 12 - 1)

    def __str__(self) -> str:
        return self.name
