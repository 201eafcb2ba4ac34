"""Fit the weights of the harmonic analysis on the development set.

    python tests/benchmarks/fit_roots.py            fit, print the figures, write weights.json
    python tests/benchmarks/fit_roots.py --folds 5  cross-validate inside the development set

The likelihood is of the human roots, not of a segmentation: minimised is
-log P(all segmentations whose roots equal the labels), with a margin of one for each quarter
that a segmentation has wrong (Gimpel & Smith 2010, softmax-margin), plus an L2 penalty.
Gradients come from forward-backward over segments; all pieces advance in lockstep.
"""

from __future__ import annotations

import argparse
import json
from dataclasses import dataclass
from pathlib import Path

import corpus
import numpy as np
import roots
from corpus import Label, Piece
from numpy.typing import NDArray
from scipy.optimize import minimize

import retune.harmony
from retune.harmony.analysis import analyse_with
from retune.harmony.chain import Posterior, covered, posterior
from retune.harmony.evidence import Evidence, gather_evidence
from retune.harmony.scoring import (
    CLASS_OF,
    MAX_SPAN,
    SegmentScorer,
    make_scorer,
    motion_scores,
)
from retune.harmony.states import (
    DEGREE_OF,
    NON_CHORD,
    QUALITIES,
    QUALITY_OF,
    ROOT_OF,
    ROOTS,
    STATES,
)
from retune.harmony.timeline import make_timeline
from retune.harmony.weights import TERMS, Weights
from retune.score.model import Score

Array = NDArray[np.float64]

Read = tuple[Score, list[Label]]

WEIGHTS = Path(retune.harmony.__file__).with_name("weights.json")
ORIGIN = (
    "Fitted by tests/benchmarks/fit_roots.py on human analyses in music21's corpus: Bach's "
    "chorales with even numbers among Riemenschneider's first twenty, Monteverdi's third book "
    "of madrigals."
)
PENALTY = 3.0
MARGIN = 1.0
QUALITY_COST = 1.0
"""Cost of a quarter with the right root and another quality than the label's. Without it, and
without the bounds below, seventh chords swallow their triads at no loss of root agreement."""
LANES = 8
EMPHASIS = {"chorales": 6.0, "madrigals": 1.0}
"""Chorales are few and short; a quarter of theirs counts as six of the madrigals'."""

BOUNDS: dict[tuple[str, str], tuple[float | None, float | None]] = {
    ("missing", "seventh"): (None, -1.5),
    ("first_tones", "seventh"): (0.0, None),
    ("last_tones", "seventh"): (0.0, None),
    ("duration", "seventh"): (0.0, None),
    ("count", "seventh"): (0.0, None),
    ("coverage", "seventh"): (0.0, None),
    ("start_level", "0"): (None, -4.0),
    ("chord_symbol", "quarter"): (3.0, 3.0),
}
"""Limits that keep sevenths honest. The last two stand for what the development set hardly has:
keyboard figures, chord symbols."""


def pack(weights: Weights) -> Array:
    """All weights as one vector, in the order of `TERMS`."""
    return np.concatenate([weights[term] for term in TERMS])


def unpack(vector: Array) -> Weights:
    """The opposite of `pack`."""
    terms, place = {}, 0
    for term, names in TERMS.items():
        terms[term] = vector[place : place + len(names)]
        place += len(names)
    return Weights(terms)


@dataclass(frozen=True)
class Example:
    """One piece to learn from, and its weight.

    `wrong` holds quarters of another root than the label's, shape (n, 12); `unlike` quarters of
    another quality, shape (n, 10).
    """

    evidence: Evidence
    wrong: Array
    unlike: Array
    emphasis: float


