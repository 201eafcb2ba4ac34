"""Little scores written as lines of note names, for the tests of the analysis."""

from __future__ import annotations

from fractions import Fraction

from retune.pitch import Pitch
from retune.score.model import Bar, Note, Part, Score


def score_of(*voices: str, metre: tuple[int, int] = (4, 4)) -> Score:
    """Voices written as 'C5:1 D5:1/2 r:1', lengths in quarter notes, bars of one metre."""
    notes, longest = [], Fraction(0)
    for part, line in enumerate(voices):
        onset = Fraction(0)
        for word in line.split():
            name, _, length = word.partition(":")
            duration = Fraction(length or "1")
            if name != "r":
                notes.append(Note(part, onset, duration, Pitch.parse(name)))
            onset += duration
        longest = max(longest, onset)
    notes.sort(key=lambda note: (note.onset, note.part, note.pitch.key))
    bar = Fraction(4 * metre[0], metre[1])
    count = -int(-longest // bar)
    bars = tuple(Bar(i, i, str(i + 1), i * bar, bar, metre) for i in range(count))
    parts = tuple(Part(i, f"Part {i + 1}") for i in range(len(voices)))
    return Score("invented", "", parts, tuple(notes), bars)
