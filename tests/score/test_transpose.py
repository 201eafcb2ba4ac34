"""Transposition, usual ranges and a wished tempo."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest
from music21 import corpus, interval, pitch

from retune.errors import UnreadableError, Weight, WishError
from retune.harmony import analyse
from retune.pipeline import retuned
from retune.pitch import Pitch, PitchClass
from retune.score.model import VoiceType
from retune.score.options import ReadOptions
from retune.score.pace import Pace
from retune.score.ranges import RANGES, beyond_range
from retune.score.read import read
from retune.score.transpose import transposed
from retune.tuning import tune
from retune.tuning.policy import Policy

FIXTURES = Path(__file__).parents[2] / "fixtures"
HYMN = FIXTURES / "harbour-hymn.musicxml"
PIECES = [*sorted(FIXTURES.glob("*.musicxml")), Path(corpus.getWork("bach/bwv269"))]


@pytest.mark.parametrize("path", PIECES, ids=lambda p: p.stem)
@pytest.mark.parametrize("semitones", [-2, 1, 5])
def test_tuning_is_the_same_elsewhere(path: Path, semitones: int) -> None:
    plain, moved = read(path), read(path, ReadOptions(transpose=semitones))
    by = moved.transposition
    before = tune(plain, analyse(plain), Policy())
    after = tune(moved, analyse(moved), Policy())
    for old, new in zip(before.harmony.chords, after.harmony.chords, strict=True):
        if old.root is None:
            assert new.root is None
        else:
            assert new.root is not None
            # Spelled three signs away, a root may be named by its enharmonic twin.
            assert (new.root.fifths - old.root.fifths - by.fifths) % 12 == 0
        assert old.quality == new.quality
    for one, other in zip(before.notes, after.notes, strict=True):
        assert other.note.pitch.key == one.note.pitch.key + semitones
        assert [s.cents for s in other.segments] == pytest.approx(
            [s.cents for s in one.segments], abs=1e-6
        )


@pytest.mark.parametrize("semitones", [-5, -1, 2, 3])
def test_pitches_are_spelled_as_music21_transposes_by_the_same_interval(semitones: int) -> None:
    plain, moved = read(HYMN), transposed(read(HYMN), semitones)
    by = moved.transposition
    # An interval by its fifths, from C: music21 spells it from the two pitches.
    goal = Pitch.at_key(60 + semitones, PitchClass.from_fifths(by.fifths))
    size = interval.Interval(pitch.Pitch("C4"), pitch.Pitch(goal.name.replace("b", "-")))
    for old, new in zip(plain.notes, moved.notes, strict=True):
        there = pitch.Pitch(old.pitch.name.replace("b", "-")).transpose(size)
        assert there.nameWithOctave.replace("-", "b") == new.pitch.name


@pytest.mark.parametrize(
    ("semitones", "key"),
    # The hymn is in E flat major, three flats.
    [(1, 4), (2, -1), (-3, 0), (-2, -5), (3, 6), (12, -3), (0, -3)],
)
def test_keys_stay_simple(semitones: int, key: int) -> None:
    found = {bar.key[0] for bar in transposed(read(HYMN), semitones).bars}
    assert found == ({key} if key != 6 else {-6})


def test_no_note_needs_three_signs() -> None:
    for path in PIECES:
        for semitones in range(-6, 7):
            assert max(abs(n.pitch.alter) for n in transposed(read(path), semitones).notes) <= 2


def test_chord_symbols_move_too() -> None:
    plain = read(FIXTURES / "gull-song.musicxml")
    moved = transposed(plain, 2)
    assert plain.chord_symbols
    for old, new in zip(plain.chord_symbols, moved.chord_symbols, strict=True):
        assert new.root.fifths == old.root.fifths + 2


def test_a_tonic_is_named_as_it_stands_in_the_score() -> None:
    policy = Policy(tonic=PitchClass("E", -1))
    tuned = retuned(HYMN, str(HYMN), ReadOptions(transpose=2), policy)
    assert tuned.policy.tonic == PitchClass("F")


def test_leaving_the_usual_range_is_told_once_for_each_side() -> None:
    # Kostka & Payne (from memory): a soprano goes up to G5; the hymn's goes to E flat 5.
    highest = max(n.pitch.key for n in read(HYMN).notes if n.part == 0)
    moved = transposed(read(HYMN), 79 - highest + 2)
    doubts = [f for f in moved.findings if f.weight is Weight.DOUBT and f.where.part == "Soprano"]
    (what,) = [f.what for f in doubts]
    assert what.endswith("is 2 semitones above the usual range of a soprano")
    assert doubts[0].where.bar
    assert not [f for f in transposed(read(HYMN), 0).findings if "usual range" in f.what]


def test_ranges_are_those_of_the_textbooks() -> None:
    # Handbook, voice.md 5.1.
    assert RANGES[VoiceType.SOPRANO] == (Pitch.parse("C4").key, Pitch.parse("G5").key)
    assert RANGES[VoiceType.BASS] == (Pitch.parse("E2").key, Pitch.parse("C4").key)
    score = read(HYMN)
    low = replace(score.notes[0], pitch=Pitch.parse("A3"))
    found = list(beyond_range(replace(score, notes=(low, *score.notes[1:]))))
    assert [(one.part.name, one.semitones) for one in found if one.part.index == 0] == [
        ("Soprano", -3)
    ]


@pytest.mark.parametrize("semitones", [25, -30])
def test_too_far(semitones: int) -> None:
    with pytest.raises(WishError, match="cannot transpose"):
        read(HYMN, ReadOptions(transpose=semitones))


def test_beyond_the_keys_of_midi() -> None:
    score = read(HYMN)
    notes = (replace(score.notes[0], pitch=Pitch.parse("C9")), *score.notes[1:])
    with pytest.raises(UnreadableError, match="leaves the keys of MIDI"):
        transposed(replace(score, notes=notes), 24)


@pytest.mark.parametrize("path", PIECES, ids=lambda p: p.stem)
def test_a_share_of_the_tempo_scales_all_of_it(path: Path) -> None:
    plain, slow = read(path), read(path, ReadOptions(tempo=Pace.parse("80%")))
    for bar in plain.bars:
        assert slow.tempo.seconds(bar.end) == pytest.approx(plain.tempo.seconds(bar.end) / 0.8)


def test_a_steady_tempo_counts_beats_and_keeps_fermatas() -> None:
    path = FIXTURES / "evening-tide.musicxml"  # 6/8
    options = ReadOptions(tempo=Pace.parse("50"), fermatas=False)
    steady = read(path, options)
    assert [change.qpm for change in steady.tempo.changes] == [Fraction(75)]
    held = read(path, replace(options, fermatas=True))
    assert len(held.tempo.changes) > 1
    assert max(change.qpm for change in held.tempo.changes) == 75


@pytest.mark.parametrize("text", ["", "fast", "80 %%", "5", "500", "-3", "1e2", "4/5"])
def test_tempi_that_cannot_be(text: str) -> None:
    with pytest.raises(WishError, match="no tempo"):
        Pace.parse(text)
