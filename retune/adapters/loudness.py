"""Loudness and true peak by ITU-R BS.1770 (through pyloudnorm) and EBU R 128.

Conventions
-----------
* Samples are float32, shape (frames,) or (frames, channels); full scale is 1.
* Both measures go through a sound in pieces and need some 20 MB besides it, however long it is.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view
from numpy.typing import NDArray

_GATING_SECONDS, _GATING_STEP = 0.4, 0.1
"""Gating blocks of BS.1770: their length, and from one to the next."""

_WEIGHTING = "DeMan"
"""The filters of the library that have the coefficients of BS.1770 at 48 kHz; those it takes by
itself read 0.04 dB low at 997 Hz."""

_ABSOLUTE_GATE, _RELATIVE_GATE = -70.0, -10.0
_PIECE_SECONDS, _SETTLING_SECONDS = 20, 1
"""What is weighted at a time, and what is weighted before it so that the filters have settled:
their slowest pole (38 Hz, Q 0.5) has died away by more than 600 dB in one second."""

_TIMES = 4
_REACH = 10
"""Samples to each side that the oversampling filter takes in."""

_BLOCK = 64
_BLOCKS = 512
"""Samples a block, whose highest possible peak is bounded as one; blocks looked at together."""

Floats = NDArray[np.float64]


def integrated_lufs(samples: NDArray[np.float32], rate: int) -> float:
    """Integrated loudness in LUFS, gated as BS.1770-4 says; -inf where nothing passes the gate.

    A sound shorter than one gating block, 0.4 s, is measured with silence after it to that
    length: so it reads lower the shorter it is.
    """
    least = math.ceil(_GATING_SECONDS * rate) + 1
    if len(samples) < least:
        padding = ((0, least - len(samples)), *[(0, 0)] * (samples.ndim - 1))
        samples = np.pad(samples, padding)
    blocks = np.concatenate([*_gating_blocks(samples, rate)])
    power = 10.0 ** (blocks[blocks >= _ABSOLUTE_GATE] / 10.0)
    if not len(power):
        return -math.inf
    return _mean_db(power[power > 10.0 ** ((_mean_db(power) + _RELATIVE_GATE) / 10.0)])


def _mean_db(power: Floats) -> float:
    return 10.0 * math.log10(float(power.mean()))


def _gating_blocks(samples: NDArray[np.float32], rate: int) -> Iterator[Floats]:
    """Loudness of every gating block, piece by piece."""
    import warnings

    import pyloudnorm

    meter = pyloudnorm.Meter(rate, _WEIGHTING)
    settling = round(_SETTLING_SECONDS / _GATING_STEP)
    # The last gating block of a piece begins one step before the first of the next.
    overlap = round((_GATING_SECONDS - _GATING_STEP) * rate)
    for begin in range(0, max(len(samples) - overlap, 1), _PIECE_SECONDS * rate):
        first = max(begin - _SETTLING_SECONDS * rate, 0)
        piece = samples[first : begin + _PIECE_SECONDS * rate + overlap]
        with warnings.catch_warnings():
            # The logarithm of a silent block is meant to be minus infinity.
            warnings.simplefilter("ignore", RuntimeWarning)
            meter.integrated_loudness(piece)
        yield np.array(meter.blockwise_loudness)[settling if begin else 0 :]


def true_peak_db(samples: NDArray[np.float32], rate: int) -> float:
    """True peak in dB full scale (dBTP): the highest of four times as many samples (BS.1770-4,
    annex 2); -inf for silence.

    Only blocks that can hold the highest are oversampled; the result is the same.
    """
    columns = samples[:, None] if samples.ndim == 1 else samples
    if not len(columns):
        return -math.inf
    highest = 0.0
    size = _BLOCK * _BLOCKS
    for column in columns.T:
        loudest = max(int(column.argmax()), int(column.argmin()), key=lambda i: abs(column[i]))
        starts = [loudest // size * size, *range(0, len(column), size)]
        for begin in starts:
            highest = max(highest, _peak_above(_piece(column, begin, size), highest))
    return 20.0 * math.log10(highest) if highest else -math.inf


def _piece(column: NDArray[np.float32], begin: int, size: int) -> NDArray[np.float32]:
    """Samples `_REACH` to each side of a piece of whole blocks, silence beyond the ends."""
    first, last = begin - _REACH, begin + size + _REACH
    inside = column[max(first, 0) : last]
    missing = last - first - len(inside)
    before = max(-first, 0)
    return np.pad(inside, (before, missing - before)) if missing else np.ascontiguousarray(inside)


def _peak_above(piece: NDArray[np.float32], highest: float) -> float:
    """The true peak of those blocks that can pass `highest`; 0 where none can."""
    filters = _filters()
    windows = sliding_window_view(piece, _BLOCK + 2 * _REACH)[::_BLOCK]
    size = np.abs(piece)
    # Of every block its samples and the first of the next.
    near = size[_REACH : 1 - _REACH]
    samples = np.maximum(near[:-1], near[1:]).reshape(-1, _BLOCK).max(axis=1)
    curved = np.abs(np.diff(piece, 2))
    bends = sliding_window_view(curved, _BLOCK + 2 * _REACH - 2)[::_BLOCK].max(axis=1)
    bound = filters.for_samples * samples + filters.for_bends * bends
    able = windows[bound > highest].astype(np.float64)
    return float(np.abs(able @ filters.matrix).max(initial=0.0))


@dataclass(frozen=True, slots=True)
class _Filters:
    """The oversampling filter as a matrix from a block and its surroundings to finer samples, and
    a bound on what it can give.

    A finer sample lies between two samples; it is their linear interpolation, and a rest that is
    a weighted sum of second differences nearby. So it is at most `for_samples` times the larger
    sample plus `for_bends` times the largest second difference.
    """

    matrix: Floats
    for_samples: float
    for_bends: float


@cache
def _filters() -> _Filters:
    from scipy.signal import firwin

    half = _REACH * _TIMES
    # The filter that scipy.signal.resample_poly takes by itself.
    taps = _TIMES * firwin(2 * half + 1, 1.0 / _TIMES, window=("kaiser", 5.0))
    matrix = np.zeros((_BLOCK + 2 * _REACH, _BLOCK * _TIMES))
    for sample in range(len(matrix)):
        at = np.arange(_BLOCK * _TIMES) - _TIMES * (sample - _REACH) + half
        inside = (at >= 0) & (at < len(taps))
        matrix[sample, inside] = taps[at[inside]]
    for_samples, for_bends = 1.0, 0.0
    offsets = np.arange(-_REACH, _REACH + 1)
    for fine in range(_TIMES):
        rest = matrix[: len(offsets), fine].copy()
        rest[_REACH] -= 1.0 - fine / _TIMES
        rest[_REACH + 1] -= fine / _TIMES
        # Taken away too, so that the rest has neither sum nor moment, as second differences do.
        total, moment = float(rest.sum()), float((rest * offsets).sum())
        rest[_REACH] -= total - moment
        rest[_REACH + 1] -= moment
        for_samples = max(for_samples, 1.0 + abs(total) + 2.0 * abs(moment))
        for_bends = max(for_bends, float(np.abs(np.cumsum(np.cumsum(rest))).sum()))
    # Single precision rounds what is bounded.
    spare = 1.0 + 1e-5
    return _Filters(matrix, spare * for_samples, spare * for_bends)
