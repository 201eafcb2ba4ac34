"""The usual range of each kind of voice.

Those of harmony teaching for the four voices, S C4-G5, A G3-D5, T C3-G4, B E2-C4 (common
practice; Kostka & Payne and Aldwell & Schachter agree, from memory); mezzo-soprano and baritone
lie between them (common practice, no source).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from retune.score.model import Note, Part, Score, VoiceType

RANGES: dict[VoiceType, tuple[int, int]] = {
    VoiceType.SOPRANO: (60, 79),
    VoiceType.MEZZO: (57, 77),
    VoiceType.ALTO: (55, 74),
    VoiceType.TENOR: (48, 67),
    VoiceType.BARITONE: (45, 65),
    VoiceType.BASS: (40, 60),
}
"""Lowest and highest key of each voice."""


@dataclass(frozen=True, slots=True)
class Beyond:
    """A part's first note that lies furthest outside its usual range, on one side of it.

    `semitones` is how far: negative below, positive above.
    """

    part: Part
    note: Note
    semitones: int


def beyond_range(score: Score) -> Iterator[Beyond]:
    """Where sung parts leave their usual range, below before above; nothing for unknown voices."""
    notes: dict[int, list[Note]] = {part.index: [] for part in score.parts}
    for note in score.notes:
        notes[note.part].append(note)
    for part in score.parts:
        if part.voice_type is None or not part.tuned or not notes[part.index]:
            continue
        low, high = RANGES[part.voice_type]
        lowest = min(notes[part.index], key=lambda note: note.pitch.key)
        highest = max(notes[part.index], key=lambda note: note.pitch.key)
        if lowest.pitch.key < low:
            yield Beyond(part, lowest, lowest.pitch.key - low)
        if highest.pitch.key > high:
            yield Beyond(part, highest, highest.pitch.key - high)
