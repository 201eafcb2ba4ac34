"""Roughness of a chord by the published curve.

Two partials are rough where they are about a quarter of a critical band apart (R. Plomp and
W. J. M. Levelt, JASA 38, 548-560, 1965). The curve is that of W. A. Sethares, "Local consonance
and the relationship between timbre and scale", JASA 94, 1218-1228 (1993), with the constants and
the minimum of the two amplitudes of his program; the roughness of a chord is the sum over all
pairs of its partials (handbook, voice.md 3.2 and methods.md 1c).

Conventions
-----------
* The figure has no unit: it compares chords of the same tones, and no more. It knows nothing of
  listeners, rooms or vowels.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

PARTIALS, FALL = 6, 0.88
"""Each tone has six partials, each of 0.88 times the amplitude of the one below (Sethares 1993,
from memory; the handbook's figures are of these)."""

_SCALE, _SLOPE, _LEAST = 0.24, 0.0207, 18.96
_RISE, _DECAY, _HEIGHT = -3.51, -5.75, 5.0

Floats = NDArray[np.float64]


def roughness(fundamentals: Sequence[float], partials: int = PARTIALS, fall: float = FALL) -> float:
    """Roughness of tones that sound together, that within each of them included.

    Parameters
    ----------
    fundamentals : sequence of float
        Hz.
    partials : int
        How many each tone has.
    fall : float
        Amplitude of each partial as a share of the one below; the first has 1.

    >>> hz = [261.6256 * ratio for ratio in (1, 5 / 4, 3 / 2)]
    >>> round(roughness(hz), 4)
    3.7048
    """
    number = np.arange(1, partials + 1, dtype=np.float64)
    hz = np.outer(np.asarray(fundamentals, dtype=np.float64), number).ravel()
    amplitudes = np.tile(fall ** (number - 1.0), len(fundamentals))
    low, high = np.triu_indices(len(hz), 1)
    return float(np.sum(_of_pairs(hz[low], hz[high], amplitudes[low], amplitudes[high])))


def _of_pairs(first: Floats, second: Floats, a: Floats, b: Floats) -> Floats:
    """Roughness of pairs of pure tones: frequencies in Hz and amplitudes, all of one shape."""
    apart = np.abs(second - first) * _SCALE / (_SLOPE * np.minimum(first, second) + _LEAST)
    curve: Floats = _HEIGHT * (np.exp(_RISE * apart) - np.exp(_DECAY * apart))
    return np.minimum(a, b) * curve


def curve(first: float, second: float) -> float:
    """Roughness of two pure tones of equal amplitude 1, in Hz."""
    one = np.ones(1)
    return float(_of_pairs(np.array([first]), np.array([second]), one, one)[0])
