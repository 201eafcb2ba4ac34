"""The solve against published least-squares values and a general-purpose library."""

from __future__ import annotations

from fractions import Fraction
from itertools import combinations, pairwise

import numpy as np
import pytest
from scipy.linalg import solveh_banded
from scipy.optimize import minimize

from retune.tuning.rows import absolute
from retune.tuning.solve import SMALLEST_BLOCK, STIFF, Bounds, Normal, Rows, minimise
from retune.units import ratio_to_cents


def rows_of(rows: list[tuple[int, int, float, float]]) -> Rows:
    left, right, weight, target = (np.array(one) for one in zip(*rows, strict=True))
    return Rows(left.astype(int), right.astype(int), weight.astype(float), target.astype(float))


def solved(unknowns: int, rows: list[tuple[int, int, float, float]], ground: float) -> np.ndarray:
    """Least squares, with the mean drawn to 0 ever so weakly."""
    system = Normal(unknowns, SMALLEST_BLOCK)
    system.add(rows_of(rows))
    system.add(absolute(np.arange(unknowns), np.full(unknowns, ground), np.zeros(unknowns)))
    return system.solve()


def deviation(ratio: str, semitones: int) -> float:
    return ratio_to_cents(Fraction(ratio)) - 100 * semitones


# Stange, Wick and Hinrichsen 2018 (CMJ 42(3)), derived with equal weights and the mean at equal
# temperament: chord, pair targets, cents above the root, V = half the sum of squares.
C7 = (0, 4, 7, 10)
WORKED = [
    ((0, 4, 7), "5/4 3/2 6/5", (0, 386.314, 701.955), 0.0),
    ((0, 4, 8), "5/4 8/5 5/4", (0, 400, 800), 280.972),
    ((0, 3, 6, 9), "6/5 45/32 5/3 6/5 45/32 6/5", (0, 300, 595.112, 895.112), 537.088),
    ((0, 3, 6, 9), "6/5 7/5 5/3 6/5 7/5 6/5", (0, 300, 591.256, 891.256), 642.211),
    (C7, "5/4 3/2 9/5 6/5 45/32 6/5", (0, 396.578, 701.955, 1007.332), 421.457),
    (C7, "5/4 3/2 16/9 6/5 64/45 32/27", (0, 386.314, 701.955, 996.090), 0.0),
    (C7, "5/4 3/2 7/4 6/5 7/5 7/6", (0, 386.314, 701.955, 968.826), 0.0),
]


@pytest.mark.parametrize(("keys", "ratios", "wanted", "energy"), WORKED)
def test_worked_chords(
    keys: tuple[int, ...], ratios: str, wanted: tuple[float, ...], energy: float
) -> None:
    rows = [
        (low, high, 1.0, deviation(ratio, keys[high] - keys[low]))
        for (low, high), ratio in zip(
            combinations(range(len(keys)), 2), ratios.split(), strict=True
        )
    ]
    x = solved(len(keys), rows, 1e-9)
    assert x - x[0] + np.array(keys) * 100 == pytest.approx(np.array(wanted), abs=2e-3)
    assert (rows_of(rows).residuals(x) ** 2).sum() / 2 == pytest.approx(energy, abs=5e-3)
    assert x.mean() == pytest.approx(0.0, abs=1e-6)


def test_stacked_fifths_with_a_third() -> None:
    rows = [(i, i + 1, 1.0, deviation("3/2", 7)) for i in range(4)]
    rows.append((0, 4, 1.0, deviation("5/4", 4)))
    x = solved(5, rows, 1e-9)
    # Each fifth 697.654 (from 0, 697.654, 1395.307, 2092.961, 2790.615), V 46.252.
    assert np.diff(x) + 700 == pytest.approx(np.full(4, 697.654), abs=1e-3)
    assert (rows_of(rows).residuals(x) ** 2).sum() / 2 == pytest.approx(46.252, abs=1e-3)


def test_a_closed_loop_of_roots_finds_the_quarter_comma() -> None:
    # C A D G C: each of four links takes 21.506 / 4 = 5.377, the fifth becomes 696.578; V 57.815.
    links = [("5/3", 9), ("4/3", 5), ("4/3", 5), ("4/3", 5)]
    rows = [
        (i, (i + 1) % 4, 1.0, deviation(ratio, semitones))
        for i, (ratio, semitones) in enumerate(links)
    ]
    x = solved(4, rows, 1e-9)
    missed = rows_of(rows).residuals(x)
    assert np.abs(missed) == pytest.approx(np.full(4, 5.377), abs=5e-4)
    assert (missed**2).sum() / 2 == pytest.approx(57.815, abs=1e-3)


@pytest.mark.parametrize(("unknowns", "reach"), [(3, 2), (7, 3), (64, 8), (333, 5), (500, 30)])
def test_against_banded_cholesky(unknowns: int, reach: int) -> None:
    random = np.random.default_rng(unknowns)
    left = random.integers(0, unknowns, 6 * unknowns)
    right = np.minimum(left + random.integers(1, reach + 1, 6 * unknowns), unknowns - 1)
    kept = left != right
    rows = Rows(
        left[kept],
        right[kept],
        random.uniform(0.01, 5, kept.sum()),
        random.normal(0, 20, kept.sum()),
    )
    ground = absolute(np.arange(unknowns), np.full(unknowns, 1e-3), random.normal(0, 5, unknowns))
    system = Normal(unknowns, max(SMALLEST_BLOCK, reach))
    matrix, rhs = np.zeros((unknowns, unknowns)), np.zeros(unknowns)
    for part in (rows, ground):
        system.add(part)
        for a, b, weight, target in zip(
            part.left, part.right, part.weight, part.target, strict=True
        ):
            row = np.zeros(unknowns)
            row[b] = 1.0
            if a >= 0:
                row[a] = -1.0
            matrix += weight * np.outer(row, row)
            rhs += weight * target * row
    banded = np.zeros((reach + 1, unknowns))
    for offset in range(min(reach + 1, unknowns)):
        banded[offset, : unknowns - offset] = np.diagonal(matrix, -offset)
    assert system.solve() == pytest.approx(solveh_banded(banded, rhs, lower=True), abs=1e-8)
    x = random.normal(0, 10, unknowns)
    assert system.cost(x) == pytest.approx(x @ matrix @ x - 2 * rhs @ x, rel=1e-9)


def test_bounds_against_a_constrained_minimiser() -> None:
    # A chain pulled apart by 30 cents at every link, no link longer than 4.9.
    count, cap = 6, 4.9
    pulled = absolute(np.arange(count), np.linspace(1, 2, count), 30.0 * np.arange(count))
    base = Normal(count, SMALLEST_BLOCK)
    base.add(pulled)
    links = Rows(
        np.arange(count - 1), np.arange(1, count), np.full(count - 1, STIFF), np.zeros(count - 1)
    )
    x = minimise(base, [Bounds(links, np.full(count - 1, cap))], np.zeros(count))
    found = minimize(
        lambda y: float(pulled.weight @ pulled.residuals(y) ** 2),
        np.zeros(count),
        method="SLSQP",
        constraints=[
            {"type": "ineq", "fun": lambda y, i=i, s=s: cap - s * (y[i + 1] - y[i])}
            for i in range(count - 1)
            for s in (1.0, -1.0)
        ],
        options={"ftol": 1e-12, "maxiter": 500},
    )
    assert x == pytest.approx(found.x, abs=0.02)
    assert max(abs(b - a) for a, b in pairwise(x)) == pytest.approx(cap, abs=0.002)
