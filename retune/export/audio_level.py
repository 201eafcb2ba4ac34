"""Bringing a mix to its loudness, with bounded peaks and without a click at either end."""

from __future__ import annotations

import math

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view
from numpy.typing import NDArray

from retune.adapters.loudness import integrated_lufs, true_peak_db

PEAK_DB = -1.0
"""Highest true peak in dB (EBU R 128)."""

_FADE_IN, _FADE_OUT = 0.02, 0.05
_BLOCK = 64
_ATTEMPTS, _SPARE_DB = 4, 0.05
"""Limiting moves the peaks between samples a little; what it leaves is turned down as a whole."""

_REACH = 12
"""Blocks before and after a peak over which the gain moves: 17 ms at 44.1 kHz."""

Sound = NDArray[np.float32]


def levelled(sound: Sound, rate: int, lufs: float, sides: bool = False) -> Sound:
    """A mix, shape (frames, 2), at its loudness.

    Parameters
    ----------
    sound : ndarray
        Changed in place where that saves memory; use what is returned.
    lufs : float
        Integrated loudness to reach.
    sides : bool
        Bring left and right to the same loudness first.

    Returns
    -------
    ndarray
        True peak at most `PEAK_DB`. Where a loud place would pass it, the gain dips there for
        some milliseconds, so that all else stays at its loudness.
    """
    if sides:
        _balance(sound, rate)
    _fade(sound, rate)
    measured = integrated_lufs(sound, rate)
    if math.isfinite(measured):
        sound *= np.float32(10.0 ** ((lufs - measured) / 20.0))
    for _ in range(_ATTEMPTS):
        peak = true_peak_db(sound, rate)
        if peak <= PEAK_DB:
            return sound
        highest = max(float(sound.max()), -float(sound.min()))
        _limit(sound, highest * 10.0 ** ((PEAK_DB - _SPARE_DB - peak) / 20.0))
    sound *= np.float32(10.0 ** (min(PEAK_DB - true_peak_db(sound, rate), 0.0) / 20.0))
    return sound


def _balance(sound: Sound, rate: int) -> None:
    """The louder side is brought down to the other."""
    left, right = (integrated_lufs(np.ascontiguousarray(sound[:, side]), rate) for side in (0, 1))
    if math.isfinite(left) and math.isfinite(right):
        louder = 0 if left > right else 1
        sound[:, louder] *= np.float32(10.0 ** (-abs(left - right) / 20.0))


def _fade(sound: Sound, rate: int) -> None:
    for seconds, place in ((_FADE_IN, slice(None)), (_FADE_OUT, slice(None, None, -1))):
        frames = min(round(seconds * rate), len(sound))
        ramp = np.sin(0.5 * np.pi * np.arange(frames) / max(frames, 1)) ** 2
        sound[place][:frames] *= ramp[:, None].astype(np.float32)


def _limit(sound: Sound, ceiling: float) -> None:
    """Turn the gain down around peaks: smoothly, and so far that no sample passes the ceiling.

    A block's gain is the least that any block within reach needs; the mean of these over the
    same reach is smooth, and at no block above what that block needs.
    """
    blocks = -(-len(sound) // _BLOCK)
    padded = np.zeros(blocks * _BLOCK, np.float32)
    padded[: len(sound)] = np.abs(sound).max(axis=1)
    peaks = padded.reshape(blocks, _BLOCK).max(axis=1)
    needed = np.minimum(1.0, ceiling / np.maximum(peaks, 1e-9))
    window = 2 * _REACH + 1
    least = sliding_window_view(np.pad(needed, 2 * _REACH, mode="edge"), window).min(axis=1)
    smooth = sliding_window_view(least, window).mean(axis=1)
    at = (np.arange(blocks) + 0.5) * _BLOCK
    gain = np.interp(np.arange(len(sound)), at, smooth)
    sound *= gain[:, None].astype(np.float32)
