"""The best division into chords, and how sure it is.

A semi-Markov chain over segments: its best path (Viterbi 1967) and its posterior
(forward-backward; for semi-Markov chains Sarawagi & Cohen 2004).

Conventions
-----------
* Messages at a boundary are natural logs; "entering" messages have 12 values, one a root,
  because a move depends on the root it reaches only.
* The piece is worked through in blocks of starting slices, so memory grows with the piece by
  the messages alone.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from retune.harmony.evidence import Evidence
from retune.harmony.scoring import MAX_SPAN, SegmentScorer, make_scorer, motion_scores
from retune.harmony.states import QUALITIES, ROOT_OF, ROOTS, STATES, Floats, Ints, Singles
from retune.harmony.weights import Weights

BLOCK = 1024
_FLOOR = -1e30
_PER_ROOT = len(QUALITIES)


@dataclass(frozen=True)
class Segmentation:
    """Chords as slice ranges with their states, and the posterior of every state.

    Parameters
    ----------
    bounds : int64 array, shape (segments + 1,)
        First slice of each segment, then the number of slices.
    states : int64 array, shape (segments,)
    posterior : float32 array, shape (n, 120)
        Probability of each state in each slice.
    """

    bounds: Ints
    states: Ints
    posterior: Singles


def segment(evidence: Evidence, weights: Weights) -> Segmentation:
    """Find the chords of a piece that has at least one slice."""
    scorer = make_scorer(evidence, weights)
    motion = motion_scores(weights)
    bounds, states = _best_path(scorer, motion)
    return Segmentation(bounds, states, _posterior(scorer, motion))


def _by_end(scorer: SegmentScorer, start: int, stop: int) -> Singles:
    """Scores of segments ending at start + 1 to stop, shape (rows, 16, 120), by starting slice.

    Place p on the span axis starts at end - 16 + p, so a row meets the messages of its sixteen
    starting boundaries in order.
    """
    low = max(start + 1 - MAX_SPAN, 0)
    scores = scorer.block(low, stop)
    ends = np.arange(start + 1, stop + 1)[:, None]
    starts = ends - MAX_SPAN + np.arange(MAX_SPAN)[None, :]
    rows: Singles = scores[np.maximum(starts - low, 0), (ends - starts - 1)]
    rows[starts < 0] = _FLOOR
    return rows


def _best_path(scorer: SegmentScorer, motion: Floats) -> tuple[Ints, Ints]:
    count = scorer.evidence.count
    leave = motion.reshape(ROOTS, _PER_ROOT, ROOTS)
    # Messages of boundary b stand at row b + MAX_SPAN; the rows before are never entered.
    entering = np.full((count + 1 + MAX_SPAN, STATES), _FLOOR)
    entering[MAX_SPAN] = 0.0
    span_of = np.zeros((count + 1, STATES), dtype=np.int8)
    came_from = np.zeros((count + 1, ROOTS), dtype=np.int16)
    best = np.zeros(STATES)
    columns = np.arange(STATES)
    flat = leave.reshape(STATES, ROOTS)
    for start in range(0, count, BLOCK):
        stop = min(start + BLOCK, count)
        for row, scores in enumerate(_by_end(scorer, start, stop), start + 1):
            arriving = entering[row : row + MAX_SPAN] + scores
            place = arriving.argmax(axis=0)
            best = arriving[place, columns]
            span_of[row] = MAX_SPAN - place
            moved = best[:, None] + flat
            came = moved.argmax(axis=0)
            came_from[row] = came
            entering[row + MAX_SPAN] = moved[came, np.arange(ROOTS)][ROOT_OF]
    return _trace(int(best.argmax()), span_of, came_from)


def _trace(
    state: int, span_of: np.typing.NDArray[np.int8], came_from: np.typing.NDArray[np.int16]
) -> tuple[Ints, Ints]:
    end = len(span_of) - 1
    bounds, states = [end], []
    while end > 0:
        states.append(state)
        end -= int(span_of[end, state])
        bounds.append(end)
        state = int(came_from[end, ROOT_OF[state]])
    return np.array(bounds[::-1], dtype=np.int64), np.array(states[::-1], dtype=np.int64)


def _log_sum(values: Floats, axis: int) -> Floats:
    top = values.max(axis=axis, keepdims=True)
    return np.asarray(
        np.log(np.exp(values - top).sum(axis=axis)) + np.squeeze(top, axis=axis), dtype=np.float64
    )


def _posterior(scorer: SegmentScorer, motion: Floats) -> Singles:
    count = scorer.evidence.count
    odds = np.exp(motion)
    forward = np.full((count + 1 + MAX_SPAN, STATES), _FLOOR)
    forward[MAX_SPAN] = 0.0
    ending = np.zeros(STATES)
    for start in range(0, count, BLOCK):
        stop = min(start + BLOCK, count)
        for row, scores in enumerate(_by_end(scorer, start, stop), start + 1):
            ending = _log_sum(forward[row : row + MAX_SPAN] + scores, 0)
            forward[row + MAX_SPAN] = _move(ending, odds)[ROOT_OF]
    total = float(_log_sum(ending, 0))
    change = np.zeros((count + 1, STATES), dtype=np.float64)
    backward = np.full((count + 1 + MAX_SPAN, STATES), _FLOOR)
    backward[count] = 0.0
    for stop in range(count, 0, -BLOCK):
        start = max(stop - BLOCK, 0)
        scores = scorer.block(start, stop).astype(np.float64)
        for row in range(stop - 1, start - 1, -1):
            onward = backward[row + 1 : row + 1 + MAX_SPAN] + scores[row - start]
            begun = _log_sum(onward, 0)
            share = np.exp(onward + forward[row + MAX_SPAN] - total)
            change[row] += share.sum(axis=0)
            reach = min(MAX_SPAN, count - row)
            change[row + 1 : row + 1 + reach] -= share[:reach]
            if row:
                by_root = _log_sum(begun.reshape(ROOTS, _PER_ROOT), 1)
                top = by_root.max()
                backward[row] = np.log(odds @ np.exp(by_root - top)) + top
    return np.clip(np.cumsum(change[:-1], axis=0), 0.0, 1.0).astype(np.float32)


def _move(ending: Floats, odds: Floats) -> Floats:
    top = ending.max()
    return np.asarray(np.log(np.exp(ending - top) @ odds) + top)
