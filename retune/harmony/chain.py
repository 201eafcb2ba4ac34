"""Forward-backward over a semi-Markov chain, several stretches of music in step.

For semi-Markov chains see Sarawagi & Cohen, "Semi-Markov conditional random fields" (2004).

Conventions
-----------
* A lane is one stretch of slices. Lanes advance together, so that the cost of a step is shared.
* Tables hold exponentiated segment scores by lane, starting slice, span less one, and state;
  segments past the end of a lane are 0.
* Messages are probabilities up to a scale that is kept as a natural log and renewed each step.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from retune.harmony.states import ROOT_OF, ROOTS, STATES, Floats, Ints, Singles


@dataclass(frozen=True)
class Posterior:
    """What a chain says of its segments.

    Parameters
    ----------
    log_total : float64 array, shape (lanes,)
        Log of the summed scores of all segmentations.
    shares : float32 array, shape (lanes, slices, spans, 120)
        Probability of every segment; it stands in the memory of the table.
    leaving, reaching : float64 arrays, shapes (lanes, slices, 120) and (lanes, slices, 12)
        Messages into and out of each inner boundary: leaving[:, b] times reaching[:, b] times
        the odds of the move is the probability of that move at boundary b.
    """

    log_total: Floats
    shares: Singles
    leaving: Floats
    reaching: Floats


def posterior(table: Singles, counts: Ints, odds: Floats) -> Posterior:
    """Segment probabilities of every lane.

    Parameters
    ----------
    table : float32 array, shape (lanes, slices, spans, 120)
        It is overwritten.
    counts : int64 array, shape (lanes,)
        Slices of each lane.
    odds : float64 array, shape (120, 12)
        Exponentiated scores of moving from a state to a root.
    """
    entering, leaving, scale = _forward(table, odds)
    lanes, slices, spans, _ = table.shape
    log_total = scale[np.arange(lanes), counts].copy()
    window = np.zeros((lanes, slices + 1 + spans, STATES))
    window[np.arange(lanes), counts] = 1.0
    reaching = np.zeros((lanes, slices, ROOTS))
    behind = np.zeros(lanes)
    for start in range(slices - 1, -1, -1):
        onward = window[:, start + 1 : start + 1 + spans] * table[:, start]
        by_root = onward.sum(axis=1).reshape(lanes, ROOTS, -1).sum(axis=2)
        live = start < counts
        total = np.where(live, by_root.sum(axis=1), 1.0)
        factor = np.where(live, np.exp(np.minimum(scale[:, start] + behind - log_total, 600)), 0.0)
        enter = entering[:, start] * factor[:, None]
        table[:, start] = onward * enter[:, None, ROOT_OF]
        leaving[:, start] *= factor[:, None]
        reaching[:, start] = by_root
        window[live, start] = (by_root @ odds.T)[live]
        window[:, start : start + spans] /= total[:, None, None]
        behind += np.log(total)
    return Posterior(log_total, table, leaving[:, :slices], reaching)


def _forward(table: Singles, odds: Floats) -> tuple[Floats, Floats, Floats]:
    """Messages entering and leaving each boundary, and their log scale."""
    lanes, slices, spans, _ = table.shape
    entering = np.ones((lanes, slices + 1, ROOTS))
    ending = np.zeros((lanes, slices + 1 + spans, STATES))
    scale = np.zeros((lanes, slices + 1))
    for start in range(slices + 1):
        if start:
            total = ending[:, start].sum(axis=1)
            total[total == 0] = 1.0
            ending[:, start : start + spans] /= total[:, None, None]
            scale[:, start] = scale[:, start - 1] + np.log(total)
            entering[:, start] = ending[:, start] @ odds
        if start < slices:
            enter = entering[:, start][:, None, ROOT_OF]
            ending[:, start + 1 : start + 1 + spans] += table[:, start] * enter
    return entering, ending, scale


def covered(shares: Singles) -> Floats:
    """Segment values summed over the slices they cover, shape (lanes, slices, 120)."""
    lanes, slices, spans, states = shares.shape
    change = np.zeros((lanes, slices, states))
    change += shares.sum(axis=2, dtype=np.float64)
    for span in range(1, min(spans, slices - 1) + 1):
        change[:, span:] -= shares[:, : slices - span, span - 1]
    return np.asarray(np.cumsum(change, axis=1))
