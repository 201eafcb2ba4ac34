"""Root and quality of pitches alone: what harmony textbooks call them (common practice)."""

from __future__ import annotations

from fractions import Fraction
from itertools import permutations

import pytest

from retune.chordcard.naming import parse_pitches
from retune.chordcard.reading import readings
from retune.errors import WishError
from retune.harmony.model import Quality
from retune.pitch import Pitch, PitchClass
from retune.tuning.ratios import SPELLED


def read(text: str, root: str | None = None) -> list[str]:
    pitches = sorted((Pitch.parse(name) for name in text.split()), key=lambda pitch: pitch.key)
    wish = PitchClass.parse(root) if root else None
    return [one.symbol for one in readings(pitches, wish)]


# Symbols by the usual figures of chords and their inversions (common practice, no source).
NAMED = [
    ("D3 F#4 A4 D5", "D"),
    ("A2 C3 E3", "Am"),
    ("E3 G3 C4", "C"),
    ("G2 E3 C4", "C"),
    ("B2 D3 F3", "Bdim"),
    ("C3 E3 G#3", "Caug"),
    ("G2 D3 F3 B3", "G7"),
    ("F3 G3 B3 D4", "G7"),
    ("C3 E3 G3 B3", "Cmaj7"),
    ("D3 F3 A3 C4", "Dm7"),
    ("B2 D3 F3 A3", "Bm7b5"),
    ("B2 D3 F3 Ab3", "Bdim7"),
    ("C3 Eb3 G3 B3", "Cm(maj7)"),
    ("C3 E3 G3 A3", "C6"),
    ("C3 F3 G3", "Csus4"),
    ("C3 D3 G3", "Csus2"),
    ("G2 D3 F3 C4", "G7sus4"),
    ("C3 G3 D4 E4", "Cadd9"),
    ("C3 E3 Bb3 D4", "C9"),
    ("F2 A2 C3 G3 D4", "F6/9"),
    ("D3 F#3", "D"),
    ("D3 F3", "Dm"),
    ("E3 C4", "C"),
    # Misspelt, as a keyboard player may: still what it sounds like.
    ("D3 Gb3 A3", "D"),
]


@pytest.mark.parametrize(("text", "symbol"), NAMED)
def test_textbook_names(text: str, symbol: str) -> None:
    assert read(text)[0] == symbol


@pytest.mark.parametrize("text", ["C4 Db4 D4", "D3 A3", "C4", "C3 C4", "C3 D3", "C3 F#3 G3 Ab3"])
def test_what_is_no_chord_has_no_name(text: str) -> None:
    assert read(text)[0] == ""


def test_fifth_and_fourth_stand_on_the_fifths_root() -> None:
    for text in ("D3 A3", "A2 D3"):
        pitches = [Pitch.parse(name) for name in text.split()]
        assert readings(pitches)[0].root == PitchClass("D")


def test_two_names_are_both_told() -> None:
    """C6 and Am7 hold the same tones (common practice, no source)."""
    assert read("C3 E3 G3 A3") == ["C6", "Am7"]
    assert read("C3 E3 G3 A3", "A") == ["Am7"]


def test_every_quality_is_found_on_every_root_however_its_tones_lie() -> None:
    for quality, spelled in SPELLED.items():
        for place in range(-4, 6):
            root = PitchClass.from_fifths(place)
            names = [PitchClass.from_fifths(place + step).name for step in spelled]
            pitches = sorted(
                (Pitch.parse(f"{name}{3 + octave}") for octave, name in enumerate(names)),
                key=lambda pitch: pitch.key,
            )
            assert (found := readings(pitches)[0]).root == root
            assert found.quality is quality


def test_spelling_decides_between_seventh_and_augmented_sixth() -> None:
    """Ab-C-Eb-F# is a German sixth: 225/128 within limit 5 (handbook, methods.md B5)."""
    german = parse_pitches(["Ab2 C3 Eb3 F#3"])
    seventh = parse_pitches(["Ab2 C3 Eb3 Gb3"])
    assert readings(german)[0].ratios(german, 5)[3] == Fraction(225, 128)
    assert readings(seventh)[0].ratios(seventh, 5)[3] == Fraction(9, 5)
    assert readings(german)[0].ratios(german, 7)[3] == Fraction(7, 4)


def test_stranger_in_a_chord_has_the_simplest_ratio_of_its_spelling() -> None:
    pitches = parse_pitches(["C3 G3 E4 F#4"])
    reading = readings(pitches)[0]
    assert reading.symbol == "C"
    assert reading.degrees[3] is None
    assert reading.ratios(pitches, 5)[3] == Fraction(25, 18)
    assert reading.ratios(pitches, 7)[3] == Fraction(10, 7)


def test_order_of_doublings_does_not_matter() -> None:
    names = ("C3", "E4", "G3", "C5")
    for order in permutations(names):
        pitches = sorted((Pitch.parse(name) for name in order), key=lambda pitch: pitch.key)
        assert readings(pitches)[0].quality is Quality.MAJOR


@pytest.mark.parametrize(
    ("words", "names"),
    [
        (["D3,F#4, A4", "d5"], ["D3", "F#4", "A4", "D5"]),
        (["B♭3", "f♯4", "c##4", "ebb4"], ["Bb3", "F#4", "C##4", "Ebb4"]),
        (["bb3"], ["Bb3"]),
        (["b3"], ["B3"]),
        (["D", "F#", "A", "D"], ["D3", "F#3", "A3", "D4"]),
        (["B2", "Cb", "Eb"], ["B2", "Cb4", "Eb4"]),
    ],
)
def test_pitches_as_people_type_them(words: list[str], names: list[str]) -> None:
    assert [pitch.name for pitch in parse_pitches(words)] == names


@pytest.mark.parametrize(
    ("word", "guess"), [("H3", "B3"), ("Fis4", "F#4"), ("es4", "Eb4"), ("4F#", "F#4")]
)
def test_wrong_pitch_is_refused_with_a_guess(word: str, guess: str) -> None:
    with pytest.raises(WishError, match=f"'{word}' is not a pitch") as caught:
        parse_pitches([word])
    assert f"Did you mean {guess}?" in caught.value.hint
    assert "D3, F#4, Bb3" in caught.value.hint


@pytest.mark.parametrize("words", [[], [" , "], ["C0"], ["C9"], ["C4"] * 13, ["Q5"], ["C4" * 40]])
def test_no_pitches_or_impossible_ones(words: list[str]) -> None:
    with pytest.raises(WishError):
        parse_pitches(words)
