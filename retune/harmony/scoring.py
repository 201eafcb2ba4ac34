"""Scores of segments: every run of slices under every state.

Conventions
-----------
* A segment of span l starting at slice i covers slices i to i + l; spans run from 1 to
  `MAX_SPAN` and stand at l - 1 on their axis.
* Segments last at most `MAX_QUARTERS`, except that a single slice may be of any length;
  what is not allowed scores `IMPOSSIBLE`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from retune.harmony.evidence import Evidence
from retune.harmony.model import Quality
from retune.harmony.states import (
    DEGREE_OF,
    NON_CHORD,
    QUALITIES,
    QUALITY_OF,
    ROOT_OF,
    ROOTS,
    STATES,
    Floats,
    Singles,
)
from retune.harmony.weights import Weights

MAX_SPAN = 16
MAX_QUARTERS = 4.0
IMPOSSIBLE = -1e9

PLAIN, DOMINANT, DIMINISHED = range(3)
CLASS_OF = np.array(
    [
        {
            Quality.DOMINANT_SEVENTH: DOMINANT,
            Quality.DIMINISHED: DIMINISHED,
            Quality.HALF_DIMINISHED: DIMINISHED,
            Quality.DIMINISHED_SEVENTH: DIMINISHED,
        }.get(quality, PLAIN)
        for quality in QUALITIES
    ]
)
"""How each quality wants to move on, shape (10,)."""


def by_state(degrees: Floats) -> Floats:
    """Weights per degree laid out by pitch class and state, shape (12, 120).

    `degrees` has four values, then none or one for non-chord tones.
    """
    padded = np.zeros(NON_CHORD + 1)
    padded[: len(degrees)] = degrees
    return padded[DEGREE_OF]


@dataclass(frozen=True)
class SegmentScorer:
    """Scores of segments from prefix sums; build with `make_scorer`.

    `tones` and `cover` have shape (n + 1, 120), `first` and `last` (n, 120), `absent` (12, 120).
    """

    evidence: Evidence
    tones: Floats
    cover: Floats
    first: Floats
    last: Floats
    absent: Floats
    crossed: Floats

    def block(self, start: int, stop: int) -> Singles:
        """Scores of the segments that start in [start, stop), shape (stop - start, 16, 120)."""
        evidence = self.evidence
        count = evidence.count
        rows = stop - start
        scores = np.full((rows, MAX_SPAN, STATES), IMPOSSIBLE, dtype=np.float32)
        heard = np.zeros((rows, ROOTS), dtype=np.float32)
        strongest = np.zeros(rows, dtype=np.int64)
        absent = self.absent.astype(np.float32)
        for span in range(1, MAX_SPAN + 1):
            size = min(stop, count - span + 1) - start
            if size <= 0:
                break
            head = slice(start, start + size)
            tail = slice(start + span - 1, start + size + span - 1)
            end = slice(start + span, start + size + span)
            heard[:size] = np.maximum(heard[:size], evidence.sounding[tail])
            if span > 1:
                strongest[:size] = np.maximum(strongest[:size], evidence.level[tail])
            strongest[:size] = np.maximum(strongest[:size], evidence.inner[tail])
            lasted = evidence.time[end] - evidence.time[head]
            part = self.tones[end] - self.tones[head]
            part += (self.cover[end] - self.cover[head]) / lasted[:, None]
            part += self.first[head]
            part += self.last[tail]
            part += (1 - heard[:size]) @ absent
            part += self.crossed[strongest[:size], None]
            if span > 1:
                part[lasted > MAX_QUARTERS + 1e-6] = IMPOSSIBLE
            scores[:size, span - 1] = part
        return scores


def make_scorer(evidence: Evidence, weights: Weights) -> SegmentScorer:
    """Fold the weights into per-slice sums."""
    nonchord = evidence.spread(weights["nonchord_count"], weights["nonchord_duration"])
    tones = (
        evidence.held @ by_state(weights["duration"])
        + evidence.begun @ by_state(weights["count"])
        + nonchord @ (DEGREE_OF == NON_CHORD)
    )
    cover = (evidence.sounding * evidence.length[:, None]) @ by_state(weights["coverage"])
    silent = evidence.bass < 0
    first = by_state(weights["first_bass"])[evidence.bass]
    last = by_state(weights["last_bass"])[evidence.bass]
    first[silent] = 0.0
    last[silent] = 0.0
    first += (weights["start_level"][evidence.level[:-1]] + weights["attack"][0] * evidence.attack)[
        :, None
    ]
    first += weights["quality"][QUALITY_OF]
    return SegmentScorer(
        evidence,
        _prefix(tones),
        _prefix(cover),
        first,
        last,
        by_state(weights["missing"]),
        weights["crossed_level"],
    )


def _prefix(rows: Floats) -> Floats:
    return np.concatenate([np.zeros((1, rows.shape[1])), np.cumsum(rows, axis=0)])


def motion_scores(weights: Weights) -> Floats:
    """Score of moving from a state to a root, shape (120, 12)."""
    interval = (np.arange(ROOTS)[None, :] - ROOT_OF[:, None]) % ROOTS
    after = np.stack(
        [
            np.zeros(ROOTS),
            weights["motion_after_dominant"],
            weights["motion_after_diminished"],
        ]
    )
    return np.asarray(weights["motion"][interval] + after[CLASS_OF[QUALITY_OF][:, None], interval])
