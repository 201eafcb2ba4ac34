"""Grace notes: short notes just before the beat.

Conventions
-----------
* Each takes a thirty-second note, less where there is no room (our choice; books differ).
* Their time comes from the note that ends where they lead to, at most half of it, else from
  the rest before; at the very start from the main note.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Iterator, Sequence
from dataclasses import replace
from fractions import Fraction

from retune.score.model import Note

GRACE_LENGTH = Fraction(1, 8)
"""Quarter notes."""


def with_graces(notes: Sequence[Note], graces: Sequence[Note]) -> list[Note]:
    """One line's notes with its grace notes among them, in no particular order.

    Parameters
    ----------
    notes : sequence of Note
    graces : sequence of Note
        In order, each at the onset that it leads to; their durations are set here. Those with
        neither a note nor a rest to take time from are left out.
    """
    result = list(notes)
    ending: dict[Fraction, list[int]] = {}
    for place, note in enumerate(notes):
        ending.setdefault(note.end, []).append(place)
    ends = sorted(ending)
    for onset, group in _by_onset(graces).items():
        wished = len(group) * GRACE_LENGTH
        before = ending.get(onset, ())
        if before:
            total = min(wished, *(result[place].duration / 2 for place in before))
            for place in before:
                note = result[place]
                result[place] = replace(note, duration=note.duration - total, stolen=total)
        elif onset > 0:
            place = bisect_left(ends, onset)
            total = min(wished, onset - (ends[place - 1] if place else 0))
        else:
            total = _room_at_the_start(notes, wished)
            result = [_later(note, total) for note in result]
            onset = total
        if total:
            result.extend(_spread(group, onset - total, total))
    return result


def _by_onset(graces: Sequence[Note]) -> dict[Fraction, list[Note]]:
    groups: dict[Fraction, list[Note]] = {}
    for grace in graces:
        groups.setdefault(grace.onset, []).append(grace)
    return groups


def _room_at_the_start(notes: Sequence[Note], wished: Fraction) -> Fraction:
    """What the notes at onset 0 can give; 0 where there are none."""
    halves = [note.duration / 2 for note in notes if note.onset == 0]
    return min(wished, *halves) if halves else Fraction(0)


def _later(note: Note, by: Fraction) -> Note:
    """A note at onset 0 begins later; all others stay."""
    if note.onset != 0:
        return note
    return replace(note, onset=by, duration=note.duration - by)


def _spread(group: Sequence[Note], start: Fraction, total: Fraction) -> Iterator[Note]:
    each = total / len(group)
    for place, grace in enumerate(group):
        yield replace(grace, onset=start + place * each, duration=each, grace=True)
