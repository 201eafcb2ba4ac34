"""Notes that are not printed: played twins of printed notes, or music in their own right.

Some files play an ornament out in notes that are not printed, beside the printed note that
bears its sign. They would sound twice, so they are left out where they double a printed note,
and so are the others of the same voice while that note lasts.
"""

from __future__ import annotations

from retune.errors import Weight
from retune.score.musicxml.draft import BarDraft
from retune.written import WrittenNote


def settle_hidden(bar: BarDraft) -> None:
    """Leave out hidden notes that double printed ones; name those that sound."""
    if not bar.hidden:
        return
    hidden = set(bar.hidden)
    printed = [note for note in bar.notes if note.source not in hidden]
    lines: dict[tuple[int, str], list[WrittenNote]] = {}
    for note in bar.notes:
        if note.source in hidden:
            lines.setdefault((note.staff, note.voice), []).append(note)
    dropped: set[str] = set()
    for line in lines.values():
        doubled = [note for note in printed if any(_is_twin(other, note) for other in line)]
        for note in line:
            if any(_starts_within(note, other) for other in doubled):
                dropped.add(note.source)
            else:
                bar.remark(Weight.DOUBT, "a note that is not printed sounds", note.onset)
    if dropped:
        bar.remark(Weight.NOTE, "notes that are not printed double printed ones and are left out")
        bar.notes = [note for note in bar.notes if note.source not in dropped]


def _is_twin(hidden: WrittenNote, printed: WrittenNote) -> bool:
    return hidden.pitch.key == printed.pitch.key and _starts_within(hidden, printed)


def _starts_within(note: WrittenNote, other: WrittenNote) -> bool:
    end = other.onset + other.duration
    return other.onset <= note.onset < end or other.onset == note.onset
