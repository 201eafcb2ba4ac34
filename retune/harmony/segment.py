"""The division into chords, and how sure it is.

Every slice takes the root that is most probable there over all segmentations, and the most
probable quality over that root: the choice that is wrong for the least expected time.

Conventions
-----------
* Long pieces are worked through in overlapping windows. A chain forgets within a few chords, so
  the margins make the windows' results those of the whole piece to many digits.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from retune.harmony.chain import covered, posterior
from retune.harmony.evidence import Evidence
from retune.harmony.scoring import MAX_SPAN, SegmentScorer, make_scorer, motion_scores
from retune.harmony.states import QUALITIES, ROOTS, STATES, Floats, Ints, Singles
from retune.harmony.weights import Weights

WINDOW = 512
MARGIN = 64
LANES = 16


@dataclass(frozen=True)
class Segmentation:
    """The state of every slice, and the posterior it was chosen by.

    Parameters
    ----------
    states : int64 array, shape (n,)
    posterior : float32 array, shape (n, 120)
        Probability of each state in each slice.
    """

    states: Ints
    posterior: Singles


def segment(evidence: Evidence, weights: Weights) -> Segmentation:
    """Find the state of every slice."""
    scorer = make_scorer(evidence, weights)
    shares = _state_shares(scorer, np.exp(motion_scores(weights)))
    by_root = shares.reshape(-1, ROOTS, len(QUALITIES))
    root = by_root.sum(axis=2).argmax(axis=1)
    quality = by_root[np.arange(len(shares)), root].argmax(axis=1)
    return Segmentation(root * len(QUALITIES) + quality, shares)


def _state_shares(scorer: SegmentScorer, odds: Floats) -> Singles:
    """Posterior of the states in each slice, shape (n, 120)."""
    count = scorer.evidence.count
    shares = np.zeros((count, STATES), dtype=np.float32)
    cores = list(range(0, count, WINDOW))
    for batch in range(0, len(cores), LANES):
        lanes = [
            (max(core - MARGIN, 0), min(core + WINDOW + MARGIN, count))
            for core in cores[batch : batch + LANES]
        ]
        counts = np.array([stop - start for start, stop in lanes])
        table = np.zeros((len(lanes), int(counts.max()), MAX_SPAN, STATES), dtype=np.float32)
        for lane, (start, stop) in enumerate(lanes):
            table[lane, : stop - start] = scorer.odds(start, stop)[0]
        found = covered(posterior(table, counts, odds).shares)
        for lane, (start, _) in enumerate(lanes):
            core = cores[batch + lane]
            last = min(core + WINDOW, count)
            shares[core:last] = found[lane, core - start : last - start]
    return np.clip(shares, 0.0, 1.0)
