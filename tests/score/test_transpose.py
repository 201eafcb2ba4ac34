"""Transposition: keys, spelling, and the same tuning elsewhere."""

from __future__ import annotations

from dataclasses import replace
from functools import cache
from pathlib import Path

import pytest
from music21 import corpus, interval, pitch

from retune.errors import WishError
from retune.harmony import analyse
from retune.pipeline import retuned
from retune.pitch import Pitch, PitchClass
from retune.score.model import Transposition
from retune.score.options import ReadOptions
from retune.score.read import read
from retune.score.transpose import moved as elsewhere
from retune.score.transpose import transposed
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy

FIXTURES = Path(__file__).parents[2] / "fixtures"
HYMN = FIXTURES / "harbour-hymn.musicxml"
CHORALES = [Path(corpus.getWork(f"bach/{name}")) for name in ("bwv269", "bwv6.6", "bwv3.6")]
PIECES = [*sorted(FIXTURES.glob("*.musicxml")), *CHORALES]


@cache
def tuned_as_written(path: Path) -> TunedScore:
    score = read(path)
    return tune(score, analyse(score), Policy())


@pytest.mark.parametrize("path", PIECES, ids=lambda p: p.stem)
@pytest.mark.parametrize("semitones", [-2, 1, 5])
def test_tuning_is_the_same_elsewhere(path: Path, semitones: int) -> None:
    moved = read(path, ReadOptions(transpose=semitones))
    by = moved.transposition
    before = tuned_as_written(path)
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
        score = read(path)
        for semitones in range(-6, 7):
            assert max(abs(n.pitch.alter) for n in transposed(score, semitones).notes) <= 2


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


@pytest.mark.parametrize("semitones", [25, -30])
def test_too_far(semitones: int) -> None:
    with pytest.raises(WishError, match="cannot transpose"):
        read(HYMN, ReadOptions(transpose=semitones))


@pytest.mark.parametrize(
    ("name", "semitones", "hint"),
    [("C9", 24, "At most 7 semitones up"), ("C#-1", -3, "At most 1 semitone down")],
)
def test_beyond_the_keys_of_midi(name: str, semitones: int, hint: str) -> None:
    # MIDI keys are 0 to 127 (MIDI 1.0), C-1 to G9 where C4 is key 60.
    score = read(HYMN)
    index = next(i for i, n in enumerate(score.notes) if score.bar_at(n.onset).number == "3")
    high = replace(score.notes[index], pitch=Pitch.parse(name))
    score = replace(score, notes=(*score.notes[:index], high, *score.notes[index + 1 :]))
    with pytest.raises(WishError, match="leaves the keys of MIDI") as caught:
        transposed(score, semitones)
    where = caught.value.where
    assert (where.file, where.part, where.bar, where.beat) == (HYMN.name, "Soprano", "3", "1")
    assert caught.value.hint.startswith(hint)


def test_just_inside_the_keys_of_midi() -> None:
    score = read(HYMN)
    high = replace(score.notes[0], pitch=Pitch.parse("C9"))
    moved = transposed(replace(score, notes=(high, *score.notes[1:])), 7)
    assert moved.notes[0].pitch == Pitch.parse("G9")


def test_c_up_a_semitone_is_d_flat() -> None:
    # Five flats against seven sharps (circle of fifths).
    score = read(HYMN)
    bars = tuple(replace(bar, key=(0, "major")) for bar in score.bars)
    notes = tuple(replace(score.notes[0], pitch=Pitch.parse(name)) for name in ("B3", "C4", "E4"))
    moved = transposed(replace(score, bars=bars, notes=notes), 1)
    assert [note.pitch.name for note in moved.notes] == ["C4", "Db4", "F4"]
    assert {bar.key for bar in moved.bars} == {(-5, "major")}


def test_the_key_that_lasts_longest_decides() -> None:
    # Up a semitone, E (4 sharps) is best as F (1 flat), F sharp (6) as G (1 sharp).
    score = read(HYMN)
    for long, short, fifths in [(4, 6, -5), (-4, 4, 7), (4, -4, -5)]:
        bars = tuple(
            replace(bar, key=(long if bar.index < 20 else short, None)) for bar in score.bars
        )
        by = transposed(replace(score, bars=bars), 1).transposition
        costs = {way: 20 * abs(long + way) + (len(bars) - 20) * abs(short + way) for way in (-5, 7)}
        assert by.fifths == fifths == min(costs, key=lambda way: costs[way])


def test_without_key_signatures_the_notes_decide() -> None:
    # As in MIDI without them. The hymn in D flat goes on to D major, not E double flat.
    score = transposed(read(HYMN), -2)
    bare = replace(score, bars=tuple(replace(bar, key=(0, None)) for bar in score.bars))
    spelled = {note.pitch.pitch_class.name for note in transposed(bare, 1).notes}
    assert {"D", "F#", "A"} <= spelled
    assert not [name for name in spelled if "bb" in name]


def test_an_octave_keeps_every_name() -> None:
    for path in PIECES:
        score = read(path)
        for semitones in (-12, 12, 24):
            moved = transposed(score, semitones)
            assert [n.pitch.pitch_class for n in moved.notes] == [
                n.pitch.pitch_class for n in score.notes
            ]


def test_moving_again_adds_up_and_back_is_where_it_was() -> None:
    score = read(HYMN)
    there = transposed(score, 3)
    assert transposed(there, 2).transposition.semitones == 5
    back = transposed(there, -3)
    assert (back.notes, back.bars) == (score.notes, score.bars)
    assert back.transposition == score.transposition


def test_a_tonic_never_needs_three_signs() -> None:
    assert elsewhere(PitchClass("B", 2), Transposition(1, 7)) == PitchClass("C", 2)