def spans_of(wrong: Array) -> NDArray[np.float32]:
    """Sums over every segment of quarters per slice, shape (n, 16, ...)."""
    count = len(wrong)
    sums = np.concatenate([np.zeros((1, wrong.shape[1])), np.cumsum(wrong, axis=0)])
    ends = np.minimum(np.arange(count)[:, None] + np.arange(1, MAX_SPAN + 1), count)
    return (sums[ends] - sums[np.arange(count)][:, None, :]).astype(np.float32)


class Objective:
    """Penalised softmax-margin loss of a set of examples, with its gradient."""

    def __init__(self, examples: list[Example], penalty: float = PENALTY) -> None:
        # Pieces of like length share their lanes, so that little of a table is padding.
        ordered = sorted(examples, key=lambda example: example.evidence.count)
        self.batches = [ordered[i : i + LANES] for i in range(0, len(ordered), LANES)]
        self.penalty = penalty
        self.wrong = {id(example): spans_of(example.wrong) for example in examples}
        self.unlike = {id(example): spans_of(example.unlike) for example in examples}

    def __call__(self, vector: Array) -> tuple[float, Array]:
        weights = unpack(vector)
        gradient: dict[str, Array] = {term: np.zeros(len(names)) for term, names in TERMS.items()}
        loss = self.penalty / 2 * float(vector @ vector)
        for batch in self.batches:
            loss += self.add_batch(batch, weights, gradient)
        return loss, pack(Weights(gradient)) + self.penalty * vector

    def add_batch(
        self, batch: list[Example], weights: Weights, gradient: dict[str, Array]
    ) -> float:
        """Loss of pieces in step, their gradient added to `gradient`."""
        counts = np.array([example.evidence.count for example in batch])
        free = np.zeros((len(batch), int(counts.max()), MAX_SPAN, STATES), dtype=np.float32)
        bound = np.zeros_like(free)
        odds = np.exp(motion_scores(weights))
        scorers = [make_scorer(example.evidence, weights) for example in batch]
        for piece, (example, scorer) in enumerate(zip(batch, scorers, strict=True)):
            count = counts[piece]
            wrong = self.wrong[id(example)]
            # The constants taken out of each slice are those of both passes, and cancel.
            table = scorer.odds(0, count)[0].reshape(count, MAX_SPAN, ROOTS, -1)
            one = (count, MAX_SPAN, STATES)
            free[piece, :count] = (table * np.exp(MARGIN * wrong)[..., None]).reshape(one)
            table *= (wrong < 1e-6)[..., None]
            table *= np.exp(-QUALITY_COST * self.unlike[id(example)])[:, :, None, :]
            bound[piece, :count] = table.reshape(one)
        any_root = posterior(free, counts, odds)
        right_root = posterior(bound, counts, odds)
        emphasis = np.array([example.emphasis for example in batch])
        shares = any_root.shares
        shares -= right_root.shares
        shares *= emphasis.astype(np.float32)[:, None, None, None]
        for piece, scorer in enumerate(scorers):
            add_segment_gradient(gradient, scorer, shares[piece, : counts[piece]])
        moves = moves_of(any_root, emphasis) - moves_of(right_root, emphasis)
        add_motion_gradient(gradient, odds * moves)
        return float(emphasis @ (any_root.log_total - right_root.log_total))


def moves_of(found: Posterior, emphasis: Array) -> Array:
    """Expected moves from state to root over inner boundaries, before the odds, (120, 12)."""
    leaving = (found.leaving * emphasis[:, None, None])[:, 1:]
    return np.asarray(leaving.reshape(-1, STATES).T @ found.reaching[:, 1:].reshape(-1, ROOTS))


def by_degree(table: Array, places: int) -> Array:
    """Sum a (12, 120) gradient into degrees."""
    return np.bincount(DEGREE_OF.ravel(), table.ravel(), NON_CHORD + 1)[:places]


