"""Where the home tonic lies through the piece, where pure steps would take it, and how pure each
bar is.
"""

from __future__ import annotations

from itertools import combinations
from typing import Any

import numpy as np

from retune.tuning.home import home_tonic, tonic_path
from retune.tuning.intervals import CONSONANT, consonances, nearest
from retune.tuning.model import TunedScore


def drift_data(tuned: TunedScore, follow: TunedScore) -> dict[str, Any]:
    """Both paths as [second, cents] and the purity of each bar as [here, equal] in cents."""
    return {
        "tonic": home_tonic(tuned).name,
        "here": _path(tuned),
        "follow": _path(follow),
        "purity": purity_by_bar(tuned),
    }


def _path(tuned: TunedScore) -> list[list[float]]:
    return [
        [round(tuned.seconds(onset), 3), round(cents, 2) + 0.0]
        for onset, cents in tonic_path(tuned)
    ]


def purity_by_bar(tuned: TunedScore) -> list[list[float] | None]:
    """For each bar the mean distance of consonant pairs of voices from just, weighted by time:
    [here, in equal temperament] in cents; None where no two voices sound a consonance.
    """
    score = tuned.score
    bar_of: list[int] = []
    keys: list[tuple[int, int]] = []
    cents: list[float] = []
    weights: list[float] = []
    for one in tuned.harmony.slices:
        sounding = [
            (tuned.notes[index].note.pitch.key, _cents_at(tuned, index, one.onset))
            for index in one.notes
            if score.parts[tuned.notes[index].note.part].tuned
        ]
        for (low, low_cents), (high, high_cents) in combinations(sorted(sounding), 2):
            bar_of.append(score.bar_at(one.onset).index)
            keys.append((low, high))
            cents.append(high_cents - low_cents)
            weights.append(float(one.duration))
    return _means(tuned, bar_of, keys, cents, weights)


def _cents_at(tuned: TunedScore, note: int, onset: Any) -> float:
    segments = tuned.notes[note].segments
    return next((s for s in segments if s.onset <= onset < s.end), segments[-1]).cents


def _means(
    tuned: TunedScore,
    bar_of: list[int],
    keys: list[tuple[int, int]],
    cents: list[float],
    weights: list[float],
) -> list[list[float] | None]:
    count = len(tuned.score.bars)
    if not keys:
        return [None] * count
    pairs = np.array(keys)
    apart = (pairs[:, 1] - pairs[:, 0]) % 12
    used = CONSONANT[apart]
    bars, apart = np.array(bar_of)[used], apart[used]
    found, weight = np.array(cents)[used], np.array(weights)[used]
    table = consonances(tuned.policy.prime_limit)
    total = np.bincount(bars, weight, minlength=count)
    columns = []
    for values in (found, np.zeros(len(found))):
        missed = np.abs(values - nearest(table, apart, values))
        columns.append(np.bincount(bars, weight * missed, minlength=count))
    return [
        [round(float(column[bar] / total[bar]), 2) for column in columns] if total[bar] else None
        for bar in range(count)
    ]
