"""The spectrum of a sung tone: glottal source times vocal tract.

G. Fant, *Acoustic Theory of Speech Production* (1960), quoted from memory: the tract is a cascade
of resonances, whose levels follow from their frequencies and bandwidths; a correction stands for
the poles above the fifth. The flow derivative as source has the radiation at the lips in it.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from retune.voice.formants import Formants
from retune.voice.glottis import harmonics

Floats = NDArray[np.float64]

HIGHEST_HZ = 10_000.0
"""Partials above this are left out, so that nothing can alias."""

TUBE_HZ = 500.0
"""First resonance of the uniform tube that the higher poles are taken from (men, 17.5 cm)."""

_REACH = 9.0
"""Up to how many times `TUBE_HZ` the correction's series holds; its value there holds above."""


def transfer(hz: Floats, formants: Formants) -> Floats:
    """Gain of the vocal tract at frequencies in Hz, 1 at 0 Hz; shape as `hz`."""
    hz = np.asarray(hz, dtype=np.float64)
    gain = np.ones_like(hz)
    for centre, width in zip(formants.hz, formants.bandwidths, strict=True):
        half = (0.5 * width) ** 2
        below = (hz - centre) ** 2 + half
        above = (hz + centre) ** 2 + half
        gain *= (centre**2 + half) / np.sqrt(below * above)
    x = np.minimum(hz / TUBE_HZ, _REACH)
    # The two terms are sums over the poles from the sixth on, in dB.
    return np.asarray(gain * 10.0 ** ((0.433 * x**2 + 0.0007 * x**4) / 20.0), dtype=np.float64)


def spectrum(f0: float, formants: Formants, rd: float) -> Floats:
    """Amplitudes of the harmonics of a sung tone, from the fundamental up to `HIGHEST_HZ`.

    Parameters
    ----------
    f0 : float
        Fundamental in Hz; F1 is raised to it where it would lie below.
    formants : Formants
    rd : float
        Shape of the glottal pulse, 0.3 (pressed) to 2.7 (breathy).

    Returns
    -------
    array of float, shape (n,)
        Linear, on no absolute scale.
    """
    count = max(int(HIGHEST_HZ / f0), 1)
    at = f0 * np.arange(1, count + 1, dtype=np.float64)
    return harmonics(rd, count) * transfer(at, formants.raised(f0))
