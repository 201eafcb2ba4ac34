"""One period of a tone as a table, and reading it at any phase.

A table is made from its partials, so that nothing above the highest of them exists; straight
lines between its entries are exact to about (2 pi n / TABLE_SIZE)^2 / 12 of partial n.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Samples = NDArray[np.float32]

TABLE_SIZE = 16_384
_MASK = TABLE_SIZE - 1


@dataclass(frozen=True, slots=True)
class Table:
    """One period: the values and the step from each to the next, shape (TABLE_SIZE,)."""

    values: Samples
    steps: Samples

    @classmethod
    def of(cls, amplitudes: Floats) -> Table:
        """The period with these amplitudes of partials 1, 2, 3 and so on.

        Partial n has the phase pi n^2 / 10 in all tables, so that tones cross-fade without a
        partial being cancelled. Quadratic phases keep peaks low (M. R. Schroeder, IEEE Trans.
        Inf. Theory 16, 85-89, 1970, from memory); the 10 was best for sung vowels.
        """
        bins = np.zeros(TABLE_SIZE // 2 + 1, dtype=np.complex128)
        number = np.arange(1, len(amplitudes) + 1)
        bins[1 : len(amplitudes) + 1] = amplitudes * np.exp(0.1j * np.pi * number**2)
        values = np.fft.irfft(bins, TABLE_SIZE) * (TABLE_SIZE / 2)
        return cls(values.astype(np.float32), (np.roll(values, -1) - values).astype(np.float32))

    def read(self, phase: Floats) -> Samples:
        """The tone at phases in periods, each >= 0; shape as `phase`."""
        place = phase * TABLE_SIZE
        whole = place.astype(np.int64)
        place -= whole
        whole &= _MASK
        read = self.steps.take(whole)
        read *= place.astype(np.float32)
        read += self.values.take(whole)
        return read
