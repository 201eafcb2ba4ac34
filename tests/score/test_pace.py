"""A wished tempo: a share of the score's own, or so many beats a minute throughout."""

from __future__ import annotations

import io
from fractions import Fraction
from itertools import pairwise
from pathlib import Path

import mido
import pytest

from retune.errors import LimitError, WishError
from retune.harmony import analyse
from retune.limits import Limits
from retune.score.model import Score
from retune.score.options import ReadOptions
from retune.score.pace import Pace
from retune.score.read import read, read_bytes
from retune.tuning import tune
from retune.tuning.policy import Policy
from retune.written import Mark, MarkKind
from tests.score.written_text import bar, mark, part, play, words

FIXTURES = Path(__file__).parents[2] / "fixtures"
TIDE = FIXTURES / "evening-tide.musicxml"  # 6/8 and 2/4, with fermatas, rit. and a tempo


def changes(score: Score) -> list[tuple[str, str]]:
    return [(str(change.onset), str(change.qpm)) for change in score.tempo.changes]


def tempo(qpm: int, onset: int = 0) -> Mark:
    return mark(MarkKind.TEMPO, Fraction(qpm), onset)


@pytest.mark.parametrize(
    ("text", "share", "beats"),
    [
        ("80%", "4/5", None),
        (" 112.5 % ", "9/8", None),
        ("10%", "1/10", None),
        ("400%", "4", None),
        ("92", "1", "92"),
        ("66.667", "1", "66667/1000"),
    ],
)
def test_texts(text: str, share: str, beats: str | None) -> None:
    assert Pace.parse(text) == Pace(Fraction(share), Fraction(beats) if beats else None)


@pytest.mark.parametrize(
    "text",
    ["", "%", "fast", "80 %%", "9.9", "9%", "401", "500%", "-3", "+92", "1e2", "4/5", "92,5", "٩٢"],
)
def test_texts_that_are_no_tempo(text: str) -> None:
    with pytest.raises(WishError, match="no tempo") as caught:
        Pace.parse(text)
    assert "10 to 400" in caught.value.hint


@pytest.mark.parametrize("wish", [{"share": Fraction(0)}, {"beats": Fraction(-60)}])
def test_no_value_outside_the_range(wish: dict[str, Fraction]) -> None:
    with pytest.raises(WishError, match="no tempo"):
        Pace(**wish)


@pytest.mark.parametrize("path", sorted(FIXTURES.glob("*.musicxml")), ids=lambda p: p.stem)
def test_a_share_scales_every_moment(path: Path) -> None:
    plain, slow = read(path), read(path, ReadOptions(tempo=Pace.parse("80%")))
    assert [c.onset for c in slow.tempo.changes] == [c.onset for c in plain.tempo.changes]
    for note in plain.notes:
        # Seconds are inverse to the tempo.
        assert slow.tempo.seconds(note.end) == pytest.approx(plain.tempo.seconds(note.end) / 0.8)
    assert (slow.notes, slow.bars) == (plain.notes, plain.bars)


def test_a_share_of_changes_ramps_and_fermatas() -> None:
    made = [
        bar("C5/4", marks=(tempo(100),)),
        bar("C5/4", marks=(words("rit."),)),
        bar("C5/2 C5/2", marks=(tempo(60), mark(MarkKind.FERMATA, None, 4))),
    ]
    own, half = play(part("Alto", *made)), play(part("Alto", *made), tempo=Pace.parse("50%"))
    assert len(own.tempo.changes) > 4
    assert [2 * c.qpm for c in half.tempo.changes] == [c.qpm for c in own.tempo.changes]


def test_a_steady_tempo_flattens_every_change() -> None:
    made = [bar("C5/4", marks=(tempo(100), words("rit."))), bar("C5/4", marks=(tempo(60),))]
    assert changes(play(part("Alto", *made), tempo=Pace.parse("92"))) == [("0", "92")]


@pytest.mark.parametrize(
    ("metre", "length", "qpm"),
    # Beats of simple and compound metres: three eighths in 6/8 (Kostka & Payne, from memory).
    [((4, 4), 4, "60"), ((2, 2), 4, "120"), ((6, 8), 3, "90"), ((3, 8), "3/2", "30")],
)
def test_beats_are_those_that_are_counted(
    metre: tuple[int, int], length: int | str, qpm: str
) -> None:
    made = part("Alto", *[f"C5/{length}"] * 2, metre=metre)
    assert changes(play(made, tempo=Pace.parse("60"))) == [("0", qpm)]


