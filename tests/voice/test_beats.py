"""Beats against the handbook's table of equal temperament (voice.md 3.1) and its depths."""

from __future__ import annotations

import math
from fractions import Fraction
from random import Random

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from retune.voice.beats import (
    SoundingTone,
    beat_depth_db,
    beat_rate,
    countable,
    pairs,
)

F = Fraction
C3 = 130.8127826502993

# Equal temperament on C3: semitones, p:q, cents from just, coincidence in Hz, beats a second.
TABLE = [
    (12, 2, 1, 0.0, 261.63, 0.0),
    (7, 3, 2, -1.955, 392.44, 0.443),
    (19, 3, 1, -1.955, 392.44, 0.443),
    (5, 4, 3, 1.955, 523.25, 0.591),
    (4, 5, 4, 13.686, 654.06, 5.191),
    (16, 5, 2, 13.686, 654.06, 5.191),
    (28, 5, 1, 13.686, 654.06, 5.191),
    (3, 6, 5, -15.641, 784.88, 7.059),
    (15, 12, 5, -15.641, 1569.75, 14.118),
    (9, 5, 3, 15.641, 654.06, 5.936),
    (8, 8, 5, -13.686, 1046.50, 8.241),
    (10, 7, 4, 31.174, 915.69, 16.638),
    (10, 9, 5, -17.596, 1177.32, 11.906),
    (10, 16, 9, 3.910, 2093.00, 4.732),
    (2, 9, 8, -3.910, 1177.32, 2.656),
    (14, 9, 4, -3.910, 1177.32, 2.656),
]


def equal(semitones: int) -> SoundingTone:
    hz = C3 * 2 ** (semitones / 12)
    return SoundingTone(hz, hz, None)


@pytest.mark.parametrize(("semitones", "p", "q", "cents", "meeting", "beats"), TABLE)
def test_beats_of_equal_temperament(
    semitones: int, p: int, q: int, cents: float, meeting: float, beats: float
) -> None:
    high = C3 * 2 ** (semitones / 12)
    assert p * C3 == pytest.approx(meeting, abs=0.01)
    assert beat_rate(C3, high, p, q) == pytest.approx(beats, abs=1e-3)
    # The same from the coincidence and the cents.
    from_cents = meeting * abs(2 ** (cents / 1200) - 1)
    assert beat_rate(C3, high, p, q) == pytest.approx(from_cents, abs=2e-3)


# The rows that the nearest interval within limit 5 picks, none beyond the 12th partial.
PICKED = [row for row in TABLE if row[1] <= 12 and row[1] != 7]


@pytest.mark.parametrize(("semitones", "p", "q", "cents", "meeting", "beats"), PICKED)
def test_tempered_tones_beat_against_the_nearest_just_interval(
    semitones: int, p: int, q: int, cents: float, meeting: float, beats: float
) -> None:
    (pair,) = pairs([equal(0), equal(semitones)])
    assert (pair.low, pair.high, pair.ratio) == (0, 1, F(p, q))
    assert pair.beat_hz == pair.equal_hz == pytest.approx(beats, abs=1e-3)
    assert pair.shared[0].hz == pytest.approx(meeting, abs=0.01)


def test_the_basss_tenth_partial_with_the_fourth_above() -> None:
    assert beat_rate(C3, C3 * 2 ** (16 / 12), 5, 2, k=2) == pytest.approx(10.382, abs=1e-3)
    (pair,) = pairs([equal(0), equal(16)])
    assert [(s.low_partial, s.high_partial) for s in pair.shared] == [(5, 2), (10, 4)]


@pytest.mark.parametrize(
    ("difference", "depth"),
    [(0.5, 30.8), (1, 24.8), (3, 15.3), (6, 9.6), (10, 5.7), (15, 3.1), (20, 1.7), (25, 1.0)],
)
def test_how_deep_beats_are(difference: float, depth: float) -> None:
    assert beat_depth_db(difference) == pytest.approx(depth, abs=0.05)
    assert beat_depth_db(-difference) == beat_depth_db(difference)
    # The same from the envelope of two sine waves.
    turn = np.linspace(0.0, 2.0 * np.pi, 721)
    envelope = 20.0 * np.log10(np.abs(1.0 + 10.0 ** (-difference / 20.0) * np.exp(1j * turn)))
    assert np.ptp(envelope) == pytest.approx(beat_depth_db(difference), abs=1e-6)


