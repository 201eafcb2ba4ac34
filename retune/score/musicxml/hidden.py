"""Notes that are not printed: played twins of printed notes, or music in their own right.

Some files play an ornament out in notes that are not printed, beside the printed note that
bears its sign. They would sound twice, so they are left out where they double a printed note,
and so are the others of the same voice while that note lasts.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Iterable
from fractions import Fraction
from itertools import accumulate

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
        doubled = _Spans(_doubled(printed, line))
        for note in line:
            if note.onset in doubled:
                dropped.add(note.source)
            else:
                bar.remark(Weight.DOUBT, "a note that is not printed sounds", note.onset)
    if dropped:
        bar.remark(Weight.NOTE, "notes that are not printed double printed ones and are left out")
        bar.notes = [note for note in bar.notes if note.source not in dropped]


def _doubled(printed: list[WrittenNote], line: list[WrittenNote]) -> list[WrittenNote]:
    """The printed notes that a note of a hidden line repeats at their pitch while they last."""
    onsets: dict[int, list[Fraction]] = {}
    for note in sorted(line, key=lambda note: note.onset):
        onsets.setdefault(note.pitch.key, []).append(note.onset)
    found: list[WrittenNote] = []
    for note in printed:
        same = onsets.get(note.pitch.key, [])
        place = bisect_left(same, note.onset)
        if place < len(same) and _reaches(note.onset, note.onset + note.duration, same[place]):
            found.append(note)
    return found


def _reaches(start: Fraction, end: Fraction, onset: Fraction) -> bool:
    """Whether a note sounds at an onset not before its own; a grace note does at its own."""
    return onset < end or onset == start


class _Spans:
    """The times that some notes cover."""

    def __init__(self, notes: Iterable[WrittenNote]) -> None:
        spans = sorted((note.onset, note.onset + note.duration) for note in notes)
        self._starts = [start for start, _ in spans]
        self._ends = list(accumulate((end for _, end in spans), max))

    def __contains__(self, onset: Fraction) -> bool:
        place = bisect_right(self._starts, onset) - 1
        return place >= 0 and _reaches(self._starts[place], self._ends[place], onset)