def add_segment_gradient(
    gradient: dict[str, Array], scorer: SegmentScorer, shares: NDArray[np.float32]
) -> None:
    """Carry d loss / d segment score back to the weights: `make_scorer` transposed."""
    evidence = scorer.evidence
    count = evidence.count
    starts = shares.sum(axis=1, dtype=np.float64)
    ends = np.zeros((count, STATES))
    for span in range(1, min(MAX_SPAN, count) + 1):
        ends[span - 1 :] += shares[: count + 1 - span, span - 1]
    upto = np.minimum(np.arange(count)[:, None] + np.arange(1, MAX_SPAN + 1), count)
    lasted = evidence.time[upto] - evidence.time[:count, None]
    cover = covered(shares[None])[0]
    rate = covered((shares / lasted.astype(np.float32)[:, :, None])[None])[0]
    gradient["duration"] += by_degree(evidence.held.T @ cover, 4)
    gradient["count"] += by_degree(evidence.begun.T @ cover, 4)
    nonchord = cover @ (DEGREE_OF == NON_CHORD).T
    cells = nonchord.ravel()[evidence.cells]
    approaches = evidence.approaches
    begin = evidence.beginning
    places = len(TERMS["nonchord_count"])
    gradient["nonchord_count"] += np.bincount(approaches[begin], cells[begin], places)
    lengths = evidence.length[evidence.cells // ROOTS]
    gradient["nonchord_duration"] += np.bincount(approaches, cells * lengths, places)
    sounding = evidence.sounding * evidence.length[:, None]
    gradient["coverage"] += by_degree(sounding.T @ rate, 5)
    heard = scorer.heard(0, count).reshape(-1, ROOTS)
    gradient["missing"] += by_degree((1 - heard).T @ shares.reshape(-1, STATES), 4)
    loud = evidence.bass >= 0
    for term, rows in (("first_bass", starts), ("last_bass", ends)):
        table = np.zeros((ROOTS, STATES))
        np.add.at(table, evidence.bass[loud], rows[loud])
        gradient[term] += by_degree(table, 5)
    gradient["first_tones"] += by_degree(evidence.sounding.T @ starts, 5)
    gradient["last_tones"] += by_degree(evidence.sounding.T @ ends, 5)
    gradient["profile"] += by_degree(evidence.profile.T @ starts, 4)
    gradient["misspelt"] += float((cover * evidence.misspelt).sum(axis=1) @ evidence.length)
    begun = starts.sum(axis=1)
    gradient["start_level"] += np.bincount(evidence.level[:-1], begun, 5)
    gradient["attack"] += begun @ evidence.attack
    gradient["quality"] += np.bincount(QUALITY_OF, starts.sum(axis=0), len(QUALITIES))
    gradient["crossed_level"] += np.bincount(
        scorer.strongest(0, count).ravel(), shares.sum(axis=2, dtype=np.float64).ravel(), 5
    )


def add_motion_gradient(gradient: dict[str, Array], moves: Array) -> None:
    """`motion_scores` transposed."""
    interval = (np.arange(ROOTS)[None, :] - ROOT_OF[:, None]) % ROOTS
    kind = CLASS_OF[QUALITY_OF][:, None] + np.zeros((1, ROOTS), dtype=np.int64)
    for place, term in enumerate(("motion", "motion_after_dominant", "motion_after_diminished")):
        rows = np.ones_like(kind, dtype=bool) if place == 0 else kind == place
        gradient[term] += np.bincount(interval[rows], moves[rows], ROOTS)


def bounds() -> list[tuple[float | None, float | None]]:
    """Limits of every weight, in the order of `pack`."""
    return [
        BOUNDS.get((term, name), (None, None)) for term, names in TERMS.items() for name in names
    ]


def fit(
    examples: list[Example], start: Array, iterations: int = 100, penalty: float = PENALTY
) -> Array:
    """Weights that minimise the objective; L-BFGS-B from a starting point."""
    limits = bounds()
    low = np.array([-np.inf if a is None else a for a, _ in limits])
    high = np.array([np.inf if b is None else b for _, b in limits])
    found = minimize(
        Objective(examples, penalty),
        np.clip(start, low, high),
        jac=True,
        method="L-BFGS-B",
        bounds=limits,
        options={"maxiter": iterations, "maxcor": 20},
    )
    return np.asarray(found.x)


def example_of(evidence: Evidence, labels: list[Label], emphasis: float) -> Example:
    """A piece to learn from; labels that the notes contradict teach nothing."""
    wrong = np.zeros((evidence.count, ROOTS))
    unlike = np.zeros((evidence.count, len(QUALITIES)))
    for label in labels:
        shared = list(roots.slices_in(label, evidence.time))
        sounding = {int(tone) for i, _ in shared for tone in np.flatnonzero(evidence.sounding[i])}
        if not roots.is_supported(label, sounding):
            continue
        for index, quarters in shared:
            wrong[index] += quarters
            wrong[index, label.root] -= quarters
            if label.quality is not None:
                unlike[index] += quarters
                unlike[index, QUALITIES.index(label.quality)] -= quarters
    # A label that changes inside a slice must leave one root that is right there.
    wrong -= wrong.min(axis=1, keepdims=True)
    return Example(evidence, wrong, unlike, emphasis)


def as_data(vector: Array) -> dict[str, dict[str, float]]:
    """Weights by name, to two decimals, zeros left out."""
    weights = unpack(vector)
    return {
        term: {
            name: round(float(value), 2)
            for name, value in zip(names, weights[term], strict=True)
            if abs(value) >= 0.005
        }
        for term, names in TERMS.items()
    }


def agreement(vector: Array, pieces: list[Piece], read: dict[str, Read]) -> dict[str, roots.Tally]:
    """Tallies by group of an analysis with other weights than the shipped ones."""
    groups: dict[str, roots.Tally] = {}
    weights = unpack(vector)
    for piece in pieces:
        score, labels = read[piece.name]
        tally = roots.judge(score, analyse_with(score, weights), labels)
        groups.setdefault(piece.group, roots.Tally()).add(tally)
    return groups


def report(title: str, groups: dict[str, roots.Tally]) -> None:
    """Print the figures of both groups."""
    for group, tally in groups.items():
        figures = tally.figures()
        names = ("root", "supported", "quality")
        print(f"{title:12} {group:10}", *(f"{name} {figures[name]:.4f}" for name in names))


def main() -> None:
    """Fit, or cross-validate."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--folds", type=int, default=0, help="cross-validate, writing nothing")
    parser.add_argument("--iterations", type=int, default=100)
    parser.add_argument("--penalty", type=float, default=PENALTY)
    wish = parser.parse_args()
    pieces = corpus.development()
    read = {piece.name: roots.read_piece(piece) for piece in pieces}
    examples = {}
    for piece in pieces:
        score, labels = read[piece.name]
        evidence = gather_evidence(score, make_timeline(score))
        examples[piece.name] = example_of(evidence, labels, EMPHASIS[piece.group])
    start = np.zeros(sum(map(len, TERMS.values())))
    pooled: dict[str, roots.Tally] = {}
    for fold in range(wish.folds):
        kept = [examples[piece.name] for i, piece in enumerate(pieces) if i % wish.folds != fold]
        found = fit(kept, start, wish.iterations, wish.penalty)
        groups = agreement(found, pieces[fold :: wish.folds], read)
        report(f"fold {fold + 1}", groups)
        for group, tally in groups.items():
            pooled.setdefault(group, roots.Tally()).add(tally)
    if wish.folds:
        report("all folds", pooled)
        return
    found = fit(list(examples.values()), start, wish.iterations, wish.penalty)
    report("fitted", agreement(found, pieces, read))
    WEIGHTS.write_text(json.dumps({"origin": ORIGIN, **as_data(found)}, indent=1) + "\n", "utf-8")


if __name__ == "__main__":
    main()
