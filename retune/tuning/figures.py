"""The figures of a run, from the tuned pitches alone.

Conventions
-----------
* Cents throughout; means and squares of sounding pairs are weighted by their length in quarters.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from retune.harmony.model import Harmony
from retune.pitch import PitchClass
from retune.score.model import Score
from retune.tuning.ground import Ground
from retune.tuning.intervals import (
    CONSONANT,
    Floats,
    consonances,
    each_within,
    nearest,
    nearest_directed,
    steps,
)
from retune.tuning.layout import Layout
from retune.tuning.rows import sounding_pairs
from retune.tuning.targets import Targets

_PLACES = 6
_LARGE = 5.0
"""Cents; held shifts and repeated notes that miss by more are counted."""


@dataclass
class _Spread:
    """Weighted mean and root mean square, gathered piece by piece."""

    weight: float = 0.0
    total: float = 0.0
    squares: float = 0.0
    within: float = 0.0

    def add(self, missed: Floats, weight: Floats) -> None:
        self.weight += float(weight.sum())
        self.total += float(weight @ missed)
        self.squares += float(weight @ missed**2)
        self.within += float(weight @ (missed <= 1.0))

    @property
    def mean(self) -> float:
        return self.total / self.weight if self.weight else 0.0

    @property
    def rms(self) -> float:
        return float((self.squares / self.weight) ** 0.5) if self.weight else 0.0

    @property
    def share_within(self) -> float:
        return self.within / self.weight if self.weight else 1.0


def all_figures(
    score: Score,
    harmony: Harmony,
    layout: Layout,
    targets: Targets,
    x: Floats,
    ground: Ground,
    tonic: PitchClass,
    roots: tuple[float | None, ...],
) -> dict[str, dict[str, Any]]:
    """Purity, held shift, melody and drift, as the note list holds them."""
    return {
        "purity": _rounded(purity(layout, targets, x, ground)),
        "held_shift": _rounded(held_shift(score, harmony, layout, x)),
        "melody": _rounded(melody(layout, x, ground)),
        "drift": _rounded(drift(score, harmony, tonic, roots)),
    }


def _rounded(figures: dict[str, Any]) -> dict[str, Any]:
    """The same figures, floats to six decimals and without a negative zero."""
    return {
        name: round(value, _PLACES) + 0.0 if isinstance(value, float) else value
        for name, value in figures.items()
    }


def purity(layout: Layout, targets: Targets, x: Floats, ground: Ground) -> dict[str, float]:
    """How far consonant pairs of the voices lie from pure, beside equal temperament.

    Triads are pairs of chord tones in major and minor triads.
    """
    limits = ground.limit[layout.chord]
    pairs, triads, equal, equal_triads = _Spread(), _Spread(), _Spread(), _Spread()
    for left, right, quarters in sounding_pairs(layout):
        apart = (layout.key[right] - layout.key[left]) % 12
        used = CONSONANT[apart]
        left, right, apart, weight = left[used], right[used], apart[used], quarters[used]
        cents = x[right] - x[left]
        limit = limits[right]
        missed = np.abs(cents - each_within(consonances, limit, nearest, apart, cents))
        zeros = np.zeros(len(apart))
        level = np.abs(each_within(consonances, limit, nearest, apart, zeros))
        both = targets.triad[left] & targets.triad[right]
        inside = targets.tone[left] & targets.tone[right] & both
        for every, triad, values in ((pairs, triads, missed), (equal, equal_triads, level)):
            every.add(values, weight)
            triad.add(values[inside], weight[inside])
    return {
        "mean_cents": pairs.mean,
        "rms_cents": pairs.rms,
        "triad_mean_cents": triads.mean,
        "triad_rms_cents": triads.rms,
        "triad_time_within_1_cent": triads.share_within,
        "equal_temperament_mean_cents": equal.mean,
        "equal_temperament_rms_cents": equal.rms,
        "equal_temperament_triad_mean_cents": equal_triads.mean,
        "equal_temperament_triad_rms_cents": equal_triads.rms,
        "equal_temperament_triad_time_within_1_cent": equal_triads.share_within,
    }


def held_shift(score: Score, harmony: Harmony, layout: Layout, x: Floats) -> dict[str, Any]:
    """How far sounding notes of the voices move where a chord or piece changes."""
    links = layout.held[layout.tuned[layout.held[:, 0]]]
    moved = np.abs(x[links[:, 1]] - x[links[:, 0]])
    greatest = int(moved.argmax()) if len(moved) else None
    return {
        "mean_cents": float(moved.mean()) if len(moved) else 0.0,
        "greatest_cents": float(moved.max(initial=0.0)),
        "over_5_cents": int((moved > _LARGE).sum()),
        "held_notes": len(moved),
        "bar": None
        if greatest is None
        else _bar(score, harmony, int(layout.first[links[greatest, 1]])),
    }


def melody(layout: Layout, x: Floats, ground: Ground) -> dict[str, Any]:
    """How far the voices' steps and leaps lie from just ones, and repeated notes from equal."""
    links = layout.melodic[layout.tuned[layout.melodic[:, 0]]]
    left, right = links.T
    apart = layout.key[right] - layout.key[left]
    cents = x[right] - x[left]
    again = apart == 0
    limit = ground.limit[layout.chord[right]]
    size = each_within(steps, limit, nearest_directed, apart, cents)
    missed = np.abs(cents - size)[~again]
    repeated = np.abs(cents[again])
    return {
        "mean_cents": float(missed.mean()) if len(missed) else 0.0,
        "over_10_cents": float((missed > 10.0).mean()) if len(missed) else 0.0,
        "repeated_over_5_cents": float((repeated > _LARGE).mean()) if len(repeated) else 0.0,
    }


def drift(
    score: Score, harmony: Harmony, tonic: PitchClass, roots: tuple[float | None, ...]
) -> dict[str, Any]:
    """Movement of the home tonic: the roots of its chords against the first of them."""
    known = [
        (chord.index, cents)
        for chord, cents in zip(harmony.chords, roots, strict=True)
        if chord.root == tonic and cents is not None
    ]
    moved = [(abs(cents - known[0][1]), cents - known[0][1], index) for index, cents in known]
    size, signed, where = max(moved, default=(0.0, 0.0, -1), key=lambda one: one[0])
    return {
        "greatest_cents": signed if size else 0.0,
        "final_cents": moved[-1][1] if moved else 0.0,
        "bar": _bar(score, harmony, harmony.chords[where].first) if where >= 0 else None,
        "tonic_chords": len(known),
    }


def _bar(score: Score, harmony: Harmony, slice_index: int) -> str:
    return score.bar_at(harmony.slices[slice_index].onset).number
