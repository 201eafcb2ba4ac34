"""Whatever the notes, the analysis covers the piece and nothing else."""

from __future__ import annotations

from fractions import Fraction

from hypothesis import given, settings
from hypothesis import strategies as st

from retune.harmony import Role, analyse
from retune.pitch import Pitch
from retune.score.model import Bar, Note, Part, Score

LENGTHS = [
    Fraction(n, d) for n, d in ((1, 8), (1, 4), (1, 3), (1, 2), (1, 1), (3, 2), (4, 1), (9, 1))
]


@st.composite
def scores(draw: st.DrawFn) -> Score:
    notes = []
    count = draw(st.integers(0, 5))
    for part in range(count):
        onset = Fraction(0)
        for _ in range(draw(st.integers(0, 12))):
            length = draw(st.sampled_from(LENGTHS))
            if draw(st.booleans()):
                pitch = Pitch(
                    draw(st.sampled_from("CDEFGAB")),
                    draw(st.integers(-2, 2)),
                    draw(st.integers(0, 8)),
                )
                grace = draw(st.integers(0, 9)) == 0
                notes.append(Note(part, onset, length, pitch, grace=grace))
            onset += length
    notes.sort(key=lambda note: (note.onset, note.part, note.pitch.key))
    metre = draw(st.sampled_from([(4, 4), (3, 4), (6, 8), (7, 8), (5, 4), (3, 2), (3, 8)]))
    bar = Fraction(4 * metre[0], metre[1])
    bars = tuple(Bar(i, i, str(i + 1), i * bar, bar, metre) for i in range(draw(st.integers(0, 6))))
    parts = tuple(Part(i, f"Part {i + 1}") for i in range(count))
    return Score("random", "", parts, tuple(notes), bars)


@settings(max_examples=60, deadline=None)
@given(scores())
def test_slices_chords_and_fragments_fit_together(score: Score) -> None:
    harmony = analyse(score)
    end = max([score.end, *(note.end for note in score.notes if not note.grace)])
    assert sum(piece.duration for piece in harmony.slices) == end
    assert sum(chord.duration for chord in harmony.chords) == end
    for before, after in zip(harmony.chords, harmony.chords[1:], strict=False):
        assert (before.end, before.last) == (after.onset, after.first)
        assert (before.root, before.quality) != (after.root, after.quality)
    for chord in harmony.chords:
        assert 0 <= chord.confidence <= 1
        assert (chord.root is None) == (chord.quality is None)
        sounding = any(harmony.slices[i].notes for i in range(chord.first, chord.last))
        assert sounding == (chord.root is not None)
    pieces: dict[int, Fraction] = {}
    for fragment in harmony.fragments:
        assert (fragment.degree is not None) == (fragment.role is Role.CHORD_TONE)
        for index in range(fragment.first, fragment.last):
            assert fragment.note in harmony.slices[index].notes
            length = harmony.slices[index].duration
            pieces[fragment.note] = pieces.get(fragment.note, Fraction(0)) + length
    assert pieces == {i: n.duration for i, n in enumerate(score.notes) if not n.grace}
    order = [(fragment.note, fragment.chord) for fragment in harmony.fragments]
    assert order == sorted(order)
