"""The banded solve: weighted least squares with bounds on chosen differences.

Conventions
-----------
* Unknowns are cents; a row asks x[right] - x[left] = target, or x[right] = target where `left`
  is -1, and costs weight * residual**2.
* Rows reach no further than the band, so the normal equations are block tridiagonal; they are
  solved by block cyclic reduction, O(n * band**2) in time, exact like any Cholesky solve.
* A bound is a hinge, stiff * max(|x[right] - x[left] - target| - bound, 0)**2, found by a
  semismooth Newton method with a line search on a convex, piecewise quadratic cost.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from retune.tuning.intervals import Flags, Floats, Ints

STIFF = 1e5
"""Weight of a hinge; it leaves under 0.001 cents to the exact cap that follows the solve."""

_STEPS = 40
_HALVINGS = 12
SMALLEST_BLOCK = 8


@dataclass(frozen=True)
class Rows:
    """Rows of one kind; four arrays of one length."""

    left: Ints
    right: Ints
    weight: Floats
    target: Floats

    def residuals(self, x: Floats) -> Floats:
        """What each row misses its target by, in cents."""
        base = np.where(self.left >= 0, x[self.left], 0.0)
        missed: Floats = x[self.right] - base - self.target
        return missed

    def only(self, chosen: Flags, target: Floats) -> Rows:
        """The chosen rows with other targets."""
        return Rows(self.left[chosen], self.right[chosen], self.weight[chosen], target[chosen])


@dataclass(frozen=True)
class Bounds:
    """Rows whose residual may not leave -bound to bound; `rows.weight` is the stiffness."""

    rows: Rows
    bound: Floats

    def excess(self, x: Floats) -> Floats:
        """How far each residual lies outside its bound, with its sign."""
        missed = self.rows.residuals(x)
        outside: Floats = np.sign(missed) * np.maximum(np.abs(missed) - self.bound, 0.0)
        return outside


class Normal:
    """Normal equations in blocks: the diagonal blocks, those to the right, the right-hand side."""

    def __init__(self, unknowns: int, block: int) -> None:
        self.unknowns, self.block = unknowns, block
        self.count = max(-(-unknowns // block), 1)
        self.diagonal = np.zeros((self.count, block, block))
        self.upper = np.zeros((self.count, block, block))
        self.rhs = np.zeros((self.count, block))
        # Unknowns that only fill the last block stand alone at zero.
        spare = np.arange(unknowns, self.count * block)
        self._add(self.diagonal, spare, spare, np.ones(len(spare)))

    def _add(self, blocks: Floats, row: Ints, column: Ints, values: Floats) -> None:
        size = self.block
        flat = ((row // size) * size + row % size) * size + column % size
        np.add.at(blocks.reshape(-1), flat, values)

    def add(self, rows: Rows) -> None:
        """Add weighted rows."""
        pair = rows.left >= 0
        weight, pull = rows.weight, rows.weight * rows.target
        self._add(self.diagonal, rows.right, rows.right, weight)
        rhs = self.rhs.reshape(-1)
        np.add.at(rhs, rows.right, pull)
        left, right, weight = rows.left[pair], rows.right[pair], weight[pair]
        self._add(self.diagonal, left, left, weight)
        np.add.at(rhs, left, -pull[pair])
        low, high = np.minimum(left, right), np.maximum(left, right)
        near = low // self.block == high // self.block
        self._add(self.diagonal, low[near], high[near], -weight[near])
        self._add(self.diagonal, high[near], low[near], -weight[near])
        self._add(self.upper, low[~near], high[~near], -weight[~near])

    def cost(self, x: Floats) -> float:
        """The weighted squares at x, but for a constant."""
        full = np.zeros(self.rhs.shape)
        full.reshape(-1)[: self.unknowns] = x
        own = np.einsum("bi,bij,bj->", full, self.diagonal, full, optimize=True)
        next_ = np.einsum("bi,bij,bj->", full[:-1], self.upper[:-1], full[1:], optimize=True)
        return float(own + 2.0 * next_ - 2.0 * np.sum(self.rhs * full))

    def copy(self) -> Normal:
        """A copy to which more rows may be added."""
        twin = Normal.__new__(Normal)
        twin.unknowns, twin.block, twin.count = self.unknowns, self.block, self.count
        twin.diagonal, twin.upper = self.diagonal.copy(), self.upper.copy()
        twin.rhs = self.rhs.copy()
        return twin

    def solve(self) -> Floats:
        """The minimiser, shape (unknowns,)."""
        x = _reduced(self.diagonal, self.upper[:-1], self.rhs[..., None])
        return x.reshape(-1)[: self.unknowns]


def _reduced(diagonal: Floats, upper: Floats, rhs: Floats) -> Floats:
    """Solve a symmetric block tridiagonal system by cyclic reduction.

    Every second block is eliminated at once; each step is a Schur complement of a positive
    definite matrix, so no pivoting between blocks is needed.

    Parameters
    ----------
    diagonal : ndarray, shape (n, m, m)
    upper : ndarray, shape (n - 1, m, m)
        Block i couples block i to block i + 1; the lower ones are its transposes.
    rhs : ndarray, shape (n, m, 1)
    """
    count, size = rhs.shape[:2]
    if count == 1:
        return np.linalg.solve(diagonal, rhs).astype(np.float64)
    before = upper[0::2]  # even i to odd i + 1
    after = upper[1::2]  # odd i to even i + 1
    odd = count // 2
    known = np.zeros((odd, size, 2 * size + 1))
    known[:, :, :size] = before.transpose(0, 2, 1)
    known[: len(after), :, size : 2 * size] = after
    known[:, :, 2 * size :] = rhs[1::2]
    known = np.linalg.solve(diagonal[1::2], known)
    to_left, to_right = known[:, :, :size], known[: len(after), :, size : 2 * size]
    own = known[:, :, 2 * size :]

    kept, kept_rhs = diagonal[0::2].copy(), rhs[0::2].copy()
    kept[:odd] -= before @ to_left
    kept_rhs[:odd] -= before @ own
    turned = after.transpose(0, 2, 1)
    kept[1 : 1 + len(after)] -= turned @ to_right
    kept_rhs[1 : 1 + len(after)] -= turned @ own[: len(after)]
    even = _reduced(kept, -(before[: len(after)] @ to_right), kept_rhs)

    x = np.empty_like(rhs)
    x[0::2] = even
    x[1::2] = own - to_left @ even[:odd]
    x[1 : 2 * len(after) : 2] -= to_right @ even[1 : 1 + len(after)]
    return x


def minimise(base: Normal, bounds: list[Bounds], start: Floats) -> Floats:
    """The minimiser of the base equations under the bounds.

    Parameters
    ----------
    base : Normal
        Everything but the bounds.
    start : ndarray, shape (unknowns,)
        Where the search for the active bounds begins.
    """

    def cost(x: Floats) -> float:
        return base.cost(x) + sum(float(b.rows.weight @ b.excess(x) ** 2) for b in bounds)

    x = start
    sides = [np.sign(b.excess(x)) for b in bounds]
    for _ in range(_STEPS):
        system = base.copy()
        for bound, side in zip(bounds, sides, strict=True):
            edge = bound.rows.target + side * bound.bound
            system.add(bound.rows.only(side != 0.0, edge))
        found = system.solve()
        outside = [np.sign(b.excess(found)) for b in bounds]
        if all(map(np.array_equal, sides, outside)):
            return found
        x = _descend(cost, x, found)
        sides = [np.sign(b.excess(x)) for b in bounds]
    return x


def _descend(cost: Callable[[Floats], float], x: Floats, found: Floats) -> Floats:
    """As far from x towards `found` as the cost falls, by halving."""
    here, share = cost(x), 1.0
    for _ in range(_HALVINGS):
        if cost(x + share * (found - x)) <= here:
            break
        share /= 2
    return x + share * (found - x)
