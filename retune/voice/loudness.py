"""How loud a tone is, and what dynamics do to it.

Loudness is by the K-weighting of ITU-R BS.1770: a shelf above 1.5 kHz and a high-pass at 38 Hz,
here as gains at the partials of a tone. Every tone is brought to the level that its velocity
asks for, so that neither vowel nor pitch makes a part jump.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

# BS.1770's two filters at 48 kHz, numerators and denominators (from memory; a test holds them
# against pyloudnorm).
_SHELF = ((1.53512485958697, -2.69169618940638, 1.19839281085285),
          (1.0, -1.69065929318241, 0.73248077421585))  # fmt: skip
_HIGH_PASS = ((1.0, -2.0, 1.0), (1.0, -1.99004745483398, 0.99007225036621))
_FILTER_RATE = 48_000.0
_OFFSET_DB = -0.691

REFERENCE_VELOCITY = 80
"""mezzo forte: gain 0 dB."""

DB_A_STEP = 0.22
"""dB a velocity step: 13 dB from pp (45) to ff (103) (our choice: a choir has more, but a
learning track must not jump)."""

MOST_DB, LEAST_DB = 6.0, -15.0


def weighting(hz: Floats) -> Floats:
    """Gain of the K-weighting at frequencies in Hz; shape as `hz`."""
    z = np.exp(-2j * np.pi * hz / _FILTER_RATE)
    gain = np.ones(np.shape(hz))
    for above, below in (_SHELF, _HIGH_PASS):
        gain *= np.abs(np.polyval(above[::-1], z) / np.polyval(below[::-1], z))
    return gain


def levelled(amplitudes: Floats, f0: float, level: float) -> Floats:
    """The same spectrum of a harmonic tone on `f0` Hz, brought to a loudness in LUFS.

    The loudness is what a meter shows for the steady tone on one channel.
    """
    at = f0 * np.arange(1, len(amplitudes) + 1, dtype=np.float64)
    power = 0.5 * float(np.sum((amplitudes * weighting(at)) ** 2))
    return np.asarray(
        amplitudes * 10.0 ** ((level - _OFFSET_DB) / 20.0) / np.sqrt(power), dtype=np.float64
    )


def gain_db(velocity: int) -> float:
    """Gain of a velocity, 1 to 127, against mezzo forte."""
    return min(max(DB_A_STEP * (velocity - REFERENCE_VELOCITY), LEAST_DB), MOST_DB)


def pulse_shape(velocity: int) -> float:
    """Rd of the glottal pulse at a velocity: louder voices close more sharply (our choice of
    values, in the range that Fant 1995 gives from pressed to breathy)."""
    return float(
        np.interp(velocity, (20, 45, 57, 69, 80, 90, 103), (2.2, 1.85, 1.65, 1.35, 1.1, 0.8, 0.7))
    )
