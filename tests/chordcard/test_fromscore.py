"""The chord at a place of a tuned score."""

from __future__ import annotations

from fractions import Fraction

import pytest

from retune.chordcard.fromscore import chord_at, onset_at
from retune.errors import WishError
from retune.harmony.symbols import chord_symbol
from retune.score.model import Bar
from retune.tuning.sounding import sung_by_chord
from tests.tracks.pieces import NAMES, tuned
from tests.tuning.textbook import MAJ, build


@pytest.mark.parametrize("name", NAMES)
def test_every_chord_is_found_where_it_begins(name: str) -> None:
    piece = tuned(name)
    rows = sung_by_chord(piece)
    for chord, row in list(zip(piece.harmony.chords, rows, strict=True))[:40]:
        if chord.root is None or not row:
            continue
        bar = piece.score.bar_at(chord.onset)
        beat = piece.score.beat_at(chord.onset)
        whole, rest = divmod(beat, 1)
        place = f"{bar.number}:{whole}" + (f" {rest}" if rest else "")
        run = [one.number for one in piece.score.bars[: bar.index + 1]].count(bar.number)
        assert onset_at(piece.score, place, run) == chord.onset
        found = chord_at(piece, chord.onset)
        assert found.reading.root == chord.root
        assert found.reading.symbol == chord_symbol(chord)
        keys = [tone.pitch.key for tone in found.tones]
        assert keys == sorted(keys)


def test_tones_are_as_they_are_tuned() -> None:
    piece = tuned("harbour-hymn")
    onset = onset_at(piece.score, "9:3")
    found = chord_at(piece, onset)
    assert [tone.name for tone in found.tones] == ["Bass", "Tenor", "Alto", "Soprano"]
    for tone in found.tones:
        (note,) = [
            one
            for one in piece.notes
            if piece.score.parts[one.note.part].name == tone.name
            and one.note.onset <= onset < one.note.end
        ]
        segment = next(s for s in note.segments if s.onset <= onset < s.end)
        assert (tone.cents, tone.ratio) == (segment.cents, segment.ratio)
        assert tone.hz == pytest.approx(piece.hz(note, segment))
    assert found.place == "bar 9, beat 3"


def test_fractions_of_a_beat() -> None:
    score, _ = build([("C", MAJ)], [["C4"]], quarters=4)
    assert onset_at(score, "1") == 0
    assert onset_at(score, "1:2") == 1
    assert onset_at(score, "1:2.5") == onset_at(score, " 1 : 2 1/2 ") == Fraction(3, 2)


def test_pick_up_counts_its_beats_from_the_metre() -> None:
    score, _ = build([("C", MAJ), ("C", MAJ)], [["C4", "D4"]], quarters=1)
    bars = (
        Bar(0, 0, "0", Fraction(0), Fraction(1), begins=Fraction(3)),
        Bar(1, 1, "1", Fraction(1), Fraction(1)),
    )
    from dataclasses import replace

    picked = replace(score, bars=bars)
    assert onset_at(picked, "0") == onset_at(picked, "0:4") == 0
    with pytest.raises(WishError, match="bar 0 has no beat 1"):
        onset_at(picked, "0:1")


@pytest.mark.parametrize(
    ("place", "words"),
    [
        ("99", "there is no bar 99"),
        ("1:9", "bar 1 has no beat 9"),
        ("1:0", "bar 1 has no beat 0"),
        ("1:2 1/0", "not a place"),
        ("a:b:c", "not a place"),
        ("", "not a place"),
    ],
)
def test_wrong_places_are_refused(place: str, words: str) -> None:
    with pytest.raises(WishError, match=words):
        onset_at(tuned("harbour-hymn").score, place)


def test_bar_that_is_played_once_has_no_second_time() -> None:
    with pytest.raises(WishError, match="not played 2 times") as caught:
        onset_at(tuned("harbour-hymn").score, "3", 2)
    assert "once" in caught.value.hint


def test_silence_has_no_chord() -> None:
    from retune.tuning import tune
    from retune.tuning.policy import Policy

    score, harmony = build([("C", MAJ), (None, None), ("C", MAJ)], [["C4", None, "C4"]])
    with pytest.raises(WishError, match="nothing sounds there") as caught:
        chord_at(tune(score, harmony, Policy()), Fraction(1))
    assert caught.value.where.bar == "2"
