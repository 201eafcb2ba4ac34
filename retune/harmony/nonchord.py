"""The role of every note in every chord it sounds in.

Conventions
-----------
* Intervals to neighbours are semitones within the part, positive upwards; a step is one or two.
* Roles follow textbook usage: a suspension is prepared (held or struck again) and resolves by
  step down; an anticipation belongs to the chord that comes; a pedal lasts through the whole of
  a chord it is no member of.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from retune.harmony.model import Chord, Degree, Fragment, Role
from retune.harmony.neighbours import NO_NEIGHBOUR
from retune.harmony.states import DEGREES, TONES
from retune.harmony.timeline import Timeline


def find_roles(timeline: Timeline, chords: Sequence[Chord]) -> tuple[Fragment, ...]:
    """Fragments of all analysed notes, sorted by note, then chord."""
    starts = np.array([chord.first for chord in chords], dtype=np.int64)
    opening = (np.searchsorted(starts, timeline.first, side="right") - 1).tolist()
    tones = [_tones(chord) for chord in chords]
    spans = [(chord.first, chord.last) for chord in chords]
    columns = (
        timeline.notes, timeline.key % 12, timeline.first, timeline.last,
        timeline.into, timeline.out,
    )  # fmt: skip
    fragments: list[Fragment] = []
    for index, note, chroma, first, last, into, out in zip(
        opening, *(column.tolist() for column in columns), strict=True
    ):
        while index < len(chords) and spans[index][0] < last:
            begin, end = spans[index]
            degree = tones[index].get(chroma)
            role = Role.CHORD_TONE
            if degree is None:
                promised = index + 1 < len(chords) and chroma in tones[index + 1]
                role = nonchord_role(into, out, first < begin, last > end, promised)
            fragment = Fragment(note, index, max(first, begin), min(last, end), role, degree)
            fragments.append(fragment)
            index += 1
    return tuple(fragments)


def _tones(chord: Chord) -> dict[int, Degree]:
    """Degrees by pitch class; empty in silence."""
    if chord.root is None or chord.quality is None:
        return {}
    root = chord.root.chroma
    return {
        (root + interval) % 12: degree
        for interval, degree in zip(TONES[chord.quality], DEGREES, strict=False)
    }


def nonchord_role(into: int, out: int, held_in: bool, held_out: bool, promised: bool) -> Role:
    """Kind of a non-chord tone.

    Parameters
    ----------
    into, out : int
        Semitones from the note before and to the note after; `NO_NEIGHBOUR` without one.
    held_in, held_out : bool
        Whether the note sounds before the chord begins, and after it ends.
    promised : bool
        Whether the pitch is a chord tone of the next chord.
    """
    step_in = abs(into) in (1, 2)
    step_out = abs(out) in (1, 2)
    if held_in and held_out:
        return Role.PEDAL
    if held_out:
        return Role.ANTICIPATION if promised else Role.OTHER
    if (held_in or into == 0) and out in (-1, -2):
        return Role.SUSPENSION
    if held_in:
        return Role.OTHER
    if out == 0 and promised:
        return Role.ANTICIPATION
    if step_in and step_out:
        return Role.PASSING if into * out > 0 else Role.NEIGHBOUR
    if step_out and into != 0 and abs(into) != NO_NEIGHBOUR:
        return Role.APPOGGIATURA
    return Role.OTHER
