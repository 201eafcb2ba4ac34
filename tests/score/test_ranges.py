"""Usual ranges of voices, and what a transposition says of them."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from retune.errors import Finding, Weight
from retune.pitch import Pitch
from retune.score.model import PartKind, Score, VoiceType
from retune.score.options import ReadOptions
from retune.score.ranges import RANGES, beyond_range
from retune.score.read import read
from retune.score.transpose import transposed

HYMN = Path(__file__).parents[2] / "fixtures" / "harbour-hymn.musicxml"


def sung(*names: str, voice_type: VoiceType | None = VoiceType.SOPRANO) -> Score:
    """The hymn's soprano with other pitches, one after the other, as all there is."""
    score = read(HYMN)
    old = [note for note in score.notes if note.part == 0]
    notes = [replace(note, pitch=Pitch.parse(name)) for note, name in zip(old, names, strict=False)]
    part = replace(score.parts[0], voice_type=voice_type)
    return replace(score, parts=(part,), notes=tuple(notes))


def remarks(score: Score) -> list[Finding]:
    return [one for one in score.findings if "usual range" in one.what]


@pytest.mark.parametrize(
    ("voice", "low", "high"),
    # Handbook, voice.md 5.1; Kostka & Payne, Tonal Harmony (from memory).
    [
        (VoiceType.SOPRANO, "C4", "G5"),
        (VoiceType.ALTO, "G3", "D5"),
        (VoiceType.TENOR, "C3", "G4"),
        (VoiceType.BASS, "E2", "C4"),
    ],
)
def test_ranges_are_those_of_the_textbooks(voice: VoiceType, low: str, high: str) -> None:
    assert RANGES[voice] == (Pitch.parse(low).key, Pitch.parse(high).key)


def test_every_voice_has_a_range() -> None:
    assert set(RANGES) == set(VoiceType)


def test_lowest_and_highest_note_outside() -> None:
    score = sung("C5", "A3", "Bb3", "A5", "B5", "B5")
    found = list(beyond_range(score))
    assert [(one.note.pitch.name, one.semitones) for one in found] == [("A3", -3), ("B5", 4)]
    assert found[1].note is score.notes[4]  # the first of the two


@pytest.mark.parametrize("name", ["C4", "G5"])
def test_the_ends_of_a_range_belong_to_it(name: str) -> None:
    assert not list(beyond_range(sung(name)))


def test_no_voice_no_range() -> None:
    score = sung("C7", voice_type=None)
    assert not list(beyond_range(score))
    assert not remarks(transposed(score, 2))
    organ = replace(sung("C7").parts[0], kind=PartKind.ACCOMPANIMENT)
    assert not list(beyond_range(replace(sung("C7"), parts=(organ,))))


def test_leaving_it_is_a_doubt_with_its_place() -> None:
    (remark,) = remarks(transposed(sung("C5", "F5", "C5"), 4))
    assert remark.weight is Weight.DOUBT
    assert remark.what == "A5 is 2 semitones above the usual range of a soprano"
    assert (remark.where.file, remark.where.part) == (HYMN.name, "Soprano")
    assert (remark.where.bar, remark.where.beat) == ("1", "4")


def test_one_semitone_is_one() -> None:
    (remark,) = remarks(transposed(sung("D4", "C5"), -3))
    assert remark.what == "B3 is 1 semitone below the usual range of a soprano"


@pytest.mark.parametrize("semitones", [0, -1, -12])
def test_what_was_outside_before_and_comes_no_further_is_not_told(semitones: int) -> None:
    assert not remarks(transposed(sung("A5", "G5"), semitones))


def test_further_outside_than_before_is_told() -> None:
    (remark,) = remarks(transposed(sung("A5", "G5"), 1))
    assert remark.what.startswith("A#5 is 3 semitones above")


def test_reading_without_transposition_says_nothing() -> None:
    assert not remarks(read(HYMN))


def test_parts_of_a_whole_score_are_told_apart() -> None:
    plain, moved = read(HYMN), read(HYMN, ReadOptions(transpose=9))
    for remark in remarks(moved):
        (part,) = [one for one in moved.parts if one.name == remark.where.part]
        assert part.voice_type is not None
        top = max(note.pitch.key for note in plain.notes if note.part == part.index) + 9
        assert f"{top - RANGES[part.voice_type][1]} semitone" in remark.what
    assert {remark.where.part for remark in remarks(moved)} == {
        part.name
        for part in plain.parts
        if part.voice_type is not None
        and max(n.pitch.key for n in plain.notes if n.part == part.index) + 9
        > RANGES[part.voice_type][1]
    }
