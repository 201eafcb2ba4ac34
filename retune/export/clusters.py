"""The best few tables for many chord tunings: weighted k-means with missing values.

Conventions
-----------
* `values` has a row a tuning and a column a pitch class, in cents; `weights` the same shape,
  0 where a value is missing (nan).
* The cost is the weighted sum of squared differences from each row's centre.

Method: seeds by merging the pair of groups that costs least (Ward 1963) where there are few
rows, by taking the row that costs most where there are many; then alternate assignment and
means (Lloyd 1982); then move single rows while that lowers the cost (Hartigan and Wong 1979).
Deterministic; the result is a local optimum, with the cost told.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_FEW = 400
_ROUNDS = 100


def best_groups(values: Floats, weights: Floats, count: int) -> Ints:
    """Split rows into at most `count` groups at the least cost found.

    Returns
    -------
    array of int, shape (rows,)
        Group of each row; groups are numbered from 0 and none is empty.
    """
    filled = np.where(weights > 0, values, 0.0)
    count = min(count, len(values))
    seeds = [_farthest(filled, weights, count)]
    if len(values) <= _FEW:
        seeds.append(_merged(filled, weights, count))
    found = [_improved(filled, weights, seed) for seed in seeds]
    best = min(found, key=lambda labels: _cost(filled, weights, labels))
    return np.unique(best, return_inverse=True)[1].astype(np.int64)


def centres(values: Floats, weights: Floats, labels: Ints) -> Floats:
    """Weighted mean of each group; nan where no row of the group has a value."""
    filled = np.where(weights > 0, values, 0.0)
    count = int(labels.max()) + 1 if len(labels) else 0
    total, summed = np.zeros((count, 12)), np.zeros((count, 12))
    np.add.at(total, labels, weights)
    np.add.at(summed, labels, weights * filled)
    return np.divide(summed, total, out=np.full_like(total, np.nan), where=total > 0)


def _cost(filled: Floats, weights: Floats, labels: Ints) -> float:
    there = np.nan_to_num(centres(filled, weights, labels))[labels]
    return float((weights * (filled - there) ** 2).sum())


def _costs(filled: Floats, weights: Floats, places: Floats) -> Floats:
    """What each row costs at each centre; shape (rows, centres)."""
    # A centre with no value for a tone takes it for nothing: it can be set freely.
    return np.stack(
        [np.nansum(weights * (filled - place) ** 2, axis=1) for place in places], axis=1
    )


def _improved(filled: Floats, weights: Floats, labels: Ints) -> Ints:
    for _ in range(_ROUNDS):
        before = _cost(filled, weights, labels)
        moved = _costs(filled, weights, centres(filled, weights, labels)).argmin(axis=1)
        moved = np.unique(moved, return_inverse=True)[1].astype(np.int64)
        if _cost(filled, weights, moved) >= before - 1e-12:
            break
        labels = moved
    return _exchanged(filled, weights, labels) if len(filled) <= _FEW else labels


def _exchanged(filled: Floats, weights: Floats, labels: Ints) -> Ints:
    """Move one row at a time to the group where it lowers the whole cost most."""
    labels = labels.copy()
    count = int(labels.max()) + 1
    total, summed = np.zeros((count, 12)), np.zeros((count, 12))
    np.add.at(total, labels, weights)
    np.add.at(summed, labels, weights * filled)
    for _ in range(_ROUNDS):
        moved = False
        for row, own in enumerate(labels.tolist()):
            w, x = weights[row], filled[row]
            total[own] -= w
            summed[own] -= w * x
            mean = np.divide(summed, total, out=np.zeros_like(total), where=total > 1e-12)
            # Joining a group of weight W at distance d costs w W / (w + W) d².
            joint = np.divide(w * total, w + total, out=np.zeros_like(total), where=total > 1e-12)
            costs = (joint * (x - mean) ** 2).sum(axis=1)
            best = int(costs.argmin())
            if costs[best] >= costs[own] - 1e-9:
                best = own
            moved |= best != own
            labels[row] = best
            total[best] += w
            summed[best] += w * x
        if not moved:
            break
    return labels


def _farthest(filled: Floats, weights: Floats, count: int) -> Ints:
    """Seeds: the heaviest row, then again and again the row its nearest centre fits worst."""
    chosen = [int(weights.sum(axis=1).argmax())]
    places = np.where(weights > 0, filled, np.nan)
    costs = [np.nansum(weights * (filled - places[chosen[0]]) ** 2, axis=1)]
    while len(chosen) < count:
        worst = int(np.min(costs, axis=0).argmax())
        chosen.append(worst)
        costs.append(np.nansum(weights * (filled - places[worst]) ** 2, axis=1))
    labels: Ints = np.argmin(costs, axis=0).astype(np.int64)
    return labels


def _merged(filled: Floats, weights: Floats, count: int) -> Ints:
    """Seeds: every row its own group, then merge the two groups that cost least."""
    total, mean = weights.copy(), filled.copy()
    members = [[row] for row in range(len(filled))]
    price = np.full((len(filled), len(filled)), np.inf)
    for row in range(len(filled)):
        price[row, :row] = _prices(total, mean, row)[:row]
    for _ in range(len(filled) - count):
        high, low = (int(place) for place in np.unravel_index(price.argmin(), price.shape))
        joint = total[low] + total[high]
        mean[low] = np.divide(
            total[low] * mean[low] + total[high] * mean[high],
            joint,
            out=np.zeros(12),
            where=joint > 0,
        )
        total[low] = joint
        members[low] += members[high]
        members[high] = []
        price[high, :] = price[:, high] = np.inf
        alive = np.array([bool(group) for group in members])
        new = np.where(alive, _prices(total, mean, low), np.inf)
        price[low, :low], price[low + 1 :, low] = new[:low], new[low + 1 :]
    labels = np.empty(len(filled), dtype=np.int64)
    for number, group in enumerate(group for group in members if group):
        labels[group] = number
    return labels


def _prices(total: Floats, mean: Floats, row: int) -> Floats:
    """What merging a group with each other one adds to the cost."""
    both = total + total[row]
    joint = np.divide(total * total[row], both, out=np.zeros_like(total), where=both > 0)
    prices: Floats = (joint * (mean - mean[row]) ** 2).sum(axis=1)
    return prices
