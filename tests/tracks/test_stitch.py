"""Stretches cut out and set in a row keep every tuned pitch."""

from __future__ import annotations

from fractions import Fraction

import pytest

from retune.tracks.learning import excerpt
from retune.tracks.stitch import Silence, Stretch, stitched, whole
from retune.tuning.refigure import refigured
from tests.tracks.pieces import NAMES, tuned

F = Fraction


@pytest.mark.parametrize("name", NAMES)
def test_a_whole_piece_is_itself(name: str) -> None:
    piece = tuned(name)
    assert stitched([whole(piece)]) == piece


@pytest.mark.parametrize("name", NAMES)
def test_figures_counted_anew_are_the_same(name: str) -> None:
    piece = tuned(name)
    assert refigured(piece).figures == piece.figures


@pytest.mark.parametrize("name", NAMES)
def test_an_excerpt_sounds_as_it_does_in_the_piece(name: str) -> None:
    piece = tuned(name)
    bars = piece.score.bars
    first, last = len(bars) // 3, len(bars) // 3 + 4
    cut = stitched([Stretch(piece, first, last)])
    start, stop = bars[first].onset, bars[last].onset
    assert cut.score.end == stop - start
    assert [bar.number for bar in cut.score.bars] == [bar.number for bar in bars[first:last]]

    def sounding(which: object, onset: Fraction) -> set[tuple[int, int, float, object]]:
        return {
            (n.note.part, n.note.pitch.key, s.cents, s.ratio)
            for n in which.notes  # type: ignore[attr-defined]
            for s in n.segments
            if s.onset <= onset < s.end
        }

    steps = [start + (stop - start) * F(k, 97) for k in range(97)]
    for onset in steps:
        assert sounding(cut, onset - start) == sounding(piece, onset)
        there = cut.score.tempo.seconds(onset - start)
        assert there == pytest.approx(piece.seconds(onset) - piece.seconds(start), abs=1e-9)


@pytest.mark.parametrize("name", NAMES)
def test_harmony_of_an_excerpt_holds_together(name: str) -> None:
    piece = tuned(name)
    row = stitched([Stretch(piece, 2, 7, Silence((F(4),), F(80))), Stretch(piece, 2, 7)])
    harmony, score = row.harmony, row.score
    assert [c.index for c in harmony.chords] == list(range(len(harmony.chords)))
    assert len(row.root_cents) == len(harmony.chords)
    end = F(0)
    for chord in harmony.chords:
        assert chord.onset == end
        end = chord.end
        own = harmony.slices[chord.first : chord.last]
        assert own[0].onset >= chord.onset
        assert own[-1].onset + own[-1].duration <= chord.end
    assert end == score.end
    for one in harmony.slices:
        sounding = {
            i
            for i, n in enumerate(score.notes)
            if n.onset <= one.onset and n.analysed_end >= one.onset + one.duration and not n.grace
        }
        assert set(one.notes) == sounding
    onsets = [(n.onset, n.part, n.pitch.key) for n in score.notes]
    assert onsets == sorted(onsets)
    for fragment in harmony.fragments:
        assert fragment.note in harmony.slices[fragment.first].notes


def test_a_held_note_is_cut_at_both_ends() -> None:
    piece = tuned("gull-song")
    drone = max(piece.notes, key=lambda one: one.note.duration)
    bars = [b.index for b in piece.score.bars if drone.note.onset < b.onset < drone.note.end]
    cut = stitched([Stretch(piece, bars[0], bars[0] + 1)])
    found = [n for n in cut.notes if n.note.pitch == drone.note.pitch]
    assert any(n.note.onset == 0 and n.note.end == cut.score.end for n in found)


def test_bars_by_letter_and_from_the_pick_up() -> None:
    piece = tuned("regatta-day")
    pickup = excerpt(piece, f"{piece.score.bars[0].number}-1")
    assert pickup.score.bars[0].begins > 0
    assert pickup.score.notes[0].pitch == piece.score.notes[0].pitch
    letters = [bar.rehearsal for bar in piece.score.bars if bar.rehearsal]
    section = excerpt(piece, letters[0])
    assert section.score.bars[0].rehearsal == letters[0]
