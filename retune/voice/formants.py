"""Formants of each vowel in each voice type.

Where the sung table has a vowel, its five formants are taken as they stand. The other vowels of
the chart are brought into a voice's own vowel space: a straight line in log frequency, fitted on
the five vowels that both tables have, carries the spoken F1 and F2 over; F3 to F5 and the
bandwidths follow F2 between the sung vowels, with the spoken F3 where that is lower, as in
rounded front vowels. `formants.json` names the sources.
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

import numpy as np
from numpy.typing import NDArray

from retune.score.model import VoiceType
from retune.voice.options import VOWELS

__all__ = ["VOWELS", "Formants", "formants"]

Floats = NDArray[np.float64]

_DATA: dict[str, Any] = json.loads(
    files("retune.voice").joinpath("formants.json").read_text("utf-8")
)

# The voice types that have rows of their own, and whose spoken vowels complete them.
_ROWS = {
    VoiceType.SOPRANO: "women",
    VoiceType.ALTO: "women",
    VoiceType.TENOR: "men",
    VoiceType.BASS: "men",
}
_BETWEEN = {
    VoiceType.MEZZO: (VoiceType.SOPRANO, VoiceType.ALTO),
    VoiceType.BARITONE: (VoiceType.TENOR, VoiceType.BASS),
}

CLEAR_OF_PITCH = 1.02
"""F1 lies at least this far above the fundamental (Sundberg 1975, from memory: F1 goes up with
the pitch; a little above it, our choice)."""

APART = 1.25
"""F2 lies at least this far above F1 where F1 was raised (our choice)."""


@dataclass(frozen=True, slots=True)
class Formants:
    """Resonances of a vowel: frequencies, ascending, and bandwidths, in Hz; five of each."""

    hz: tuple[float, ...]
    bandwidths: tuple[float, ...]

    def scaled(self, factor: float) -> Formants:
        """The same vowel in a vocal tract shorter by a factor."""
        return Formants(tuple(hz * factor for hz in self.hz), self.bandwidths)

    def raised(self, f0: float) -> Formants:
        """The same vowel sung at `f0` Hz: F1 never lies below the fundamental.

        F2 goes up with it, no higher than the second partial, as sopranos do (Henrich, Smith and
        Wolfe, JASA 129, 1024-1035, 2011).
        """
        first, second, *upper = self.hz
        raised = max(first, f0 * CLEAR_OF_PITCH)
        if raised == first:
            return self
        followed = min(second * raised / first, 2.0 * raised)
        hz = [raised, max(second, followed, raised * APART)]
        for value in upper:
            hz.append(max(value, hz[-1] * CLEAR_OF_PITCH))
        return Formants(tuple(hz), self.bandwidths)


@cache
def formants(voice_type: VoiceType, vowel: str) -> Formants:
    """The formants of a vowel, named as in `options.VOWELS`, in a voice type.

    >>> formants(VoiceType.TENOR, "a").hz
    (650.0, 1080.0, 2650.0, 2900.0, 3250.0)
    """
    if voice_type in _BETWEEN:
        low, high = _BETWEEN[voice_type]
        return _mixture([(formants(low, vowel), 0.5), (formants(high, vowel), 0.5)])
    mixture: Mapping[str, float] = _DATA["mixtures"].get(vowel, {})
    if mixture:
        return _mixture([(formants(voice_type, name), part) for name, part in mixture.items()])
    row = _DATA["sung"][voice_type].get(vowel)
    if row is not None:
        return Formants(_floats(row["hz"]), _floats(row["bandwidths"]))
    return _carried_over(voice_type, vowel)


def _floats(values: Sequence[float]) -> tuple[float, ...]:
    return tuple(float(value) for value in values)


def _mixture(shares: Sequence[tuple[Formants, float]]) -> Formants:
    """Vowels mixed in log frequency; the shares add up to 1."""

    def mixed(rows: Sequence[tuple[float, ...]]) -> tuple[float, ...]:
        return tuple(
            math.exp(sum(math.log(v) * share for v, (_, share) in zip(column, shares, strict=True)))
            for column in zip(*rows, strict=True)
        )

    return Formants(
        mixed([one.hz for one, _ in shares]), mixed([one.bandwidths for one, _ in shares])
    )


def _carried_over(voice_type: VoiceType, vowel: str) -> Formants:
    """A vowel that only the spoken table has, in the vowel space of a voice."""
    sung: dict[str, Any] = _DATA["sung"][voice_type]
    table: dict[str, Sequence[float]] = _DATA["spoken"][_ROWS[voice_type]]
    if vowel not in table:
        table = _DATA["spoken"]["men"]
    shared = sorted(sung, key=lambda name: float(sung[name]["hz"][1]))
    own = np.log([sung[name]["hz"] for name in shared])
    spoken = np.log([table[name] for name in shared])
    wanted = np.log(table[vowel])
    hz = [_on_line(spoken[:, place], own[:, place], wanted[place]) for place in (0, 1)]
    third, *upper = (_between(hz[1], own[:, 1], own[:, place]) for place in (2, 3, 4))
    hz += [max(min(third, float(wanted[2])), hz[1] + math.log(1.1)), *upper]
    widths = np.log([sung[name]["bandwidths"] for name in shared])
    return Formants(
        tuple(math.exp(value) for value in hz),
        tuple(math.exp(_between(hz[1], own[:, 1], widths[:, place])) for place in range(5)),
    )


def _on_line(x: Floats, y: Floats, wanted: float) -> float:
    """The value at `wanted` of the straight line through the points by least squares."""
    slope = float(np.sum((x - x.mean()) * (y - y.mean())) / np.sum((x - x.mean()) ** 2))
    return float(y.mean() + slope * (wanted - x.mean()))


def _between(wanted: float, x: Floats, y: Floats) -> float:
    return float(np.interp(wanted, x, y))
