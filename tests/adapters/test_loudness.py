"""Loudness and true peak against the test signals of the standards.

ITU-R BS.1770-4, annex 1: a 997 Hz sine at full scale in one channel reads -3.01 LKFS. EBU Tech
3341 (2016), tables 1 and 2: signals 1 to 5 and 15 to 19, as remembered; tolerance 0.1 LU, and
+0.2/-0.4 dB for true peaks.
"""

from __future__ import annotations

import math
import tracemalloc

import numpy as np
import pyloudnorm
import pytest
from scipy.signal import resample_poly, sosfilt

from retune.adapters.loudness import integrated_lufs, true_peak_db

RATE = 48_000


def sine(level_db: float, seconds: float, hz: float = 1000.0, channels: int = 2) -> np.ndarray:
    time = np.arange(round(seconds * RATE)) / RATE
    wave = 10.0 ** (level_db / 20.0) * np.sin(2 * np.pi * hz * time)
    return np.repeat(wave[:, None], channels, axis=1).astype(np.float32)


def test_full_scale_sine_in_one_channel() -> None:
    mono = sine(0.0, 5.0, 997.0, 1)
    left = np.concatenate([mono, np.zeros_like(mono)], axis=1)
    for sound in (mono, mono[:, 0], left):
        assert integrated_lufs(sound, RATE) == pytest.approx(-3.01, abs=0.005)


def test_the_weighting_is_that_of_the_standard() -> None:
    # BS.1770-4, annex 1, tables 1 and 2: coefficients at 48 kHz, from memory.
    shelf = [1.53512485958697, -2.69169618940638, 1.19839281085285]
    shelf += [1.0, -1.69065929318241, 0.73248077421585]
    high_pass = [1.0, -2.0, 1.0, 1.0, -1.99004745483398, 0.99007225036621]
    random = np.random.default_rng(2)
    for hz in (40.0, 200.0, 1000.0, 5000.0, 15_000.0):
        sound = sine(-10.0, 3.0, hz, 1)[:, 0]
        sound += (0.001 * random.standard_normal(len(sound))).astype(np.float32)
        heard = sosfilt([shelf, high_pass], sound.astype(float))
        expected = -0.691 + 10.0 * np.log10(np.mean(heard**2))
        assert integrated_lufs(sound, RATE) == pytest.approx(expected, abs=0.02)


@pytest.mark.parametrize(
    ("rate", "seconds"),
    [
        (48_000, 0.4),
        (48_000, 19.98),
        (48_000, 20.3),
        (44_100, 20.36),
        (22_050, 40.42),
        (11_025, 45.0),
    ],
)
def test_pieces_read_as_the_whole_does(rate: int, seconds: float) -> None:
    # Pieces end at 20 s and 40 s; pyloudnorm weights and gates the whole at once.
    random = np.random.default_rng(9)
    frames = round(seconds * rate) + 1
    swell = 10.0 ** (-3.0 * np.abs(np.sin(np.arange(frames) / rate)))
    sound = (0.3 * swell[:, None] * random.uniform(-1.0, 1.0, (frames, 2))).astype(np.float32)
    whole = pyloudnorm.Meter(rate, "DeMan").integrated_loudness(sound)
    assert integrated_lufs(sound, rate) == pytest.approx(whole, abs=1e-5)


def test_memory_does_not_grow_with_the_sound() -> None:
    sound = np.zeros((100 * RATE, 2), np.float32)
    sound[::1000] = 0.5
    tracemalloc.start()
    try:
        integrated_lufs(sound, RATE)
        true_peak_db(sound, RATE)
        most = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    assert most < 40e6  # the sound itself has 38 MB, and 77 MB in double precision


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
    # A quarter of the block sounds: 10 log10(1/4) = -6.0 dB, and the filters' dying away.
    short, long = sine(-20.0, 0.1), sine(-20.0, 3.0)
    lower = integrated_lufs(short, RATE) - integrated_lufs(long, RATE)
    assert lower == pytest.approx(-6.02, abs=0.1)
    assert integrated_lufs(short[:, 0], RATE) == pytest.approx(
        integrated_lufs(short, RATE) - 3.01, abs=0.01
    )
    # Below the absolute gate of -70 LUFS.
    assert integrated_lufs(sine(-75.0, 2.0), RATE) == -math.inf


@pytest.mark.parametrize(
    ("fraction", "degrees", "peak_db"),
    [(4, 0, -6.0), (4, 45, -6.0), (6, 60, -6.0), (8, 67.5, -6.0), (4, 45, 0.0), (4, 45, 3.0)],
)
def test_true_peaks_between_samples(fraction: int, degrees: float, peak_db: float) -> None:
    count = np.arange(RATE)
    wave = np.sin(2 * np.pi * count / fraction + np.deg2rad(degrees))
    fade = np.minimum(1.0, np.minimum(count, RATE - 1 - count) / 2000.0)
    sound = (10.0 ** (peak_db / 20.0) * wave * fade).astype(np.float32)
    if degrees == 45:
        # The samples stand at 45, 135, 225 and 315 degrees.
        assert 20 * math.log10(np.abs(sound).max()) == pytest.approx(peak_db - 3.01, abs=0.01)
    assert peak_db - 0.4 <= true_peak_db(sound, RATE) <= peak_db + 0.2


def oversampled_db(sound: np.ndarray) -> float:
    """The highest of four times as many samples, all of them made."""
    columns = sound.reshape(len(sound), -1).astype(float).T
    return 20 * math.log10(max(np.abs(resample_poly(one, 4, 1)).max() for one in columns))


def odd_sounds() -> dict[str, np.ndarray]:
    """Sounds whose peaks are hard to find."""
    random = np.random.default_rng(4)
    noise = random.uniform(-1.0, 1.0, (100_000, 2))
    smooth = resample_poly(noise, 1, 3, axis=0) * np.hanning(33_334)[:, None]
    # The signs that the half-way filter adds up: 2.24 times the samples, and above a lone sample
    # that is more than twice as high.
    worst = np.zeros(40_000)
    worst[5_000] = 0.82
    worst[20_000:20_020] = 0.4 * np.array([1, -1] * 5 + [-1, 1] * 5)
    across = np.zeros(40_000)
    across[32_768 - 10 : 32_768 + 10] = 0.5 * np.array([-1, 1] * 5 + [1, -1] * 5)
    first, last = np.zeros(1000), np.zeros(1000)
    first[:2], last[-2:] = 0.5, 0.5
    return {
        "noise": 0.3 * noise,
        "smooth": 0.3 * smooth,
        "worst": worst,
        "across two pieces": across,
        "first": first,
        "last": last,
        "one": np.full(1, 0.25),
        "slow": 0.9 * np.sin(np.arange(70_001) / 90.0),
    }


@pytest.mark.parametrize("name", odd_sounds())
def test_the_short_cut_finds_what_oversampling_everything_finds(name: str) -> None:
    sound = odd_sounds()[name].astype(np.float32)
    assert true_peak_db(sound, RATE) == pytest.approx(oversampled_db(sound), abs=1e-9)


def test_the_highest_peak_may_stand_where_samples_are_low() -> None:
    sound = odd_sounds()["worst"].astype(np.float32)
    # 20 samples of 0.4 by the filter's absolute sum of 2.24.
    assert 10 ** (true_peak_db(sound, RATE) / 20) == pytest.approx(0.4 * 2.24, abs=0.01)


def test_peak_of_nothing() -> None:
    assert true_peak_db(np.zeros((0, 2), np.float32), RATE) == -math.inf
    assert true_peak_db(np.zeros((100, 2), np.float32), RATE) == -math.inf
