"""Grace notes: short notes just before the beat.

Conventions
-----------
* Each takes a thirty-second note, less where there is no room (our choice; books differ).
* Their time comes from the note that ends where they lead to, at most half of it, else from
  the rest before; at the very start from the main note.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction
from itertools import groupby

from retune.score.model import Note
from retune.score.ties import Notehead

GRACE_LENGTH = Fraction(1, 8)
"""Quarter notes."""


def with_graces(notes: Sequence[Note], graces: Sequence[Notehead]) -> list[Note]:
    """One line's notes with its grace notes among them, in no particular order.

    Grace notes that have neither a note nor a rest to take time from are left out.
    """
    result = list(notes)
    if not graces:
        return result
    ending: dict[Fraction, list[int]] = {}
    for place, note in enumerate(notes):
        ending.setdefault(note.end, []).append(place)
    ends = sorted(ending)
    for onset, group in groupby(sorted(graces, key=lambda head: head.onset), _onset):
        heads = list(group)
        wished = len(heads) * GRACE_LENGTH
        before = ending.get(onset, ())
        if before:
            total = min(wished, *(result[place].duration / 2 for place in before))
            for place in before:
                note = result[place]
                result[place] = replace(note, duration=note.duration - total, stolen=total)
            result.extend(_spread(heads, onset - total, total))
        elif onset > 0:
            place = bisect_left(ends, onset)
            total = min(wished, onset - (ends[place - 1] if place else 0))
            result.extend(_spread(heads, onset - total, total))
        else:
            result = _at_the_start(result, heads, wished)
    return result


def _onset(head: Notehead) -> Fraction:
    return head.onset


def _at_the_start(notes: list[Note], heads: Sequence[Notehead], wished: Fraction) -> list[Note]:
    main = [note for note in notes if note.onset == 0]
    if not main:
        return notes
    total = min(wished, *(note.duration / 2 for note in main))
    moved = [replace(note, onset=total, duration=note.duration - total) for note in main]
    return [
        *moved,
        *(note for note in notes if note.onset > 0),
        *_spread(heads, Fraction(0), total),
    ]


def _spread(heads: Sequence[Notehead], start: Fraction, total: Fraction) -> list[Note]:
    each = total / len(heads)
    return [
        Note(
            part=head.line,
            onset=start + place * each,
            duration=each,
            pitch=head.written.pitch,
            velocity=head.velocity,
            lyric=head.lyric,
            grace=True,
            marks=head.written.marks,
            sources=(head.written.source,) if head.written.source else (),
        )
        for place, head in enumerate(heads)
    ]
