"""Bend arithmetic against published vectors and tables."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from retune.export.bend import bend_cents, bend_step, bend_value, nearest_key


def test_the_vector_of_the_mpe_specification() -> None:
    # M1-100-UM v1.1, appendix C.4: range 48, seven semitones up.
    assert bend_value(700.0, 48) == 9387


@pytest.mark.parametrize(
    ("cents", "semitones", "value"),
    [
        # Computed by hand from the formula of M1-100-UM v1.1, C.3, rounding half up.
        (-13.686286, 2, 7631),
        (-13.686286, 12, 8099),
        (1.955001, 2, 8272),
        (-31.174094, 2, 6915),
        (15.641287, 48, 8219),
        (50.0, 2, 10240),
        (-50.0, 2, 6144),
        (50.0, 24, 8363),
        (0.0, 2, 8192),
        # The ends: all of the range downward, one step less upward (General MIDI 2, 3.6).
        (-200.0, 2, 0),
        (200.0, 2, 16383),
    ],
)
def test_worked_bends(cents: float, semitones: int, value: int) -> None:
    assert bend_value(cents, semitones) == value


def test_step_and_ends_at_range_two() -> None:
    assert bend_step(2) == pytest.approx(0.024414, abs=1e-6)
    assert bend_cents(16383, 2) == pytest.approx(199.9756, abs=1e-4)
    assert bend_cents(0, 2) == -200.0


@given(st.floats(-199.9, 199.9), st.sampled_from([2, 12, 24]))
def test_rounding_is_within_half_a_step(cents: float, semitones: int) -> None:
    error = bend_cents(bend_value(cents, semitones), semitones) - cents
    assert abs(error) <= bend_step(semitones) / 2 + 1e-9


def test_the_nearest_key_is_at_most_half_a_semitone_away() -> None:
    assert [nearest_key(pitch) for pitch in (68.49, 68.5, 69.0, 69.49, 69.5)] == [
        68,
        69,
        69,
        69,
        70,
    ]
