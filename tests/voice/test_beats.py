"""Beats and shared partials against the handbook's table (voice.md 3.1 and 4.1)."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from retune.voice.beats import (
    SoundingTone,
    beat_rate,
    pairs,
    shared_partials,
    whole_chord_partial,
)

F = Fraction
C3 = 130.8127826502993

# Equal temperament on C3: semitones, p:q, coincidence in Hz, beats a second.
TABLE = [
    (12, 2, 1, 261.63, 0.0),
    (7, 3, 2, 392.44, 0.443),
    (19, 3, 1, 392.44, 0.443),
    (5, 4, 3, 523.25, 0.591),
    (4, 5, 4, 654.06, 5.191),
    (16, 5, 2, 654.06, 5.191),
    (28, 5, 1, 654.06, 5.191),
    (3, 6, 5, 784.88, 7.059),
    (15, 12, 5, 1569.75, 14.118),
    (9, 5, 3, 654.06, 5.936),
    (8, 8, 5, 1046.50, 8.241),
    (10, 7, 4, 915.69, 16.638),
    (10, 9, 5, 1177.32, 11.906),
    (10, 16, 9, 2093.00, 4.732),
    (2, 9, 8, 1177.32, 2.656),
    (14, 9, 4, 1177.32, 2.656),
]


@pytest.mark.parametrize(("semitones", "p", "q", "meeting", "beats"), TABLE)
def test_beats_of_equal_temperament(
    semitones: int, p: int, q: int, meeting: float, beats: float
) -> None:
    high = C3 * 2 ** (semitones / 12)
    assert p * C3 == pytest.approx(meeting, abs=0.01)
    assert beat_rate(C3, high, p, q) == pytest.approx(beats, abs=1e-3)


def test_the_basss_tenth_partial_with_the_fourth_above() -> None:
    assert beat_rate(C3, C3 * 2 ** (16 / 12), 5, 2, k=2) == pytest.approx(10.382, abs=1e-3)
    found = [(s.low_partial, s.high_partial) for s in shared_partials(F(5, 2), C3)]
    assert found == [(5, 2), (10, 4)]


@pytest.mark.parametrize(
    ("ratios", "partial"),
    [
        ((F(1), F(5, 4), F(3, 2)), 15),
        ((F(1), F(6, 5), F(3, 2)), 6),
        ((F(1), F(3, 2)), 3),
    ],
)
def test_what_a_whole_chord_shares(ratios: tuple[Fraction, ...], partial: int) -> None:
    assert whole_chord_partial(ratios, C3) == pytest.approx(partial * C3)


def test_a_natural_seventh_chord_shares_nothing_audible() -> None:
    # 4:5:6:7 meet at 105 times the root.
    assert whole_chord_partial([F(1), F(5, 4), F(3, 2), F(7, 4)], C3) is None


RATIOS = st.sampled_from([F(1), F(9, 8), F(6, 5), F(5, 4), F(4, 3), F(3, 2), F(5, 3), F(7, 4)])


@given(st.lists(st.tuples(RATIOS, st.integers(0, 2)), min_size=2, max_size=5))
def test_just_chords_do_not_beat(chord: list[tuple[Fraction, int]]) -> None:
    tones = [SoundingTone(110.0 * float(r) * 2**o, 110.0 * float(r) * 2**o, r) for r, o in chord]
    for pair in pairs(tones):
        assert pair.beat_hz == pytest.approx(0.0, abs=1e-9)
        assert tones[pair.high].hz / tones[pair.low].hz == pytest.approx(float(pair.ratio))
        for shared in pair.shared:
            meeting = shared.high_partial * tones[pair.high].hz
            assert shared.low_partial * tones[pair.low].hz == pytest.approx(meeting)


def test_pairs_of_a_tenth() -> None:
    low = SoundingTone(C3, C3, F(1))
    high = SoundingTone(C3 * 2.5, C3 * 2 ** (16 / 12), F(5, 4))
    (pair,) = pairs([high, low])
    assert (pair.low, pair.high, pair.ratio) == (1, 0, F(5, 2))
    assert pair.beat_hz == pytest.approx(0.0, abs=1e-9)
    assert pair.equal_hz == pytest.approx(5.191, abs=1e-3)


def test_unisons_and_tones_without_ratio_make_no_pair() -> None:
    tone = SoundingTone(220.0, 220.0, F(1))
    assert pairs([tone, tone]) == ()
    assert pairs([tone, SoundingTone(330.0, 330.0, None)]) == ()
