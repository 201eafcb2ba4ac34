"""Segments made chords: silence set apart, equal neighbours joined, roots named.

Conventions
-----------
* Silence inside a chord stays in it where it is shorter than `BREATH`; all other silence is a
  chord without root, of confidence 1.
* Confidence is the posterior probability of the root, averaged over the chord's sounding time.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from fractions import Fraction

import numpy as np

from retune.harmony.evidence import Evidence
from retune.harmony.model import Chord, Slice
from retune.harmony.naming import spell_root
from retune.harmony.segment import Segmentation
from retune.harmony.states import QUALITIES, QUALITY_OF, ROOT_OF, ROOTS, Bools, Floats
from retune.pitch import PitchClass
from retune.score.model import Score

BREATH = 1.0
"""Quarter notes."""
WORTH_NAMING = 0.005
"""Least probability of a runner-up."""

Run = tuple[int, int, int | None]
"""First slice, last slice (excluded) and state; None for silence."""


def make_chords(
    score: Score, slices: tuple[Slice, ...], evidence: Evidence, found: Segmentation
) -> tuple[Chord, ...]:
    """The chords of a segmentation, covering all slices."""
    runs = _joined(_runs(evidence, found))
    return tuple(
        _chord(index, run, score, slices, evidence, found) for index, run in enumerate(runs)
    )


def _runs(evidence: Evidence, found: Segmentation) -> Iterator[Run]:
    silent = evidence.bass < 0
    length = evidence.length
    bounds = found.bounds.tolist()
    for first, last, state in zip(bounds, bounds[1:], found.states.tolist(), strict=False):
        yield from _without_silence(first, last, state, silent, length)


def _without_silence(
    first: int, last: int, state: int, silent: Bools, length: Floats
) -> Iterator[Run]:
    """Cut a segment at its silent edges and at long silences inside."""
    start = first
    while start < last:
        quiet = bool(silent[start])
        stop = start + 1
        while stop < last and bool(silent[stop]) == quiet:
            stop += 1
        lasting = float(length[start:stop].sum())
        edge = start == first or stop == last
        yield start, stop, None if quiet and (edge or lasting >= BREATH) else state
        start = stop


def _joined(runs: Iterator[Run]) -> list[Run]:
    joined: list[Run] = []
    for first, last, state in runs:
        if joined and joined[-1][2] == state:
            joined[-1] = (joined[-1][0], last, state)
        else:
            joined.append((first, last, state))
    return joined


def _chord(
    index: int,
    run: Run,
    score: Score,
    slices: tuple[Slice, ...],
    evidence: Evidence,
    found: Segmentation,
) -> Chord:
    first, last, state = run
    onset = slices[first].onset
    duration = slices[last - 1].onset + slices[last - 1].duration - onset
    if state is None:
        return Chord(index, onset, duration, first, last, None, None, 1.0)
    heard = _heard(score, slices[first:last])
    shares = _shares(evidence, found, first, last)
    root, quality = int(ROOT_OF[state]), QUALITIES[QUALITY_OF[state]]
    by_root = shares.reshape(ROOTS, -1).sum(axis=1)
    confidence = float(min(by_root[root], 1.0))
    by_root[root] = 0.0
    other = int(by_root.argmax())
    runner_up = None
    if by_root[other] >= WORTH_NAMING:
        other_quality = QUALITIES[int(shares.reshape(ROOTS, -1)[other].argmax())]
        runner_up = (spell_root(other, other_quality, heard), other_quality)
    name = spell_root(root, quality, heard)
    return Chord(index, onset, duration, first, last, name, quality, confidence, runner_up)


def _shares(evidence: Evidence, found: Segmentation, first: int, last: int) -> Floats:
    """Posterior of the states over the sounding time of a run, shape (120,)."""
    weight = np.where(evidence.bass[first:last] >= 0, np.diff(evidence.time[first : last + 1]), 0)
    return np.asarray(weight @ found.posterior[first:last] / weight.sum(), dtype=np.float64)


def _heard(score: Score, slices: tuple[Slice, ...]) -> list[tuple[PitchClass, float]]:
    time: dict[PitchClass, Fraction] = defaultdict(Fraction)
    for piece in slices:
        for note in piece.notes:
            time[score.notes[note].pitch.pitch_class] += piece.duration
    return [(pitch_class, float(duration)) for pitch_class, duration in time.items()]
