"""Added tones: what counts as one, what it is called, and its ratio.

Ratios: sixth chord 12:15:18:20, added ninth 4:5:6:9, suspended fourth 6:8:9, suspended second
8:9:12, common chord spellings in whole numbers (derived by exact arithmetic).
"""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path

import pytest

from retune.harmony import analyse
from retune.harmony.colour import add_tones
from retune.harmony.model import Chord, Degree, Fragment, Quality, Role
from retune.harmony.states import DEGREES, TONES
from retune.harmony.symbols import chord_symbol
from retune.pitch import Pitch, PitchClass
from retune.score.model import Bar, Note, Part, Score
from retune.score.read import read
from retune.tuning.ratios import DEGREES as PLACES
from retune.tuning.ratios import templates, with_added

FIXTURES = Path(__file__).parents[2] / "fixtures"


def coloured(
    quality: Quality, pitches: str, stranger: Role = Role.OTHER, sounding: int = 3
) -> tuple[Chord, tuple[Fragment, ...]]:
    """A chord on C of three slices in which these pitches sound; strangers in the first few."""
    names = [Pitch.parse(name) for name in pitches.split()]
    notes = tuple(Note(i, Fraction(0), Fraction(3), pitch) for i, pitch in enumerate(names))
    score = Score(
        "x", "x", tuple(Part(i, str(i)) for i in range(len(names))), notes,
        (Bar(0, 0, "1", Fraction(0), Fraction(4)),),
    )  # fmt: skip
    members = dict(zip(TONES[quality], DEGREES, strict=False))
    fragments = []
    for index, pitch in enumerate(names):
        degree = members.get(pitch.key % 12)
        role = stranger if degree is None else Role.CHORD_TONE
        fragments.append(Fragment(index, 0, 0, 3 if degree else sounding, role, degree))
    chord = Chord(0, Fraction(0), Fraction(3), 0, 3, PitchClass("C"), quality, 1.0)
    (found,), told = add_tones(score, [Fraction(n) for n in range(4)], [chord], fragments)
    return found, told


# common practice, no source
NAMES = [
    (Quality.MAJOR, "C3 E3 G3 A3", "C6"),
    (Quality.MINOR, "C3 Eb3 G3 A3", "Cm6"),
    (Quality.MAJOR, "C3 E3 G3 D4", "Cadd9"),
    (Quality.MAJOR, "C3 E3 A3 D4 G4", "C6/9"),
    (Quality.DOMINANT_SEVENTH, "C3 E3 Bb3 D4", "C9"),
    (Quality.DOMINANT_SEVENTH, "E3 G3 Bb3 D4", "C9"),
    (Quality.MINOR_SEVENTH, "C3 Eb3 Bb3 D4", "Cm9"),
    (Quality.MAJOR_SEVENTH, "C3 E3 B3 D4", "Cmaj9"),
    (Quality.MAJOR, "C3 F3 G3", "Csus4"),
    (Quality.MAJOR, "C3 D3 G3", "Csus2"),
    (Quality.DOMINANT_SEVENTH, "C3 F3 G3 Bb3", "C7sus4"),
    (Quality.MAJOR, "C3 E3 F3 G3", "C"),
    (Quality.MAJOR, "C3 E3 G3 C#4", "C"),
    (Quality.DIMINISHED, "C3 Eb3 Gb3 D4", "Cdimadd9"),
]


@pytest.mark.parametrize(("quality", "pitches", "symbol"), NAMES)
def test_chords_are_named_by_their_added_tones(quality: Quality, pitches: str, symbol: str) -> None:
    chord, _ = coloured(quality, pitches)
    assert chord_symbol(chord) == symbol
    assert (chord.root, chord.quality) == (PitchClass("C"), quality)


@pytest.mark.parametrize("role", [role for role in Role if role is not Role.CHORD_TONE])
def test_only_tones_without_a_textbook_role_are_added(role: Role) -> None:
    chord, fragments = coloured(Quality.MAJOR, "C3 F3 G3", role)
    assert bool(chord.added) == (role is Role.OTHER)
    assert fragments[1].role is (Role.CHORD_TONE if role is Role.OTHER else role)


@pytest.mark.parametrize(("slices", "added"), [(1, False), (2, True), (3, True)])
def test_a_tone_must_last_two_thirds_of_the_chord(slices: int, added: bool) -> None:
    chord, _ = coloured(Quality.MAJOR, "C3 E3 G3 A3", sounding=slices)
    assert bool(chord.added) == added


@pytest.mark.parametrize(
    ("quality", "limit", "added", "ratios"),
    [
        (Quality.MAJOR, 5, Degree.SIXTH, "1 5/4 3/2 5/3"),
        (Quality.MAJOR, 3, Degree.SIXTH, "1 81/64 3/2 27/16"),
        (Quality.MAJOR, 5, Degree.NINTH, "1 5/4 3/2 9/8"),
        (Quality.DOMINANT_SEVENTH, 7, Degree.NINTH, "1 5/4 3/2 7/4 9/8"),
        (Quality.MAJOR, 5, Degree.FOURTH, "1 5/4 3/2 4/3"),
        (Quality.MAJOR, 7, Degree.SECOND, "1 5/4 3/2 9/8"),
    ],
)
def test_added_tones_have_their_ratio(
    quality: Quality, limit: int, added: Degree, ratios: str
) -> None:
    plain = templates(quality, limit)[0]
    template = with_added(plain, (added,), limit)
    assert template.ratios is not None
    found = [*template.ratios[: len(plain.spelled)], template.ratios[PLACES.index(added)]]
    assert found == [Fraction(ratio) for ratio in ratios.split()]
    assert template.limit <= limit


@pytest.mark.parametrize("limit", [3, 5, 7])
@pytest.mark.parametrize("quality", Quality)
def test_every_template_takes_every_added_tone(quality: Quality, limit: int) -> None:
    tones = (Degree.NINTH, Degree.SIXTH, Degree.FOURTH, Degree.SECOND)
    for plain in templates(quality, limit):
        for tone in tones:
            template = with_added(plain, (tone,), limit)
            assert (template.ratios is None) == (plain.ratios is None)
            assert template.semitones[: len(plain.semitones)] == plain.semitones


def test_the_close_harmony_piece_has_its_minor_sixth_chord() -> None:
    harmony = analyse(read(FIXTURES / "lantern-street.musicxml"))
    assert "Bbm6" in [chord_symbol(chord) for chord in harmony.chords]


def test_every_chord_tone_has_its_degree() -> None:
    harmony = analyse(read(FIXTURES / "lantern-street.musicxml"))
    for fragment in harmony.fragments:
        assert (fragment.degree is None) == (fragment.role is not Role.CHORD_TONE)
