"""Played-in timing: the analysis hears chords together, outputs keep every note's own time."""

from __future__ import annotations

import random
from fractions import Fraction
from pathlib import Path

import pytest

from retune.adapters.midi import Control, NoteOff, NoteOn, RawMidi, RawTrack, write_midi_file
from retune.harmony import analyse
from retune.pitch import Pitch
from retune.score.model import Score
from retune.score.read import read, read_bytes
from retune.tuning import tune
from retune.tuning.policy import Policy

FIXTURES = Path(__file__).parents[2] / "fixtures"
TICKS = 480


def played(score: Score, spread: int, seed: int = 5) -> bytes:
    """A score as somebody would play it in: every note some ticks late and a little short."""
    chance = random.Random(seed)
    tracks = [RawTrack((), 0)]
    for part in score.parts:
        events: list[tuple[int, object]] = []
        for note in score.notes:
            if note.part == part.index and not note.grace:
                late, short = chance.randint(0, spread), chance.randint(-spread // 2, spread)
                start = round(note.onset * TICKS) + late
                stop = max(round(note.end * TICKS) - short, start + 30)
                events += [
                    (start, NoteOn(part.index, note.pitch.key, 80)),
                    (stop, NoteOff(part.index, note.pitch.key)),
                ]
        events.sort(key=lambda e: (e[0], isinstance(e[1], NoteOn)))
        tracks.append(RawTrack(tuple(events), events[-1][0]))  # type: ignore[arg-type]
    return write_midi_file(RawMidi(1, TICKS, tuple(tracks)))


@pytest.mark.parametrize("name", ["lantern-street", "harbour-hymn"])
def test_roots_of_a_piece_played_in_are_those_of_the_score(name: str) -> None:
    score = read(FIXTURES / f"{name}.musicxml")
    exact, loose = (read_bytes(played(score, spread), "in.mid") for spread in (0, 18))
    roots = []
    for one in (exact, loose):
        chords = analyse(one).chords
        times = [Fraction(k, 2) + Fraction(1, 8) for k in range(int(2 * score.end))]
        found = []
        for time in times:
            chord = next(c for c in chords if c.onset <= time < c.end or c is chords[-1])
            found.append(chord.root)
        roots.append(found)
    same = sum(a == b for a, b in zip(*roots, strict=True))
    assert same / len(roots[0]) > 0.97
    # Not many more slices than a score has: no slice is a mere unevenness.
    slices = [len(analyse(one).slices) for one in (exact, loose)]
    assert slices[1] < 1.25 * slices[0]


def test_notes_keep_their_own_time() -> None:
    score = read(FIXTURES / "harbour-hymn.musicxml")
    data = played(score, 18)
    loose = read_bytes(data, "in.mid")
    assert any(note.early for note in loose.notes)
    for note in loose.notes:
        assert (note.onset * TICKS).denominator == 1
        assert 0 <= note.early <= Fraction(1, 16)
    tuned = tune(loose, analyse(loose), Policy())
    for one in tuned.notes:
        assert one.segments[0].onset == one.note.onset
        assert one.segments[-1].end == one.note.end
        assert all(a.end == b.onset for a, b in zip(one.segments, one.segments[1:], strict=False))


def two(first: int, second: int, pedal: tuple[int, int] | None = None) -> Score:
    events: list[tuple[int, object]] = [
        (first, NoteOn(0, 60, 80)),
        (second, NoteOn(0, 64, 80)),
        (900, NoteOff(0, 60)),
        (960, NoteOff(0, 64)),
        (2000, NoteOn(0, 67, 80)),
        (2400, NoteOff(0, 67)),
    ]
    if pedal:
        events += [(pedal[0], Control(0, 64, 127)), (pedal[1], Control(0, 64, 0))]
    events.sort(key=lambda entry: entry[0])
    return read_bytes(
        write_midi_file(RawMidi(0, TICKS, (RawTrack(tuple(events), 2400),))),  # type: ignore[arg-type]
        "two.mid",
    )


@pytest.mark.parametrize(("apart", "together"), [(0, True), (16, True), (30, True), (60, False)])
def test_the_tolerance_follows_the_tempo(apart: int, together: bool) -> None:
    """35 ms at 120 quarter notes a minute are 33.6 ticks of 480."""
    score = two(0, apart)
    third = next(n for n in score.notes if n.pitch == Pitch.parse("E4"))
    assert third.onset == Fraction(apart, TICKS)
    assert (third.analysed_onset == 0) == together


def test_the_pedal_lets_notes_sound_on_for_the_analysis() -> None:
    plain, held = two(0, 0), two(0, 0, (480, 1900))
    for score, end in ((plain, 960), (held, 1900)):
        third = next(n for n in score.notes if n.pitch == Pitch.parse("E4"))
        assert third.end == Fraction(960, TICKS)
        assert third.analysed_end == Fraction(end, TICKS)
