"""Stage one: which template each chord takes."""

from __future__ import annotations

from retune.harmony.model import Chord, Degree, Harmony
from retune.score.model import Score
from retune.tuning.ratios import AUGMENTED_SIXTH, Template, templates


def sixth_chords(score: Score, harmony: Harmony) -> frozenset[int]:
    """Chords whose seventh is spelled as an augmented sixth above the root."""
    found = set()
    for fragment in harmony.fragments:
        if fragment.degree is Degree.SEVENTH:
            root = harmony.chords[fragment.chord].root
            pitch = score.notes[fragment.note].pitch.pitch_class
            if root is not None and pitch.fifths - root.fifths == AUGMENTED_SIXTH:
                found.add(fragment.chord)
    return frozenset(found)


def alternatives(chord: Chord, limit: int, sixth: bool) -> tuple[Template, ...]:
    """The templates a chord may take; none where nothing sounds."""
    return templates(chord.quality, limit, sixth) if chord.quality else ()


def choose(score: Score, harmony: Harmony, limit: int) -> tuple[Template | None, ...]:
    """A template for each chord."""
    sixths = sixth_chords(score, harmony)
    return tuple(
        next(iter(alternatives(chord, limit, chord.index in sixths)), None)
        for chord in harmony.chords
    )
