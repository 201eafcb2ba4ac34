"""Notes that are not printed: played twins of printed notes, or music in their own right."""

from __future__ import annotations

from retune.errors import Weight
from retune.score.musicxml.draft import BarDraft


def settle_hidden(bar: BarDraft) -> None:
    """Leave out hidden notes that double a printed note of the part; name the others."""
    if not bar.hidden:
        return
    hidden = set(bar.hidden)
    printed = [
        (note.pitch.key, note.onset, note.onset + note.duration)
        for index, note in enumerate(bar.notes)
        if index not in hidden
    ]
    twins: set[int] = set()
    for index in bar.hidden:
        note = bar.notes[index]
        if any(
            key == note.pitch.key and (start <= note.onset < end or start == note.onset)
            for key, start, end in printed
        ):
            twins.add(index)
        else:
            bar.remark(Weight.DOUBT, "a note that is not printed sounds", note.onset)
    if twins:
        bar.notes = [note for index, note in enumerate(bar.notes) if index not in twins]
