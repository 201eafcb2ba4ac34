"""Slices, chords and the role of every note in them.

Conventions
-----------
* A slice is the time between two neighbouring onsets or releases of any part.
* A chord is a run of slices with one local root and one quality. Chords cover the whole piece.
  A short rest of all parts belongs to the chord before it; in longer silence root and quality
  are None.
* Slice ranges are half open: `first` to `last`, last excluded.
* Note indices point into `Score.notes`. Grace notes are in no slice.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from fractions import Fraction

from retune.pitch import PitchClass

DOUBTFUL = 0.6
"""Confidence up to which a root is marked as in doubt (our choice)."""


class Quality(StrEnum):
    """Chord qualities, with the names that the note list prints."""

    MAJOR = "major"
    MINOR = "minor"
    DIMINISHED = "diminished"
    AUGMENTED = "augmented"
    DOMINANT_SEVENTH = "dominant seventh"
    MAJOR_SEVENTH = "major seventh"
    MINOR_SEVENTH = "minor seventh"
    HALF_DIMINISHED = "half-diminished"
    DIMINISHED_SEVENTH = "diminished seventh"
    MINOR_MAJOR_SEVENTH = "minor-major seventh"


class Degree(StrEnum):
    """Which member of its chord a chord tone is: of its template, or a tone added to it."""

    ROOT = "root"
    THIRD = "third"
    FIFTH = "fifth"
    SEVENTH = "seventh"
    SIXTH = "sixth"
    NINTH = "ninth"
    FOURTH = "fourth"
    """In place of the third."""
    SECOND = "second"
    """In place of the third."""


class Role(StrEnum):
    """Chord tone, or the kind of non-chord tone."""

    CHORD_TONE = "chord tone"
    PASSING = "passing"
    NEIGHBOUR = "neighbour"
    SUSPENSION = "suspension"
    ANTICIPATION = "anticipation"
    APPOGGIATURA = "appoggiatura"
    PEDAL = "pedal"
    OTHER = "other"


@dataclass(frozen=True, slots=True)
class Slice:
    """One slice; `notes` are the sounding notes' indices in part order, low to high in a part."""

    index: int
    onset: Fraction
    duration: Fraction
    notes: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Chord:
    """One chord: its time, root, quality, confidence (0 to 1) and the next likely reading.

    `added` are tones beyond the quality's own: a sixth, a ninth, or a fourth or second in place
    of a third that never sounds. `decided` says that the director chose the root or quality.
    """

    index: int
    onset: Fraction
    duration: Fraction
    first: int
    last: int
    root: PitchClass | None
    quality: Quality | None
    confidence: float
    runner_up: tuple[PitchClass, Quality] | None = None
    added: tuple[Degree, ...] = ()
    decided: bool = False

    @property
    def doubtful(self) -> bool:
        """Whether the root is to be marked as in doubt."""
        return self.root is not None and self.confidence <= DOUBTFUL

    @property
    def end(self) -> Fraction:
        """Onset of the chord that follows."""
        return self.onset + self.duration


@dataclass(frozen=True, slots=True)
class Fragment:
    """The part of one note that lies in one chord, with its role there.

    `degree` is set for chord tones and None for the others.
    """

    note: int
    chord: int
    first: int
    last: int
    role: Role
    degree: Degree | None


@dataclass(frozen=True, slots=True)
class Tonic:
    """The home tonic: a spelled pitch class and whether its scale is minor."""

    root: PitchClass
    minor: bool = False


@dataclass(frozen=True)
class Harmony:
    """The analysis of a whole score.

    Fragments are sorted by note, then chord, so each note's fragments stand together.
    """

    slices: tuple[Slice, ...]
    chords: tuple[Chord, ...]
    fragments: tuple[Fragment, ...]
    tonic: Tonic
