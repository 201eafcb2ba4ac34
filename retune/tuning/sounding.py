"""What sounds in each chord of a tuned score."""

from __future__ import annotations

from retune.harmony.model import Role
from retune.tuning.model import Segment, TunedNote, TunedScore

Row = dict[int, tuple[TunedNote, Segment]]
"""What each part sings, by part."""


def sung_by_chord(tuned: TunedScore) -> list[Row]:
    """For each chord, the note each part sings in it: its first chord tone, else its first."""
    found: list[Row] = [{} for _ in tuned.harmony.chords]
    for note in tuned.notes:
        for segment in note.segments:
            row, part = found[segment.chord], note.note.part
            held = row.get(part)
            better = held is not None and (
                held[1].role is not Role.CHORD_TONE and segment.role is Role.CHORD_TONE
            )
            if held is None or better:
                row[part] = (note, segment)
    return found
