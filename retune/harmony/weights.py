"""The weights of the analysis: one data file, one table of terms.

Conventions
-----------
* A term is a vector of weights with a name for each place; what the file leaves out is 0.
* Weights are natural-log odds: adding 1 makes a reading e times as likely.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np

from retune.harmony.fragments import APPROACHES
from retune.harmony.states import DEGREES, QUALITIES, Floats

_CHORD = tuple(str(degree) for degree in DEGREES)
_LEVELS = tuple(str(level) for level in range(5))
_INTERVALS = tuple(str(interval) for interval in range(12))

TERMS: dict[str, tuple[str, ...]] = {
    "duration": _CHORD,
    "count": _CHORD,
    "nonchord_count": APPROACHES,
    "nonchord_duration": APPROACHES,
    "coverage": (*_CHORD, "non-chord"),
    "missing": _CHORD,
    "first_bass": (*_CHORD, "non-chord"),
    "last_bass": (*_CHORD, "non-chord"),
    "first_tones": (*_CHORD, "non-chord"),
    "last_tones": (*_CHORD, "non-chord"),
    "profile": _CHORD,
    "misspelt": ("quarter",),
    "chord_symbol": ("quarter",),
    "start_level": _LEVELS,
    "crossed_level": _LEVELS,
    "attack": ("share",),
    "quality": tuple(str(quality) for quality in QUALITIES),
    "motion": _INTERVALS,
    "motion_after_dominant": _INTERVALS,
    "motion_after_diminished": _INTERVALS,
}
"""Names of the weights in each term."""


@dataclass(frozen=True)
class Weights:
    """Weights by term; each vector is as long as its names in `TERMS`."""

    terms: dict[str, Floats]

    def __getitem__(self, term: str) -> Floats:
        return self.terms[term]


def weights_from(data: dict[str, dict[str, float]]) -> Weights:
    """Weights from names and values; raises KeyError for a name that no term has."""
    terms: dict[str, Floats] = {}
    for term, names in TERMS.items():
        vector = np.zeros(len(names))
        for name, value in data.get(term, {}).items():
            vector[names.index(name)] = value
        terms[term] = vector
    return Weights(terms)


@cache
def default_weights() -> Weights:
    """The weights that the package ships."""
    data = json.loads(files("retune.harmony").joinpath("weights.json").read_text("utf-8"))
    return weights_from({term: data[term] for term in TERMS if term in data})