def test_equal_partials_cancel() -> None:
    assert beat_depth_db(0.0) == math.inf


def test_which_beats_can_be_counted() -> None:
    # The equal fifth's 0.44 Hz needs more than 2 s (voice.md 3.1).
    assert not countable(0.443, 2.0)
    assert countable(0.443, 2.3)
    assert countable(5.191, 0.5)
    assert not countable(14.118, 4.0)
    assert not countable(0.0, 60.0)


RATIOS = st.sampled_from([F(1), F(9, 8), F(6, 5), F(5, 4), F(4, 3), F(3, 2), F(5, 3), F(7, 4)])


@given(st.lists(st.tuples(RATIOS, st.integers(0, 2)), min_size=2, max_size=5), st.randoms())
def test_just_chords_do_not_beat(chord: list[tuple[Fraction, int]], shuffled: Random) -> None:
    shuffled.shuffle(chord)
    tones = [SoundingTone(110.0 * float(r) * 2**o, 110.0 * float(r) * 2**o, r) for r, o in chord]
    for pair in pairs(tones):
        assert pair.beat_hz == pytest.approx(0.0, abs=1e-9)
        assert tones[pair.high].hz / tones[pair.low].hz == pytest.approx(float(pair.ratio))
        for shared in pair.shared:
            meeting = shared.high_partial * tones[pair.high].hz
            assert shared.low_partial * tones[pair.low].hz == pytest.approx(meeting)


@given(st.lists(st.integers(-12, 24), min_size=2, max_size=5))
def test_the_order_of_the_tones_changes_nothing(semitones: list[int]) -> None:
    tones = [equal(one) for one in semitones]

    def told(of: list[SoundingTone]) -> list[tuple[float, float, Fraction, float]]:
        return sorted((of[p.low].hz, of[p.high].hz, p.ratio, p.beat_hz) for p in pairs(of))

    assert told(tones) == told(tones[::-1])


def test_pairs_of_a_tenth() -> None:
    low = SoundingTone(C3, C3, F(1))
    high = SoundingTone(C3 * 2.5, C3 * 2 ** (16 / 12), F(5, 4))
    (pair,) = pairs([high, low])
    assert (pair.low, pair.high, pair.ratio) == (1, 0, F(5, 2))
    assert pair.beat_hz == pytest.approx(0.0, abs=1e-9)
    assert pair.equal_hz == pytest.approx(5.191, abs=1e-3)


def test_the_ratio_that_is_meant_goes_before_the_nearest() -> None:
    # An equal seventh lies nearer to 9/5, but this chord means 7/4.
    low, high = SoundingTone(C3, C3, F(1)), equal(10)
    (pair,) = pairs([low, SoundingTone(high.hz, high.hz, F(7, 4))])
    assert pair.ratio == F(7, 4)
    assert pair.beat_hz == pytest.approx(16.638, abs=1e-3)


def test_pitches_far_from_what_is_meant_are_taken_as_they_sound() -> None:
    low, high = SoundingTone(C3, C3, F(1)), equal(3)
    (pair,) = pairs([low, SoundingTone(high.hz, high.hz, F(5, 4))])
    assert pair.ratio == F(6, 5)
    assert pair.beat_hz == pytest.approx(7.059, abs=1e-3)


def test_a_voice_against_an_equal_accompaniment() -> None:
    piano, voice = equal(0), SoundingTone(C3 * 1.25, C3 * 2 ** (4 / 12), F(5, 4))
    (pair,) = pairs([piano, voice])
    assert pair.beat_hz == pytest.approx(0.0, abs=1e-9)
    assert pair.equal_hz == pytest.approx(5.191, abs=1e-3)


def test_simple_intervals_come_first() -> None:
    found = pairs([equal(0), equal(4), equal(7), equal(12)])
    assert [pair.ratio for pair in found] == [
        F(2),
        F(3, 2),
        F(4, 3),
        F(5, 4),
        F(6, 5),
        F(8, 5),
    ]


def test_unisons_semitones_and_tritones_make_no_pair() -> None:
    assert pairs([equal(0), equal(0)]) == ()
    assert pairs([equal(0), equal(1)]) == ()
    assert pairs([equal(0), equal(6)]) == ()
    assert len(pairs([equal(0), equal(6)], limit=7)) == 1
