"""Shared partials against the handbook (voice.md 4.1) and against plain counting."""

from __future__ import annotations

from fractions import Fraction
from math import gcd

import pytest
from hypothesis import given
from hypothesis import strategies as st

from retune.voice.partials import HIGHEST_HZ, chord_partial, coincidences, nearest_just

F = Fraction
C3 = 130.8127826502993

JUST = st.builds(F, st.integers(1, 16), st.integers(1, 16)).filter(lambda ratio: ratio > 1)


def test_the_basss_tenth_partial_is_the_fourth_of_a_major_tenth() -> None:
    found = coincidences(F(5, 2), C3)
    assert [(s.low_partial, s.high_partial) for s in found] == [(5, 2), (10, 4), (15, 6), (20, 8)]
    # Voice.md 4.2: the bass's 5th and 10th partials on C3.
    assert [round(s.hz) for s in found[:2]] == [654, 1308]


@pytest.mark.parametrize(
    ("narrow", "wide", "shared"),
    [
        # A wider major third shares more of the upper voice's partials, a wider minor one fewer
        # of the lower voice's (voice.md 4.1).
        (F(5, 4), F(5, 2), [2, 4, 6]),
        (F(5, 2), F(5), [1, 2, 3]),
        (F(6, 5), F(12, 5), [5, 10, 15]),
    ],
)
def test_octaves_between(narrow: Fraction, wide: Fraction, shared: list[int]) -> None:
    assert wide == 2 * narrow
    assert [s.high_partial for s in coincidences(wide, 100.0, most=3)] == shared


@given(JUST, st.floats(40.0, 900.0), st.integers(1, 6))
def test_shared_partials_by_counting(ratio: Fraction, low_hz: float, most: int) -> None:
    highest = int(HIGHEST_HZ / low_hz)
    counted = [(m, n) for m in range(1, highest + 1) for n in range(1, m + 1) if F(m) == n * ratio][
        :most
    ]
    found = coincidences(ratio, low_hz, most=most)
    assert [(s.low_partial, s.high_partial) for s in found] == counted
    for shared in found:
        assert shared.hz == pytest.approx(shared.high_partial * low_hz * float(ratio))


@pytest.mark.parametrize(
    ("ratios", "numbers", "hz"),
    [
        # 4:5:6 and 10:12:15 on C3 (voice.md 4.1).
        ((F(1), F(5, 4), F(3, 2)), (15, 12, 10), 1962.0),
        ((F(1), F(6, 5), F(3, 2)), (6, 5, 4), 785.0),
        # The major triad with its third a tenth above: half as far for the third.
        ((F(1), F(5, 2), F(3, 2)), (15, 6, 10), 1962.0),
        ((F(1), F(3, 2)), (3, 2), 392.44),
        ((F(1), F(1), F(2)), (2, 2, 1), 261.63),
    ],
)
def test_what_a_whole_chord_shares(
    ratios: tuple[Fraction, ...], numbers: tuple[int, ...], hz: float
) -> None:
    found = chord_partial(ratios, C3)
    assert found is not None
    assert found.numbers == numbers
    assert found.hz == pytest.approx(hz, abs=0.5)


def test_a_natural_seventh_chord_shares_nothing_audible() -> None:
    sevenths = [F(1), F(5, 4), F(3, 2), F(7, 4)]
    assert chord_partial(sevenths, C3) is None
    # 105 times the root (voice.md 4.1).
    found = chord_partial(sevenths, 10.0)
    assert found is not None
    assert found.hz == pytest.approx(1050.0)


@given(st.lists(JUST, min_size=1, max_size=4))
def test_a_chords_partial_is_a_partial_of_every_tone_and_the_lowest(above: list[Fraction]) -> None:
    ratios = [F(1), *above]
    found = chord_partial(ratios, 1.0, highest_hz=1e12)
    assert found is not None
    assert {number * ratio for number, ratio in zip(found.numbers, ratios, strict=True)} == {
        F(found.numbers[0])
    }
    # Two tones meet nowhere lower than where their numbers have no common factor.
    assert gcd(*found.numbers) == 1


@pytest.mark.parametrize(
    ("semitones", "limit", "ratio"),
    [
        # What an equal interval is nearest to (voice.md 3.1).
        (12, 5, F(2)),
        (7, 5, F(3, 2)),
        (19, 5, F(3)),
        (5, 5, F(4, 3)),
        (4, 5, F(5, 4)),
        (16, 5, F(5, 2)),
        (28, 5, F(5)),
        (3, 5, F(6, 5)),
        (15, 5, F(12, 5)),
        (9, 5, F(5, 3)),
        (8, 5, F(8, 5)),
        (10, 5, F(9, 5)),
        (2, 5, F(9, 8)),
        (14, 5, F(9, 4)),
        # 7/5 has 582.5 cents; without sevens the tritone has no simple ratio.
        (6, 7, F(7, 5)),
        (6, 5, None),
        # 5/4 has 13.7 cents too few, and no five is allowed.
        (4, 3, None),
        (0, 5, None),
        (1, 5, None),
    ],
)
def test_the_nearest_just_interval(semitones: int, limit: int, ratio: Fraction | None) -> None:
    assert nearest_just(2.0 ** (semitones / 12), limit) == ratio


def test_a_mistuned_unison_is_no_other_interval() -> None:
    assert nearest_just(2.0 ** (30 / 1200), 5) is None


def test_a_quarter_tone_is_near_no_just_interval() -> None:
    # 450 cents: 64 above 5/4, 48 below 4/3.
    assert nearest_just(2.0 ** (450 / 1200), 5) is None
