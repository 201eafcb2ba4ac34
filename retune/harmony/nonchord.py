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

from retune.harmony.fragments import NO_NEIGHBOUR, neighbours
from retune.harmony.model import Chord, Degree, Fragment, Role
from retune.harmony.states import DEGREES, TONES
from retune.harmony.timeline import Timeline
from retune.score.model import Score


def degree_in(chord: Chord, chroma: int) -> Degree | None:
    """Which chord tone a pitch class (0 to 11) is, None for a non-chord tone."""
    if chord.root is None or chord.quality is None:
        return None
    interval = (chroma - chord.root.chroma) % 12
    tones = TONES[chord.quality]
    return DEGREES[tones.index(interval)] if interval in tones else None


def find_roles(score: Score, timeline: Timeline, chords: Sequence[Chord]) -> tuple[Fragment, ...]:
    """Fragments of all analysed notes, sorted by note, then chord."""
    into, out = (side.tolist() for side in neighbours(score, timeline))
    starts = np.array([chord.first for chord in chords], dtype=np.int64)
    opening = (np.searchsorted(starts, timeline.first, side="right") - 1).tolist()
    firsts, lasts = timeline.first.tolist(), timeline.last.tolist()
    fragments: list[Fragment] = []
    for place, note in enumerate(timeline.notes.tolist()):
        chroma = score.notes[note].pitch.key % 12
        first, last = firsts[place], lasts[place]
        index = opening[place]
        while index < len(chords) and chords[index].first < last:
            chord = chords[index]
            degree = degree_in(chord, chroma)
            if degree is not None:
                role = Role.CHORD_TONE
            else:
                following = chords[index + 1] if index + 1 < len(chords) else None
                promised = following is not None and degree_in(following, chroma) is not None
                role = nonchord_role(
                    into=into[place],
                    out=out[place],
                    held_in=first < chord.first,
                    held_out=last > chord.last,
                    promised=promised,
                )
            fragments.append(
                Fragment(note, index, max(first, chord.first), min(last, chord.last), role, degree)
            )
            index += 1
    return tuple(fragments)


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
