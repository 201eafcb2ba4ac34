"""The states of the analysis: twelve roots by ten qualities, and the degrees they give.

Conventions
-----------
* Roots and pitch classes inside the analysis are integers, C = 0 to B = 11.
* A state's number is 10 * root + place of its quality in `QUALITIES`.
* Degrees count 0 root, 1 third, 2 fifth, 3 seventh, 4 non-chord tone.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from retune.harmony.model import Degree, Quality

Floats = npt.NDArray[np.float64]
Singles = npt.NDArray[np.float32]
Ints = npt.NDArray[np.int64]
Bytes = npt.NDArray[np.int8]
Bools = npt.NDArray[np.bool_]

TONES: dict[Quality, tuple[int, ...]] = {
    Quality.MAJOR: (0, 4, 7),
    Quality.MINOR: (0, 3, 7),
    Quality.DIMINISHED: (0, 3, 6),
    Quality.AUGMENTED: (0, 4, 8),
    Quality.DOMINANT_SEVENTH: (0, 4, 7, 10),
    Quality.MAJOR_SEVENTH: (0, 4, 7, 11),
    Quality.MINOR_SEVENTH: (0, 3, 7, 10),
    Quality.HALF_DIMINISHED: (0, 3, 6, 10),
    Quality.DIMINISHED_SEVENTH: (0, 3, 6, 9),
    Quality.MINOR_MAJOR_SEVENTH: (0, 3, 7, 11),
}
"""Semitones above the root, in the order of `DEGREES`."""

QUALITIES: tuple[Quality, ...] = tuple(TONES)
DEGREES: tuple[Degree, ...] = (Degree.ROOT, Degree.THIRD, Degree.FIFTH, Degree.SEVENTH)
NON_CHORD = len(DEGREES)
ROOTS = 12
STATES = ROOTS * len(QUALITIES)

ROOT_OF = np.repeat(np.arange(ROOTS), len(QUALITIES))
"""Root of each state, shape (120,)."""
QUALITY_OF = np.tile(np.arange(len(QUALITIES)), ROOTS)
"""Place in `QUALITIES` of each state, shape (120,)."""


def _degrees() -> Ints:
    table = np.full((ROOTS, STATES), NON_CHORD)
    for state in range(STATES):
        for degree, interval in enumerate(TONES[QUALITIES[QUALITY_OF[state]]]):
            table[(ROOT_OF[state] + interval) % ROOTS, state] = degree
    return table


DEGREE_OF: Ints = _degrees()
"""Degree of each pitch class in each state, shape (12, 120)."""
