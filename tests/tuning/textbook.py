"""Textbook progressions as scores with their harmony, built by hand."""

from __future__ import annotations

from fractions import Fraction

from retune.harmony.model import (
    Chord,
    Degree,
    Fragment,
    Harmony,
    Quality,
    Role,
    Slice,
    Tonic,
)
from retune.pitch import Pitch, PitchClass
from retune.score.model import Bar, Note, Part, PartKind, Score

DEGREES = (Degree.ROOT, Degree.THIRD, Degree.FIFTH, Degree.SEVENTH)
SEMITONES = {
    Quality.MAJOR: (0, 4, 7),
    Quality.MINOR: (0, 3, 7),
    Quality.DIMINISHED: (0, 3, 6),
    Quality.AUGMENTED: (0, 4, 8),
    Quality.DOMINANT_SEVENTH: (0, 4, 7, 10),
    Quality.MAJOR_SEVENTH: (0, 4, 7, 11),
    Quality.MINOR_SEVENTH: (0, 3, 7, 10),
    Quality.HALF_DIMINISHED: (0, 3, 6, 10),
    Quality.DIMINISHED_SEVENTH: (0, 3, 6, 9),
    Quality.MINOR_MAJOR_SEVENTH: (0, 3, 7, 11),
}
MAJ, MIN, DOM = Quality.MAJOR, Quality.MINOR, Quality.DOMINANT_SEVENTH


def build(
    chords: list[tuple[str | None, Quality | None]],
    voices: list[list[str | None]],
    tonic: str = "C",
    quarters: int = 1,
    accompaniment: tuple[int, ...] = (),
    restrike: bool = False,
    minor: bool = False,
) -> tuple[Score, Harmony]:
    """A score of one pitch a chord in each voice; equal neighbours are held, None is a rest.

    Parameters
    ----------
    chords : list of (root, quality)
        One for each step of the progression, all of the same length.
    voices : list of lists of pitch names
        By part, as many pitches as chords.
    quarters : int
        Length of each chord.
    accompaniment : tuple of int
        Parts that cannot move.
    restrike : bool
        Equal neighbours are struck again rather than held.
    """
    length = Fraction(quarters)
    parts = tuple(
        Part(
            index,
            f"Part {index + 1}",
            PartKind.ACCOMPANIMENT if index in accompaniment else PartKind.VOICE,
        )
        for index in range(len(voices))
    )
    spans: list[tuple[int, int, int, str]] = []
    for part, line in enumerate(voices):
        for step, name in enumerate(line):
            if name is None:
                continue
            last = spans[-1] if spans else None
            if not restrike and last and last[0] == part and last[2] == step and last[3] == name:
                spans[-1] = (part, last[1], step + 1, name)
            else:
                spans.append((part, step, step + 1, name))
    spans.sort(key=lambda span: (span[1], span[0], Pitch.parse(span[3]).key))
    notes = tuple(
        Note(part, first * length, (last - first) * length, Pitch.parse(name))
        for part, first, last, name in spans
    )
    count = len(chords)
    slices = tuple(
        Slice(
            step,
            step * length,
            length,
            tuple(
                sorted(
                    (n for n, span in enumerate(spans) if span[1] <= step < span[2]),
                    key=lambda n: (spans[n][0], notes[n].pitch.key),
                )
            ),
        )
        for step in range(count)
    )
    sounding = tuple(
        Chord(
            step,
            step * length,
            length,
            step,
            step + 1,
            PitchClass.parse(root) if root else None,
            quality,
            1.0,
        )
        for step, (root, quality) in enumerate(chords)
    )
    fragments = tuple(
        _fragment(number, step, notes[number], sounding[step])
        for number, (_, first, last, _) in enumerate(spans)
        for step in range(first, last)
    )
    bars = tuple(Bar(step, step, str(step + 1), step * length, length) for step in range(count))
    score = Score("textbook", "Textbook", parts, notes, bars)
    home = Tonic(PitchClass.parse(tonic), minor)
    return score, Harmony(slices, sounding, fragments, home)


def _fragment(number: int, step: int, note: Note, chord: Chord) -> Fragment:
    degree = None
    if chord.root is not None and chord.quality is not None:
        apart = (note.pitch.key - chord.root.chroma) % 12
        members = SEMITONES[chord.quality]
        degree = DEGREES[members.index(apart)] if apart in members else None
    role = Role.CHORD_TONE if degree else Role.OTHER
    return Fragment(number, step, step, step + 1, role, degree)


def pump(cycles: int) -> tuple[Score, Harmony]:
    """I-vi-ii-V, `cycles` times, and I; every common tone held."""
    chords = [("C", MAJ), ("A", MIN), ("D", MIN), ("G", MAJ)] * cycles + [("C", MAJ)]
    soprano = ["C5", "C5", "D5", "D5"] * cycles + ["C5"]
    alto = ["G4", "A4", "A4", "G4"] * cycles + ["G4"]
    tenor = ["E4", "E4", "F4", "B3"] * cycles + ["E4"]
    bass = ["C3", "A2", "D3", "G2"] * cycles + ["C3"]
    # The soprano's D is the fifth of V; G is held from V into the next I by the alto.
    return build(chords, [soprano, alto, tenor, bass])


def benedetti(cycles: int) -> tuple[Score, Harmony]:
    """Benedetti's progression as fifths C-G, D-G, D-A, C-A: a note held over every change."""
    chords = [("C", MAJ), ("G", MAJ), ("D", MIN), ("A", MIN)] * cycles + [("C", MAJ)]
    upper = ["G4", "G4", "A4", "A4"] * cycles + ["G4"]
    lower = ["C4", "D4", "D4", "C4"] * cycles + ["C4"]
    return build(chords, [upper, lower])
