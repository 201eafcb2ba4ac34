"""Loudness and true peak against the test signals of the standards.

ITU-R BS.1770-4, annex 1: a 997 Hz sine at full scale in one channel reads -3.01 LKFS. EBU Tech
3341 (2016), tables 1 and 2: signals 1 to 5 and 15 to 19, as remembered; tolerance 0.1 LU, and
+0.2/-0.4 dB for true peaks.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.signal import resample_poly

from retune.adapters.loudness import integrated_lufs, true_peak_db

RATE = 48_000


def sine(level_db: float, seconds: float, hz: float = 1000.0, channels: int = 2) -> np.ndarray:
    time = np.arange(round(seconds * RATE)) / RATE
    wave = 10.0 ** (level_db / 20.0) * np.sin(2 * np.pi * hz * time)
    return np.repeat(wave[:, None], channels, axis=1).astype(np.float32)


def test_full_scale_sine_in_one_channel() -> None:
    assert integrated_lufs(sine(0.0, 5.0, 997.0, 1), RATE) == pytest.approx(-3.01, abs=0.1)


@pytest.mark.parametrize(
    ("steps", "expected"),
    [
        ([(-23.0, 20.0)], -23.0),
        ([(-33.0, 20.0)], -33.0),
        ([(-36.0, 10.0), (-23.0, 60.0), (-36.0, 10.0)], -23.0),
        ([(-72.0, 10.0), (-36.0, 10.0), (-23.0, 60.0), (-36.0, 10.0), (-72.0, 10.0)], -23.0),
        ([(-26.0, 20.0), (-20.0, 20.1), (-26.0, 20.0)], -23.0),
    ],
)
def test_gating(steps: list[tuple[float, float]], expected: float) -> None:
    sound = np.concatenate([sine(level, seconds) for level, seconds in steps])
    assert integrated_lufs(sound, RATE) == pytest.approx(expected, abs=0.1)


def test_silence_and_sounds_shorter_than_a_block() -> None:
    assert integrated_lufs(np.zeros((RATE, 2), np.float32), RATE) == -math.inf
    assert integrated_lufs(np.zeros((0, 2), np.float32), RATE) == -math.inf
    assert math.isfinite(integrated_lufs(sine(-20.0, 0.1), RATE))


@pytest.mark.parametrize(
    ("fraction", "degrees", "level_db", "peak_db"),
    [(4, 0, -6.0, -6.0), (4, 45, -6.0, -6.0), (6, 60, -6.0, -6.0), (8, 67.5, -6.0, -6.0)],
)
def test_true_peaks_between_samples(
    fraction: int, degrees: float, level_db: float, peak_db: float
) -> None:
    count = np.arange(RATE)
    wave = np.sin(2 * np.pi * count / fraction + np.deg2rad(degrees))
    fade = np.minimum(1.0, np.minimum(count, RATE - 1 - count) / 2000.0)
    sound = (10.0 ** (level_db / 20.0) * wave * fade).astype(np.float32)
    assert peak_db - 0.4 <= true_peak_db(sound, RATE) <= peak_db + 0.2


def test_the_short_cut_finds_what_oversampling_everything_finds() -> None:
    random = np.random.default_rng(4)
    noise = random.standard_normal((100_000, 2)).astype(np.float32)
    smooth = resample_poly(noise, 1, 3, axis=0) * np.hanning(33_334)[:, None]
    sound = (0.2 * smooth).astype(np.float32)
    whole = max(np.abs(resample_poly(c.astype(float), 4, 1)).max() for c in sound.T)
    assert true_peak_db(sound, RATE) == pytest.approx(20 * math.log10(whole), abs=1e-3)


def test_peak_of_nothing() -> None:
    assert true_peak_db(np.zeros((0, 2), np.float32), RATE) == -math.inf
    assert true_peak_db(np.zeros((100, 2), np.float32), RATE) == -math.inf
