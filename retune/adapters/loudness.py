"""Loudness and true peak by ITU-R BS.1770 (through pyloudnorm) and EBU R 128.

Conventions
-----------
* Samples are float32, shape (frames,) or (frames, channels); full scale is 1.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

_LEAST_SECONDS = 0.4
"""One gating block of BS.1770; a shorter sound is measured with silence after it."""

_OVERSAMPLING = 4
_BLOCK = 4096
_EDGE = 64
_HEADROOM = 2.0
"""How much higher the true peak of a block can be than its samples: a sine at a quarter of the
sample rate reaches 1.41 times, and no choir holds more near half of it."""


def integrated_lufs(samples: NDArray[np.float32], rate: int) -> float:
    """Integrated loudness in LUFS, gated as BS.1770-4 says; -inf for silence."""
    import warnings

    import pyloudnorm

    least = math.ceil(_LEAST_SECONDS * rate) + 1
    if len(samples) < least:
        padding = ((0, least - len(samples)), *[(0, 0)] * (samples.ndim - 1))
        samples = np.pad(samples, padding)
    with warnings.catch_warnings():
        # The logarithm of a silent block is meant to be minus infinity.
        warnings.simplefilter("ignore", RuntimeWarning)
        return float(pyloudnorm.Meter(rate).integrated_loudness(samples))


def true_peak_db(samples: NDArray[np.float32], rate: int) -> float:
    """True peak in dB full scale (dBTP): the highest of four times as many samples (BS.1770-4,
    annex 2); -inf for silence.

    Only blocks whose samples come near the highest are oversampled.
    """
    from scipy.signal import resample_poly

    columns = samples[:, None] if samples.ndim == 1 else samples
    if not len(columns):
        return -math.inf
    highest = 0.0
    for column in columns.T:
        blocks = _block_peaks(column)
        for index in np.argsort(blocks)[::-1]:
            if blocks[index] * _HEADROOM <= highest or blocks[index] == 0.0:
                break
            begin = max(int(index) * _BLOCK - _EDGE, 0)
            end = (int(index) + 1) * _BLOCK + _EDGE
            finer = resample_poly(column[begin:end].astype(np.float64), _OVERSAMPLING, 1)
            own = finer[_OVERSAMPLING * (int(index) * _BLOCK - begin) :][: _OVERSAMPLING * _BLOCK]
            highest = max(highest, float(np.abs(own).max()))
    return 20.0 * math.log10(highest) if highest else -math.inf


def _block_peaks(column: NDArray[np.float32]) -> NDArray[np.float32]:
    starts = np.arange(0, len(column), _BLOCK)
    high = np.maximum.reduceat(column, starts)
    low = np.minimum.reduceat(column, starts)
    return np.maximum(high, -low)
