"""Roughness against the handbook's figures of the published curve (methods.md 1c, voice.md 3.2)."""

from __future__ import annotations

import math

import numpy as np
import pytest

from retune.voice.roughness import curve, roughness

C4 = 261.6256

# Six partials of 0.88 each, the minimum of two amplitudes, pairs within a tone included:
# methods.md 1c, after the constants of Sethares's program.
CHORDS = [
    ("major, equal", [2 ** (k / 12) for k in (0, 4, 7)], 4.3568),
    ("major 4:5:6", [1, 5 / 4, 3 / 2], 3.7048),
    ("minor, equal", [2 ** (k / 12) for k in (0, 3, 7)], 4.4980),
    ("minor 10:12:15", [1, 6 / 5, 3 / 2], 3.8013),
    ("minor 6:7:9", [1, 7 / 6, 3 / 2], 4.8602),
    ("minor 16:19:24", [1, 19 / 16, 3 / 2], 4.4924),
    ("dominant seventh, equal", [2 ** (k / 12) for k in (0, 4, 7, 10)], 8.8910),
    ("dominant seventh 4:5:6:7", [1, 5 / 4, 3 / 2, 7 / 4], 8.3822),
    ("dominant seventh with 16/9", [1, 5 / 4, 3 / 2, 16 / 9], 8.3154),
    ("dominant seventh with 9/5", [1, 5 / 4, 3 / 2, 9 / 5], 8.0107),
]


@pytest.mark.parametrize(
    ("ratios", "expected"), [c[1:] for c in CHORDS], ids=[c[0] for c in CHORDS]
)
def test_chords_of_the_handbook(ratios: list[float], expected: float) -> None:
    assert roughness([C4 * ratio for ratio in ratios]) == pytest.approx(expected, abs=6e-5)


@pytest.mark.parametrize(
    ("hz", "apart"), [(110, 19.5), (220, 21.6), (440, 25.8), (880, 34.1), (1760, 50.9)]
)
def test_roughest_distance_of_two_pure_tones(hz: float, apart: float) -> None:
    """Hz between pure tones at the peak of the curve (voice.md 3.2, of the 1993 constants, from
    which those of the program differ by about a hundredth)."""
    distances = np.arange(1.0, 120.0, 0.1)
    values = [curve(hz, hz + distance) for distance in distances]
    assert distances[int(np.argmax(values))] == pytest.approx(apart, rel=0.025)
    # The peak of exp(-3.5 x) - exp(-5.75 x) is 0.1808; the program's curve is five times that.
    assert max(values) == pytest.approx(5 * 0.1808, rel=0.01)


def test_nothing_is_rough_in_a_unison_or_far_apart() -> None:
    """None within no distance, none beyond a critical band (Plomp and Levelt 1965)."""
    assert curve(440.0, 440.0) == 0.0
    assert curve(440.0, 880.0) < 0.02
    assert curve(440.0, 466.0) == curve(466.0, 440.0)


def test_one_tone_has_its_own_and_order_does_not_matter() -> None:
    alone = roughness([220.0])
    assert 0.0 < alone < roughness([220.0, 233.0])
    assert roughness([220.0, 330.0]) == pytest.approx(roughness([330.0, 220.0]))
    assert roughness([220.0], partials=1) == 0.0


def test_a_fifth_is_smoother_just_than_anywhere_near() -> None:
    """The curve has its minimum at simple ratios (Sethares 1993)."""
    cents = np.arange(650, 750, 0.5)
    values = [roughness([C4, C4 * 2 ** (size / 1200)]) for size in cents]
    just = 1200 * math.log2(3 / 2)
    assert cents[int(np.argmin(values))] == pytest.approx(just, abs=0.5)
