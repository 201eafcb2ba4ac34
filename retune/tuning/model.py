"""The tuned score: the one thing that tracks, voice, page and exporters see.

Conventions
-----------
* `cents` are the deviation from equal temperament at the reference pitch, of the note's key;
  + is sharp. The reference pitch itself is not in them.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from retune.errors import Finding
from retune.harmony.model import Harmony, Role
from retune.score.model import Note, Score
from retune.tuning.policy import Policy
from retune.units import hz_of


@dataclass(frozen=True, slots=True)
class Segment:
    """A stretch of one note with one tuned pitch in one chord.

    `ratio` is the exact just interval above the root, octave-reduced; None for tempered
    chords, accompaniment and lone lines.
    """

    onset: Fraction
    duration: Fraction
    chord: int
    role: Role
    ratio: Fraction | None
    cents: float

    @property
    def end(self) -> Fraction:
        """Where the segment ends, in quarter notes."""
        return self.onset + self.duration


@dataclass(frozen=True, slots=True)
class TunedNote:
    """A note with its tuned pitch: at least one segment, without gaps, from onset to end."""

    note: Note
    segments: tuple[Segment, ...]


@dataclass(frozen=True)
class TunedScore:
    """A score with its analysis, the policy in force and every note's tuned pitch.

    `notes` stand in the order of `score.notes`. `root_cents` holds the tuned cents of each
    chord's root (None where nothing sounds). `figures` are those of the note list: purity,
    held_shift, melody, drift, each a mapping of names to numbers.
    """

    score: Score
    harmony: Harmony
    policy: Policy
    notes: tuple[TunedNote, ...]
    root_cents: tuple[float | None, ...]
    figures: dict[str, dict[str, Any]]
    findings: tuple[Finding, ...] = ()

    def hz(self, note: TunedNote, segment: Segment) -> float:
        """Frequency of a segment in Hz, at the policy's reference pitch."""
        return hz_of(note.note.pitch.key, segment.cents, self.policy.reference_hz)

    def seconds(self, onset: Fraction) -> float:
        """Seconds from the first beat of the piece by the tempo map."""
        return self.score.tempo.seconds(onset)
