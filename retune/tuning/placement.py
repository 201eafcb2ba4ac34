"""Placing every piece: the global solve, held shifts capped exactly.

Conventions
-----------
* Pieces' cents are deviations from equal temperament; parts that cannot move are given.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from retune.tuning.ground import Ground
from retune.tuning.intervals import Floats, Ints
from retune.tuning.layout import Layout
from retune.tuning.policy import Policy, Pull
from retune.tuning.rows import (
    PEDAL,
    absolute,
    anchor_weights,
    between,
    bridges,
    chord_rows,
    held_weights,
    melodic_targets,
    melodic_weights,
)
from retune.tuning.solve import SMALLEST_BLOCK, STIFF, Bounds, Normal, Rows, minimise
from retune.tuning.targets import Targets

_PASSES = 3
"""How often the nearest just steps are chosen again."""


@dataclass(frozen=True)
class Problem:
    """What the solve needs to know.

    Parameters
    ----------
    start : ndarray, shape (pieces,)
        Where the search for the nearest just steps begins, in cents.
    fixed, fixed_root : ndarray, shape (pieces,)
        Each piece's cents, and its chord's root's, in the tuning of the parts that cannot move.
    """

    layout: Layout
    targets: Targets
    policy: Policy
    ground: Ground
    start: Floats
    fixed: Floats
    fixed_root: Floats

    @property
    def cap(self) -> Floats:
        """The most that each held link may move, in cents: what its later chord allows."""
        caps: Floats = self.ground.cap[self.layout.chord[self.layout.held[:, 1]]]
        return caps


def _reach(layout: Layout, unknown: Ints, links: Ints) -> int:
    """How far apart in the order of unknowns any two pieces of one row stand."""
    sung = layout.tuned[layout.cell_piece]
    pieces, slices = unknown[layout.cell_piece[sung]], layout.cell_slice[sung]
    widest = 0
    if len(pieces):
        starts = np.flatnonzero(np.insert(slices[1:] != slices[:-1], 0, True))
        lows = np.minimum.reduceat(pieces, starts)
        widest = int((np.maximum.reduceat(pieces, starts) - lows).max())
    return max(widest, int(np.abs(np.diff(unknown[links], axis=1)).max(initial=0)))


def _fixed_rows(problem: Problem, unknown: Ints) -> Rows:
    """Voices drawn to the parts that cannot move, where these sound."""
    layout, targets, weights = problem.layout, problem.targets, problem.ground.weights
    with_them = layout.quarters * layout.accompanied
    weight = layout.per_piece(with_them[layout.cell_slice]) * weights.fixed
    target = problem.fixed.copy()
    if problem.policy.accompaniment_pull is Pull.ROOTS:
        frame = targets.tone & np.isin(layout.degree, (0, 2))
        framed = np.zeros(len(targets.templates), dtype=bool)
        framed[layout.chord[frame & layout.tuned]] = True
        # Thirds and sevenths follow the voices' own root or, where no voice has it, theirs.
        upper = targets.tone & ~frame
        target[upper] = (problem.fixed_root + targets.just)[upper]
        weight[upper & framed[layout.chord]] = 0.0
        weight[~targets.tone & ~layout.lone] *= weights.other
    chosen = np.flatnonzero(layout.tuned & (weight > 0.0))
    return absolute(unknown[chosen], weight[chosen], target[chosen])


def _constant_rows(problem: Problem, unknown: Ints) -> Iterator[Rows]:
    """All rows that do not change from pass to pass, but for the targets of steps."""
    layout, targets, ground = problem.layout, problem.targets, problem.ground
    for left, right, weight, target in chord_rows(layout, targets, ground):
        used = weight > 0.0
        yield Rows(unknown[left[used]], unknown[right[used]], weight[used], target[used])
    anchor = anchor_weights(layout, targets, ground)
    sung = np.flatnonzero(layout.tuned)
    yield absolute(unknown[sung], anchor[sung], targets.place[sung])
    pedals = np.flatnonzero(ground.pedals & layout.tuned)
    yield absolute(unknown[pedals], np.full(len(pedals), PEDAL), targets.level[pedals])
    yield _fixed_rows(problem, unknown)
    if ground.within.any():
        # The bound is measured from home; so that the first tonic chord is home, it stands there.
        home = _home(problem)
        first = home[layout.chord[home] == layout.chord[home[:1]]]
        place = targets.just[first] + targets.level[first]
        yield absolute(unknown[first], np.full(len(first), STIFF), place)
    jump = bridges(layout, ground)
    step = targets.place[jump[:, 1]] - targets.place[jump[:, 0]]
    yield between(unknown[jump], np.full(len(jump), ground.weights.bridge), step)
    held = layout.tuned[layout.held[:, 0]]
    weight = np.where(problem.cap == 0.0, STIFF, held_weights(layout, ground))
    links = unknown[layout.held[held]]
    yield between(links, weight[held], np.zeros(held.sum()))


def _home(problem: Problem) -> Ints:
    """The voices' chord tones, and any tonic they sing alone, in chords on the home tonic that
    are bound to a range."""
    layout, targets = problem.layout, problem.targets
    bound = targets.home & layout.tuned & problem.ground.within[layout.chord]
    return np.flatnonzero(bound & (targets.tone | (layout.degree == 0)))


def _bounds(problem: Problem, unknown: Ints) -> list[Bounds]:
    """The cap on held shifts, and the bound on the home tonic."""
    layout, targets, policy = problem.layout, problem.targets, problem.policy
    found = []
    some = layout.tuned[layout.held[:, 0]] & (problem.cap > 0.0) & (problem.cap < math.inf)
    if some.any():
        held = unknown[layout.held[some]]
        zeros = np.zeros(len(held))
        found.append(Bounds(between(held, zeros + STIFF, zeros), problem.cap[some]))
    if problem.ground.within.any():
        home = _home(problem)
        stiff = np.full(len(home), STIFF)
        rows = absolute(unknown[home], stiff, targets.just[home] + targets.level[home])
        found.append(Bounds(rows, np.full(len(home), policy.drift_within)))
    return found


def capped(layout: Layout, x: Floats, caps: Floats) -> Floats:
    """Pieces moved, where the solve left them over the cap, until every held shift keeps it.

    `caps` has one value for each held link.
    """
    x = x.copy()
    if not caps.any():
        length = layout.length
        total = np.bincount(layout.note, length)
        mean = np.bincount(layout.note, length * x) / np.maximum(total, 1e-300)
        return mean[layout.note]
    left, right = layout.held.T
    for before, after, cap in zip(left.tolist(), right.tolist(), caps.tolist(), strict=True):
        if abs(x[after] - x[before]) > cap:
            x[after] = min(max(x[after], x[before] - cap), x[before] + cap)
    return x


def place(problem: Problem) -> Floats:
    """The tuned cents of every piece, shape (pieces,)."""
    layout, ground = problem.layout, problem.ground
    x = np.where(layout.tuned, problem.start, problem.fixed)
    if not layout.tuned.any():
        return x
    unknown = np.cumsum(layout.tuned) - 1
    sung = np.flatnonzero(layout.tuned)
    melodic = layout.tuned[layout.melodic[:, 0]]
    links = np.concatenate((layout.held, layout.melodic, bridges(layout, ground)))
    links = links[layout.tuned[links[:, 0]]]
    block = max(SMALLEST_BLOCK, _reach(layout, unknown, links))
    base = Normal(len(sung), block)
    for rows in _constant_rows(problem, unknown):
        base.add(rows)
    step_links = unknown[layout.melodic[melodic]]
    step_weights = melodic_weights(layout, ground)[melodic]
    bounds = _bounds(problem, unknown)
    found = x[sung]
    for _ in range(_PASSES):
        targets = melodic_targets(layout, x, ground)[melodic]
        system = base.copy()
        system.add(between(step_links, step_weights, targets))
        found = minimise(system, bounds, found)
        x[sung] = found
    x[sung] = capped(layout, x, problem.cap)[sung]
    return x
