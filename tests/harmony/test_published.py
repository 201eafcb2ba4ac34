"""Roots of single chords against published tables."""

from __future__ import annotations

import numpy as np
import pytest

from retune.harmony import Quality, analyse
from tests.harmony.invented import score_of

# Root-support weights by semitones above the root: Parncutt, "Revision of Terhardt's
# psychoacoustical model of the root(s) of a musical chord", Music Perception 6(1), 1988.
PARNCUTT = {0: 1.0, 7: 1 / 2, 4: 1 / 3, 10: 1 / 4, 2: 1 / 5, 3: 1 / 10}

# Table 4 of the same paper: ambiguity, the square root of the summed over the greatest weight.
AMBIGUITY = {
    (0, 4, 7): 2.0, (0, 3, 7): 2.1, (0, 4, 8): 2.3, (0, 3, 6): 2.5, (0, 4, 7, 10): 2.1,
    (0, 3, 7, 10): 2.3, (0, 4, 7, 11): 2.3, (0, 3, 6, 10): 2.4, (0, 3, 6, 9): 2.9,
}  # fmt: skip
NAMES = ["C", "C#", "D", "Eb", "E", "F", "F#", "G", "Ab", "A", "Bb", "B"]


def parncutt(tones: tuple[int, ...]) -> np.ndarray:
    return np.array([sum(PARNCUTT.get((t - r) % 12, 0.0) for t in tones) for r in range(12)])


@pytest.mark.parametrize("tones", AMBIGUITY)
def test_coded_weights_reproduce_the_published_table(tones: tuple[int, ...]) -> None:
    weights = parncutt(tones)
    assert np.sqrt(weights.sum() / weights.max()) == pytest.approx(AMBIGUITY[tones], abs=0.06)


@pytest.mark.parametrize("tones", [(0, 4, 7), (0, 3, 7), (0, 4, 7, 10), (0, 4, 7, 11)])
@pytest.mark.parametrize("turn", range(12))
def test_clear_chords_have_parncutts_root(tones: tuple[int, ...], turn: int) -> None:
    """Chords whose greatest weight stands alone, in root position, on every pitch class."""
    lines = [f"{NAMES[(tone + turn) % 12]}{3 + place}:4" for place, tone in enumerate(tones)]
    chord = analyse(score_of(*lines)).chords[0]
    assert chord.root is not None
    assert chord.root.chroma == (int(parncutt(tones).argmax()) + turn) % 12


def test_four_tones_make_a_seventh_not_a_triad() -> None:
    """C E G Bb of equal weight: C7 scores 4, C major 2, E diminished 2.

    Pardo & Birmingham, "Algorithms for chordal analysis", Computer Music Journal 26(2), 2002;
    scores computed by their rule: matching less non-matching less missing tones.
    """
    chord = analyse(score_of("Bb4:4", "G4:4", "E4:4", "C3:4")).chords[0]
    assert (str(chord.root), chord.quality) == ("C", Quality.DOMINANT_SEVENTH)
