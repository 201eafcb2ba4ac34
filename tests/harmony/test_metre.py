"""Metric levels against music21's beat strengths and against what a primer says."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from music21 import meter

from retune.harmony.metre import grid_points, metric_levels
from retune.score.model import Bar


def levels(metre: tuple[int, int], times: list[float]) -> list[int]:
    length = Fraction(4 * metre[0], metre[1])
    bars = tuple(Bar(i, i, str(i + 1), i * length, length, metre) for i in range(2))
    return metric_levels(bars, np.array(times)).tolist()


@pytest.mark.parametrize("metre", [(4, 4), (2, 4), (3, 4), (6, 8), (12, 8)])
def test_stronger_for_music21_is_never_weaker_here(metre: tuple[int, int]) -> None:
    """music21 gives accent weights on a grid of its own; the order of any two must agree."""
    signature = meter.TimeSignature(f"{metre[0]}/{metre[1]}")
    times = [i * 0.5 for i in range(8 * metre[0] // metre[1])]
    theirs = [signature.getAccentWeight(t) for t in times]
    ours = levels(metre, times)
    for i in range(len(times)):
        for j in range(len(times)):
            assert not (theirs[i] > theirs[j] and ours[i] < ours[j]), (times[i], times[j])


def test_levels_of_common_time() -> None:
    """Common practice, no source: downbeat, half bar, beats, off-beats, finer."""
    assert levels((4, 4), [0, 0.25, 0.5, 1, 1.5, 2, 3, 4]) == [4, 0, 1, 2, 1, 3, 2, 4]


def test_triplets_are_finer_than_any_pulse() -> None:
    assert levels((4, 4), [1 / 3, 2 / 3]) == [0, 0]


def test_pick_up_counts_from_the_end_of_its_bar() -> None:
    bars = (
        Bar(0, 0, "0", Fraction(0), Fraction(1), (4, 4), begins=Fraction(3)),
        Bar(1, 1, "1", Fraction(1), Fraction(4), (4, 4)),
    )
    assert metric_levels(bars, np.array([0.0, 0.5, 1.0, 3.0])).tolist() == [2, 1, 4, 3]
    np.testing.assert_allclose(grid_points(bars, 2.0)[:4], [0.0, 0.5, 1.0, 1.5])
