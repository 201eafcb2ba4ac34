"""The best few tables against the best of all splits, tried one by one."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from retune.export.clusters import best_groups, centres


def cost(values: np.ndarray, weights: np.ndarray, labels: np.ndarray) -> float:
    """Weighted squares about the means, group by group."""
    total = 0.0
    for group in set(labels.tolist()):
        for column in range(values.shape[1]):
            w = weights[labels == group, column]
            if w.sum() > 0:
                x = np.where(w > 0, values[labels == group, column], 0.0)
                total += float((w * (x - (w * x).sum() / w.sum()) ** 2).sum())
    return total


def least(values: np.ndarray, weights: np.ndarray, count: int) -> float:
    """The least cost over every split into at most `count` groups."""
    return min(
        cost(values, weights, np.array(labels))
        for labels in itertools.product(range(count), repeat=len(values))
    )


def tunings(seed: int, rows: int) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    weights = np.where(rng.random((rows, 12)) < 0.4, rng.uniform(0.2, 3.0, (rows, 12)), 0.0)
    weights[:, 0] = 1.0
    values = np.where(weights > 0, rng.normal(0, 12, (rows, 12)), np.nan)
    return values, weights


@pytest.mark.parametrize("count", [1, 2, 3])
def test_small_problems_are_solved_as_well_as_by_trying_everything(count: int) -> None:
    found, best = [], []
    for seed in range(12):
        values, weights = tunings(seed, 6)
        labels = best_groups(values, weights, count)
        assert set(labels.tolist()) <= set(range(count))
        found.append(cost(values, weights, labels))
        best.append(least(values, weights, count))
    # A local optimum may miss the best one; here it rarely does, and never by much.
    hits = sum(one <= other * (1 + 1e-9) + 1e-9 for one, other in zip(found, best, strict=True))
    assert hits >= 9
    assert sum(found) <= sum(best) * 1.05


def test_clear_groups_are_found_among_many() -> None:
    rng = np.random.default_rng(5)
    truth = np.repeat(np.arange(6), 100)
    places = rng.normal(0, 20, (6, 12))
    values = places[truth] + rng.normal(0, 0.3, (600, 12))
    labels = best_groups(values, np.ones((600, 12)), 6)
    assert len({(a, b) for a, b in zip(truth.tolist(), labels.tolist(), strict=True)}) == 6
    assert np.abs(centres(values, np.ones((600, 12)), labels)).max() < 80


def test_the_same_input_gives_the_same_groups() -> None:
    values, weights = tunings(3, 40)
    assert (best_groups(values, weights, 5) == best_groups(values, weights, 5)).all()


def test_as_many_groups_as_rows() -> None:
    values, weights = tunings(4, 5)
    assert len(set(best_groups(values, weights, 9).tolist())) == 5