def test_the_first_full_bar_counts() -> None:
    """A pick-up that has a metre of its own says nothing of how the piece is counted."""
    made = part("Alto", bar("C5/1", metre=(2, 4)), bar("C5/3", metre=(6, 8)), bar("C5/3"))
    assert changes(play(made, tempo=Pace.parse("60"))) == [("0", "90")]


def test_a_steady_tempo_keeps_fermatas() -> None:
    options = ReadOptions(tempo=Pace.parse("50"))
    held, plain = read(TIDE, options), read(TIDE, ReadOptions(tempo=options.tempo, fermatas=False))
    assert [change.qpm for change in plain.tempo.changes] == [Fraction(75)]
    # A fermata lasts 7/4 as long (common practice, no source: near double).
    assert {change.qpm for change in held.tempo.changes} == {Fraction(75), 75 * Fraction(4, 7)}
    own = read(TIDE).tempo.changes
    spans = [b.onset - a.onset for a, b in pairwise(held.tempo.changes) if a.qpm < 75]
    assert spans
    assert {c.onset for c in held.tempo.changes if c.qpm < 75} <= {c.onset for c in own}


def midi(*tempi: tuple[int, int], spread: int = 0) -> bytes:
    """Four chords of a quarter note's ticks each, with tempi at ticks, written by mido."""
    conductor, voices = mido.MidiTrack(), mido.MidiTrack()
    now = 0
    for tick, qpm in tempi:
        conductor.append(mido.MetaMessage("set_tempo", tempo=mido.bpm2tempo(qpm), time=tick - now))
        now = tick
    events: list[tuple[int, str, int]] = []
    for beat in range(4):
        for place, key in enumerate((60, 64, 67)):
            events += [
                (480 * beat + place * spread, "note_on", key),
                (480 * beat + 470, "note_off", key),
            ]
    now = 0
    for tick, kind, key in sorted(events):
        voices.append(mido.Message(kind, note=key, velocity=80, time=tick - now))
        now = tick
    file, out = mido.MidiFile(ticks_per_beat=480, type=1), io.BytesIO()
    file.tracks += [conductor, voices]
    file.save(file=out)
    return out.getvalue()


@pytest.mark.parametrize(
    ("text", "tempi"),
    [("50%", [(0, 60), (2, 30)]), ("92", [(0, 92)]), ("100%", [(0, 120), (2, 60)])],
)
def test_midi_likewise(text: str, tempi: list[tuple[int, int]]) -> None:
    score = read_bytes(midi((0, 120), (960, 60)), "x.mid", ReadOptions(tempo=Pace.parse(text)))
    assert [(c.onset, c.qpm) for c in score.tempo.changes] == tempi


@pytest.mark.parametrize("text", ["25%", "400%", "20", "400"])
def test_what_was_played_together_stays_together(text: str) -> None:
    # 24 ticks of 480 at 100 a minute are 30 ms, one chord; at 25 a minute they would be 120 ms.
    data = midi((0, 100), spread=12)
    plain = read_bytes(data, "x.mid")
    wished = read_bytes(data, "x.mid", ReadOptions(tempo=Pace.parse(text)))
    assert any(note.early for note in plain.notes)
    assert wished.notes == plain.notes
    assert wished.tempo != plain.tempo


@pytest.mark.parametrize("text", ["50%", "120"])
def test_roots_and_cents_do_not_hear_the_tempo(text: str) -> None:
    tuned = []
    for options in (ReadOptions(), ReadOptions(tempo=Pace.parse(text))):
        score = read(TIDE, options)
        tuned.append(tune(score, analyse(score), Policy()))
    one, other = tuned
    assert one.harmony.chords == other.harmony.chords
    for before, after in zip(one.notes, other.notes, strict=True):
        assert [s.cents for s in after.segments] == [s.cents for s in before.segments]


def test_limits_on_playing_time_hold() -> None:
    seconds = read(TIDE).tempo.seconds(read(TIDE).end)
    limits = Limits(max_seconds=seconds * 1.5)
    read(TIDE, ReadOptions(limits=limits))
    with pytest.raises(LimitError, match="plays longer"):
        read(TIDE, ReadOptions(limits=limits, tempo=Pace.parse("50%")))
    limits = Limits(max_seconds=seconds * 0.6)
    with pytest.raises(LimitError, match="plays longer"):
        read(TIDE, ReadOptions(limits=limits))
    read(TIDE, ReadOptions(limits=limits, tempo=Pace.parse("200%")))
