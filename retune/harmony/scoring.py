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
from typing import TypeVar

import numpy as np

from retune.harmony.evidence import Evidence
from retune.harmony.metre import TOLERANCE
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
    Ints,
    Singles,
)
from retune.harmony.weights import Weights

MAX_SPAN = 16
MAX_QUARTERS = 4.0
IMPOSSIBLE = -1e9
MOST = 80.0
"""Largest score before exponentiation; float32 ends at e to the 88."""

_Array = TypeVar("_Array", Singles, Ints)

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
    """Scores of segments, summed up slice by slice; build with `make_scorer`.

    `tones`, `cover`, `first` and `last` have shape (n, 120), `absent` (12, 120), `crossed` (5,).
    """

    evidence: Evidence
    tones: Singles
    cover: Singles
    first: Singles
    last: Singles
    absent: Singles
    crossed: Singles

    def heard(self, start: int, stop: int) -> Singles:
        """1 where a pitch class sounds in the segment, shape (stop - start, 16, 12)."""
        return _running_max(self.evidence.sounding.astype(np.float32), start, stop)

    def strongest(self, start: int, stop: int) -> Ints:
        """Strongest level strictly inside the segment, shape (stop - start, 16)."""
        evidence = self.evidence
        inner = _running_max(evidence.inner[:, None], start, stop)[:, :, 0]
        crossed = np.zeros((evidence.count + 1, 1), dtype=np.int64)
        crossed[:-1, 0] = evidence.level[1:]
        before = _running_max(crossed, start, stop)[:, :-1, 0]
        inner[:, 1:] = np.maximum(inner[:, 1:], before)
        return inner

    def block(self, start: int, stop: int) -> Singles:
        """Scores of the segments that start in [start, stop), shape (stop - start, 16, 120)."""
        time = self.evidence.time
        absent = (1 - self.heard(start, stop)) @ self.absent
        crossed = self.crossed[self.strongest(start, stop)]
        scores = np.full((stop - start, MAX_SPAN, STATES), IMPOSSIBLE, dtype=np.float32)
        running = self.first[start:stop].copy()
        covering = np.zeros_like(running)
        for span in range(1, MAX_SPAN + 1):
            size = min(stop, self.evidence.count - span + 1) - start
            if size <= 0:
                break
            tail = slice(start + span - 1, start + size + span - 1)
            lasted = time[start + span : start + size + span] - time[start : start + size]
            running[:size] += self.tones[tail]
            covering[:size] += self.cover[tail]
            part = covering[:size] * (1 / lasted).astype(np.float32)[:, None]
            part += running[:size]
            part += self.last[tail]
            part += absent[:size, span - 1]
            part += crossed[:size, span - 1, None]
            if span > 1:
                part[lasted > MAX_QUARTERS + TOLERANCE] = IMPOSSIBLE
            scores[:size, span - 1] = part
        return scores

    def odds(self, start: int, stop: int) -> tuple[Singles, Floats]:
        """Exponentiated `block`, and the natural logs taken out of it slice by slice.

        What is taken out of a slice is the best score it could have alone; it is the same for
        all segmentations.
        """
        scores = self.block(start, stop)
        rows = stop - start
        sums = np.concatenate([[0.0], np.cumsum(scores[:, 0].max(axis=1), dtype=np.float64)])
        ends = np.minimum(np.arange(rows)[:, None] + np.arange(1, MAX_SPAN + 1), rows)
        scores -= (sums[ends] - sums[:rows, None]).astype(np.float32)[:, :, None]
        np.minimum(scores, MOST, out=scores)
        for span in range(2, MAX_SPAN + 1):
            scores[max(rows + 1 - span, 0) :, span - 1] = IMPOSSIBLE
        return np.exp(scores, out=scores), np.diff(sums)


def _running_max(rows: _Array, start: int, stop: int) -> _Array:
    """Greatest value of rows i to i + span, for i in [start, stop), shape (rows, 16, ...)."""
    largest = np.zeros((stop - start, MAX_SPAN, *rows.shape[1:]), dtype=rows.dtype)
    largest[:, 0] = rows[start:stop]
    for span in range(1, MAX_SPAN):
        later = rows[start + span : stop + span]
        largest[:, span] = largest[:, span - 1]
        np.maximum(largest[: len(later), span], later, out=largest[: len(later), span])
    return largest


def make_scorer(evidence: Evidence, weights: Weights) -> SegmentScorer:
    """Fold the weights into per-slice sums."""
    nonchord = evidence.spread(weights["nonchord_count"], weights["nonchord_duration"])
    tones = (
        evidence.held @ by_state(weights["duration"])
        + evidence.begun @ by_state(weights["count"])
        + nonchord @ (DEGREE_OF == NON_CHORD)
    )
    said = weights["misspelt"][0] * evidence.misspelt
    said += weights["chord_symbol"][0] * evidence.symbols
    tones += said * evidence.length[:, None]
    cover = (evidence.sounding * evidence.length[:, None]) @ by_state(weights["coverage"])
    silent = evidence.bass < 0
    first = by_state(weights["first_bass"])[evidence.bass]
    last = by_state(weights["last_bass"])[evidence.bass]
    first[silent] = 0.0
    last[silent] = 0.0
    first += (weights["start_level"][evidence.level[:-1]] + weights["attack"][0] * evidence.attack)[
        :, None
    ]
    first += evidence.sounding @ by_state(weights["first_tones"])
    first += evidence.profile @ by_state(weights["profile"])
    last += evidence.sounding @ by_state(weights["last_tones"])
    first += weights["quality"][QUALITY_OF]
    return SegmentScorer(
        evidence,
        *(
            rows.astype(np.float32)
            for rows in (
                tones,
                cover,
                first,
                last,
                by_state(weights["missing"]),
                weights["crossed_level"],
            )
        ),
    )


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
