"""Hand-written progressions: what any harmony primer says of them (common practice, no source)."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import pytest

from retune.harmony import Harmony, Quality, Role, analyse
from retune.pitch import Pitch, PitchClass
from retune.score.model import ChordSymbol, Note, Score
from tests.harmony.invented import score_of


def roots(harmony: Harmony) -> list[str]:
    return [str(chord.root) if chord.root else "-" for chord in harmony.chords]


def qualities(harmony: Harmony) -> list[str]:
    return [str(chord.quality) for chord in harmony.chords]


CIRCLE = ("G4:2 A4:2 A4:2 G4:2 G4:4", "E4:2 E4:2 F4:2 D4:2 E4:4",
          "C4:2 C4:2 D4:2 B3:2 C4:4", "C3:2 A2:2 D3:2 G2:2 C3:4")  # fmt: skip
SUSPENSION = ("C5:2 C5:1 B4:1 C5:4", "E4:2 D4:2 E4:4", "G4:2 G4:2 G4:4", "C3:2 G3:2 C3:4")


def test_circle_progression() -> None:
    harmony = analyse(score_of(*CIRCLE))
    assert roots(harmony) == ["C", "A", "D", "G", "C"]
    assert qualities(harmony) == ["major", "minor", "minor", "major", "major"]
    assert (harmony.tonic.root.name, harmony.tonic.minor) == ("C", False)


@pytest.mark.parametrize(
    ("voices", "root", "quality"),
    [
        (("E5:2 D5:2 C5:4", "C5:2 B4:2 C5:4", "G4:2 F4:2 E4:4", "C3:2 G2:2 C3:4"),
         "G", Quality.DOMINANT_SEVENTH),
        (("C5:2 D5:2 Eb5:4", "G4:2 Ab4:2 G4:4", "Eb4:2 F4:2 Eb4:4", "C3:2 B2:2 C3:4"),
         "B", Quality.DIMINISHED_SEVENTH),
        (("C5:2 C5:2 C5:4", "G4:2 G#4:2 A4:4", "E4:2 E4:2 F4:4", "C3:2 C3:2 F3:4"),
         "C", Quality.AUGMENTED),
        (("G4:2 A4:2 G4:4", "E4:2 F4:2 D4:4", "C4:2 C4:2 B3:4", "C3:2 F2:2 G2:4"),
         "F", Quality.MAJOR),
        (("C5:2 D5:2 C5:4", "G4:2 F4:2 G4:4", "E4:2 D4:2 E4:4", "C3:2 B2:2 C3:4"),
         "B", Quality.DIMINISHED),
    ],
    ids=["V7", "vii diminished seventh", "augmented", "IV", "vii diminished"],
)  # fmt: skip
def test_chord_in_the_middle(voices: tuple[str, ...], root: str, quality: Quality) -> None:
    chord = analyse(score_of(*voices)).chords[1]
    assert (chord.root, chord.quality) == (PitchClass.parse(root), quality)


def test_cadential_six_four() -> None:
    harmony = analyse(
        score_of("C5:2 C5:1 B4:1 C5:4", "A4:2 G4:2 G4:4", "F4:2 E4:1 D4:1 E4:4", "F3:2 G3:2 C3:4")
    )
    assert roots(harmony) == ["F", "C", "G", "C"]


def test_suspension_belongs_to_the_chord_of_its_resolution() -> None:
    score = score_of(*SUSPENSION)
    harmony = analyse(score)
    assert roots(harmony) == ["C", "G", "C"]
    (suspended,) = [f for f in harmony.fragments if f.role is not Role.CHORD_TONE]
    assert suspended.role is Role.SUSPENSION
    assert suspended.degree is None
    assert score.notes[suspended.note].pitch.name == "C5"
    assert score.notes[suspended.note].onset == 2


def test_tied_suspension_is_cut_at_the_chord() -> None:
    """The same progression with the fourth tied over: one note, two fragments."""
    score = score_of("C5:3 B4:1 C5:4", *SUSPENSION[1:])
    harmony = analyse(score)
    tied = [f for f in harmony.fragments if score.notes[f.note].pitch.name == "C5"][:2]
    assert [(f.chord, f.role) for f in tied] == [(0, Role.CHORD_TONE), (1, Role.SUSPENSION)]
    assert tied[0].last == tied[1].first


def test_passing_and_neighbour_notes() -> None:
    score = score_of("E5:1/2 D5:1/2 C5:1 C5:1/2 D5:1/2 C5:1", "G4:2 G4:2", "E4:2 E4:2", "C3:2 C3:2")
    harmony = analyse(score)
    assert roots(harmony) == ["C"]
    found = [f.role for f in harmony.fragments if f.role is not Role.CHORD_TONE]
    assert found == [Role.PASSING, Role.NEIGHBOUR]


def test_pedal_lasts_through_a_chord_it_is_no_member_of() -> None:
    score = score_of(
        "E5:4 D5:4 E5:4", "C5:4 B4:4 C5:4", "G4:4 F4:4 G4:4", "E4:4 G4:4 E4:4", "C3:12"
    )
    harmony = analyse(score)
    assert roots(harmony) == ["C", "G", "C"]
    assert [f.role for f in harmony.fragments if score.notes[f.note].pitch.name == "C3"] == [
        Role.CHORD_TONE, Role.PEDAL, Role.CHORD_TONE,
    ]  # fmt: skip


def test_spelling_names_the_root() -> None:
    """The same keys, notated in sharps and in flats."""
    sharp = analyse(score_of("C#5:4", "A#4:4", "F#4:4", "F#3:4"))
    flat = analyse(score_of("Db5:4", "Bb4:4", "Gb4:4", "Gb3:4"))
    assert (roots(sharp), roots(flat)) == (["F#"], ["Gb"])


@pytest.mark.parametrize(
    ("voices", "root"),
    [
        (("Ab4:4", "F4:4", "D4:4", "B3:4"), "B"),
        (("G#4:4", "F4:4", "D4:4", "B3:4"), "G#"),
        (("D5:4", "B4:4", "G#4:4", "E#3:4"), "E#"),
    ],
)
def test_notation_tells_the_root_of_a_diminished_seventh(
    voices: tuple[str, ...], root: str
) -> None:
    """Built in thirds from its root, as it is always notated."""
    chord = analyse(score_of(*voices)).chords[0]
    assert (str(chord.root), chord.quality) == (root, Quality.DIMINISHED_SEVENTH)


def test_chord_symbols_are_evidence() -> None:
    """C E G A is C with a sixth or A minor seventh; the symbol tells."""
    score = score_of("A4:4", "G4:4", "E4:4", "C3:4")
    for name, kind, quality in (
        ("C", "major-sixth", Quality.MAJOR),
        ("A", "minor-seventh", Quality.MINOR_SEVENTH),
    ):
        symbol = ChordSymbol(Fraction(0), PitchClass.parse(name), kind)
        chord = analyse(replace(score, chord_symbols=(symbol,))).chords[0]
        assert (str(chord.root), chord.quality) == (name, quality)


def test_a_few_stray_symbols_are_not_believed() -> None:
    """Files have figures misread as symbols; a lead sheet has symbols throughout."""
    score = score_of(*(f"{line} {'r:4 ' * 30}" for line in CIRCLE))
    stray = ChordSymbol(Fraction(0), PitchClass("F", 1), "major")
    assert analyse(replace(score, chord_symbols=(stray,))) == analyse(score)


def test_empty_score_has_no_chords() -> None:
    harmony = analyse(Score("empty", "", (), (), ()))
    assert harmony.chords == ()
    assert harmony.slices == ()


def test_long_silence_is_a_chord_without_root_and_a_breath_is_not() -> None:
    rest = "r:4 {0}:4 r:4 {1}:2 r:1 {1}:1"
    score = score_of(*(rest.format(*pair) for pair in zip(
        ("C5", "E4", "G3", "C3"), ("G4", "D4", "B3", "G2"), strict=True)))  # fmt: skip
    harmony = analyse(score)
    assert roots(harmony) == ["-", "C", "-", "G"]
    assert harmony.chords[0].quality is None
    assert harmony.chords[-1].end == 16


def test_a_score_of_grace_notes_alone_has_no_chord() -> None:
    score = score_of("C5:4")
    grace = replace(score.notes[0], grace=True)
    harmony = analyse(replace(score, notes=(grace,)))
    assert roots(harmony) == ["-"]
    assert harmony.fragments == ()


def test_time_stolen_by_grace_notes_is_given_back() -> None:
    """Three voices hold; the fourth is cut short by a grace note and must make no slice."""
    score = score_of("C5:7/4 r:1/4 B4:2", "G4:4", "E4:2 D4:2", "C3:2 G3:2")
    short = next(note for note in score.notes if note.pitch.name == "C5")
    grace = Note(0, short.end, Fraction(1, 4), Pitch.parse("C#5"), grace=True)
    notes = tuple(
        replace(note, stolen=Fraction(1, 4)) if note is short else note for note in score.notes
    )
    harmony = analyse(replace(score, notes=(*notes, grace)))
    assert [piece.onset for piece in harmony.slices] == [0, 2]


def test_a_lone_line_gets_plain_doubtful_chords() -> None:
    harmony = analyse(score_of("G4:2 A4:2 B4:2 C5:2 D5:4"))
    assert {chord.quality for chord in harmony.chords} <= {Quality.MAJOR, Quality.MINOR}
    assert max(chord.confidence for chord in harmony.chords) <= 0.6


def test_forty_parts() -> None:
    """Ten choirs of the same four parts have the chords of one."""
    assert roots(analyse(score_of(*CIRCLE * 10))) == ["C", "A", "D", "G", "C"]


def test_a_given_tonic_is_kept() -> None:
    tonic = analyse(score_of(*CIRCLE), PitchClass("B", 1)).tonic
    assert tonic.root == PitchClass("B", 1)


def test_analysis_is_deterministic() -> None:
    assert analyse(score_of(*SUSPENSION)) == analyse(score_of(*SUSPENSION))
