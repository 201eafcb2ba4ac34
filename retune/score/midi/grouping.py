"""Played-in timing gathered for the analysis: chords that were meant together begin together.

Only what the analysis sees is moved; every note keeps its own time in all outputs. Onsets closer
than a tolerance that follows the tempo become one, the earliest; a note that ends near an onset
ends there; the sustain pedal lets notes sound on.

Conventions
-----------
* Times are `Fraction` quarter notes from the start of the piece.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Mapping, Sequence
from dataclasses import replace
from fractions import Fraction

from retune.score.model import Note, Score
from retune.score.tempo import TempoMap

TOGETHER_SECONDS = 0.035
"""Onsets closer are heard as one chord (players of an ensemble start some 30 to 50 ms apart:
Rasch 1979, from memory)."""

TOGETHER_QUARTERS = Fraction(1, 16)
"""In slow music the tolerance grows no further: it must not swallow written notes."""

RELEASED_QUARTERS = Fraction(1, 8)
"""Keys are released less exactly than they are struck (our choice)."""

Pedals = Mapping[str, Sequence[tuple[Fraction, Fraction]]]
"""When each part's sustain pedal is down, by `Part.source`."""


def gathered(score: Score, pedals: Pedals) -> Score:
    """A score whose notes the analysis takes together, where they were played in; else the same."""
    onsets = sorted({note.onset for note in score.notes})
    heads = _heads(onsets, score.tempo)
    if heads is None and not any(pedals.values()):
        return score
    strikes: dict[tuple[int, int], list[Fraction]] = {}
    for note in score.notes:
        strikes.setdefault((note.part, note.pitch.key), []).append(note.onset)
    notes = []
    for note in score.notes:
        onset, end = note.onset, note.end
        if heads is not None:
            onset, end = heads[onset], _end(note, onsets, heads)
        pedal = pedals.get(score.parts[note.part].source, ())
        end = _held(note, pedal, strikes[note.part, note.pitch.key]) or end
        notes.append(replace(note, early=note.onset - onset, stolen=end - note.end))
    return replace(score, notes=tuple(notes))


def _heads(onsets: Sequence[Fraction], tempo: TempoMap) -> dict[Fraction, Fraction] | None:
    """By onset, the first of its group; None where every onset stands by itself."""
    heads: dict[Fraction, Fraction] = {}
    head, reach = Fraction(-1), Fraction(0)
    for onset in onsets:
        if onset - head > reach or head < 0:
            head, reach = onset, _tolerance(onset, tempo)
        heads[onset] = head
    return heads if any(onset != first for onset, first in heads.items()) else None


def _tolerance(onset: Fraction, tempo: TempoMap) -> Fraction:
    later = tempo.quarters(tempo.seconds(onset) + TOGETHER_SECONDS)
    return min(Fraction(later) - onset, TOGETHER_QUARTERS)


def _end(note: Note, onsets: Sequence[Fraction], heads: Mapping[Fraction, Fraction]) -> Fraction:
    """The head of an onset that the note ends near to, after its own; else its end."""
    place = bisect_left(onsets, note.end)
    near = min(
        onsets[max(place - 1, 0) : place + 1], key=lambda onset: abs(onset - note.end), default=None
    )
    if near is None or abs(near - note.end) > RELEASED_QUARTERS:
        return note.end
    return heads[near] if heads[near] > note.onset else note.end


def _held(
    note: Note, pedal: Sequence[tuple[Fraction, Fraction]], strikes: Sequence[Fraction]
) -> Fraction | None:
    """Where a note stops sounding that is released while the pedal is down: when the pedal goes
    up or its key is struck again; None where no pedal holds it."""
    place = bisect_right(pedal, note.end, key=lambda span: span[0]) - 1
    if place < 0 or pedal[place][1] <= note.end:
        return None
    again = bisect_right(strikes, note.onset)
    return min([pedal[place][1], *strikes[again : again + 1]])
