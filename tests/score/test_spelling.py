"""Spelling against the spelling of the corpus (music21's, read from the installed package)."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from music21 import converter, corpus, note

from retune.pitch import Pitch, PitchClass
from retune.score.spelling import spell

Table = list[tuple[Fraction, Pitch]]


def table_of(path: Path) -> tuple[Table, int]:
    """Onsets and spelled pitches of a corpus score's notes, and its first key signature."""
    score = converter.parse(path, forceSource=True, storePickle=False)
    score.toSoundingPitch(inPlace=True)
    found: Table = []
    for part in score.parts:
        for one in part.recurse().getElementsByClass(note.Note):
            if one.tie is None or one.tie.type == "start":
                onset = Fraction(one.getOffsetInHierarchy(part))
                pitch = Pitch(one.pitch.step, int(one.pitch.alter), one.pitch.implicitOctave)
                found.append((onset, pitch))
    signature = score.recurse().getElementsByClass("KeySignature").first()
    return found, signature.sharps


def right_names(tables: Sequence[tuple[Table, int]], fifths: int = 0) -> float:
    """Share of notes spelled as in the corpus, all moved along the line of fifths."""
    right = total = 0
    for table, key in tables:
        wanted = [moved(pitch, fifths) for _, pitch in table]
        notes = [(onset, pitch.key) for (onset, _), pitch in zip(table, wanted, strict=True)]
        spelled = spell(notes, [(Fraction(0), key + fifths)])
        right += sum(a == b for a, b in zip(spelled, wanted, strict=True))
        total += len(wanted)
    return right / total


def moved(pitch: Pitch, fifths: int) -> Pitch:
    """A pitch transposed by fifths, to the nearest octave or so."""
    semitones = (7 * fifths + 6) % 12 - 6
    return Pitch.at_key(
        pitch.key + semitones, PitchClass.from_fifths(pitch.pitch_class.fifths + fifths)
    )


@pytest.fixture(scope="module")
def chorales() -> list[tuple[Table, int]]:
    paths = [p for p in corpus.getComposer("bach") if p.suffix == ".mxl"]
    return [table_of(path) for path in sorted(paths)[:300:10]]


def test_chorales_are_spelled_as_in_the_corpus(chorales: list[tuple[Table, int]]) -> None:
    # Meredith 2006 reports 99.4 % on a corpus of eight composers (from memory).
    assert len(chorales) == 30
    assert right_names(chorales) > 0.995


@pytest.mark.parametrize("fifths", [-6, -3, 4, 6])
def test_spelling_follows_the_key_signature(chorales: list[tuple[Table, int]], fifths: int) -> None:
    in_range = [(table, key) for table, key in chorales[:12] if -7 <= key + fifths <= 7]
    assert right_names(in_range, fifths) > 0.995


def test_without_a_signature_the_fewest_signs_win() -> None:
    scale = [(Fraction(i), key) for i, key in enumerate((68, 70, 72, 73, 75, 77, 79, 80))]
    assert " ".join(p.name for p in spell(scale)) == "Ab4 Bb4 C5 Db5 Eb5 F5 G5 Ab5"


def test_each_signature_spells_its_own_section() -> None:
    scale = (61, 63, 65, 66, 68, 70, 72, 73)
    notes = [(Fraction(i), key) for i, key in enumerate(scale * 16)]
    spelled = spell(notes, [(Fraction(0), -5), (Fraction(64), 7)])
    assert {p.pitch_class.name for p in spelled[:64]} == {"Db", "Eb", "F", "Gb", "Ab", "Bb", "C"}
    assert {p.pitch_class.name for p in spelled[64:]} == {"C#", "D#", "E#", "F#", "G#", "A#", "B#"}


@pytest.mark.parametrize(
    ("keys", "names"),
    [
        # Harmonic minor scales as any theory book prints them: common practice, no source.
        ((57, 59, 60, 62, 64, 65, 68, 69), "A3 B3 C4 D4 E4 F4 G#4 A4"),
        ((60, 62, 63, 65, 67, 68, 71, 72), "C4 D4 Eb4 F4 G4 Ab4 B4 C5"),
        ((64, 66, 67, 69, 71, 72, 75, 76), "E4 F#4 G4 A4 B4 C5 D#5 E5"),
    ],
)
def test_harmonic_minor_keeps_its_raised_seventh(keys: tuple[int, ...], names: str) -> None:
    notes = [(Fraction(i), key) for i, key in enumerate(keys)]
    assert " ".join(p.name for p in spell(notes)) == names


@example([(Fraction(0), key) for key in (0, 0, 0, 2, 2, 2, 8, 69)], 5)
@given(
    st.lists(st.tuples(st.fractions(0, 99, max_denominator=12), st.integers(0, 127)), max_size=90),
    st.integers(-7, 7),
)
def test_any_notes_keep_their_keys(notes: list[tuple[Fraction, int]], fifths: int) -> None:
    spelled = spell(notes, [(Fraction(0), fifths)])
    assert [pitch.key for pitch in spelled] == [key for _, key in notes]
    assert all(abs(pitch.alter) <= 2 for pitch in spelled)
