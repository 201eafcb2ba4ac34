"""Segments made chords: silence set apart, equal neighbours joined, roots named.

Conventions
-----------
* Silence inside a chord stays in it where it is shorter than `BREATH`; all other silence is a
  chord without root, of confidence 1.
* Confidence is the posterior probability of the root, averaged over the chord's sounding time.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from retune.harmony.evidence import Evidence
from retune.harmony.metre import TOLERANCE
from retune.harmony.model import Chord
from retune.harmony.naming import spell_root
from retune.harmony.segment import Segmentation
from retune.harmony.states import QUALITIES, QUALITY_OF, ROOT_OF, ROOTS, Bools, Floats, Ints
from retune.harmony.timeline import Timeline

BREATH = 1.0
"""Quarter notes."""
WORTH_NAMING = 0.005
"""Least probability of a runner-up."""

_SPELLINGS = 1024

Run = tuple[int, int, int | None]
"""First slice, last slice (excluded) and state; None for silence."""


def make_chords(timeline: Timeline, evidence: Evidence, found: Segmentation) -> tuple[Chord, ...]:
    """The chords of a segmentation, covering all slices."""
    runs = _joined(_runs(evidence, found))
    if not runs:
        return ()
    firsts = np.array([first for first, _, _ in runs])
    shares = _shares(evidence, found, firsts)
    heard = _heard(evidence, firsts)
    return tuple(
        _chord(index, run, timeline, shares[index], heard[index]) for index, run in enumerate(runs)
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
    index: int, run: Run, timeline: Timeline, shares: Floats, heard: list[tuple[int, float]]
) -> Chord:
    first, last, state = run
    onset = timeline.boundaries[first]
    duration = timeline.boundaries[last] - onset
    if state is None:
        return Chord(index, onset, duration, first, last, None, None, 1.0)
    root, quality = int(ROOT_OF[state]), QUALITIES[QUALITY_OF[state]]
    by_root = shares.sum(axis=1)
    confidence = float(min(by_root[root], 1.0))
    by_root[root] = 0.0
    other = int(by_root.argmax())
    runner_up = None
    if by_root[other] >= WORTH_NAMING:
        other_quality = QUALITIES[int(shares[other].argmax())]
        runner_up = (spell_root(other, other_quality, heard), other_quality)
    name = spell_root(root, quality, heard)
    return Chord(index, onset, duration, first, last, name, quality, confidence, runner_up)


def _shares(evidence: Evidence, found: Segmentation, firsts: Ints) -> Floats:
    """Posterior over the sounding time of each run, shape (runs, 12, 10)."""
    weight = np.where(evidence.bass >= 0, evidence.length, 0.0)
    weighted = np.add.reduceat(found.posterior * weight[:, None], firsts, axis=0)
    time = np.maximum(np.add.reduceat(weight, firsts), TOLERANCE)
    return np.asarray((weighted / time[:, None]).reshape(-1, ROOTS, len(QUALITIES)))


def _heard(evidence: Evidence, firsts: Ints) -> list[list[tuple[int, float]]]:
    """Spellings that sound in each run, with their quarter notes."""
    slices = evidence.cells // ROOTS
    run = np.searchsorted(firsts, slices, side="right") - 1
    # One number for run and spelling; spellings lie within a few dozen fifths of C.
    codes, which = np.unique(
        run * _SPELLINGS + evidence.fifths + _SPELLINGS // 2, return_inverse=True
    )
    quarters = np.bincount(which, evidence.length[slices])
    heard: list[list[tuple[int, float]]] = [[] for _ in firsts]
    for code, time in zip(codes.tolist(), quarters.tolist(), strict=True):
        index, spelling = divmod(code, _SPELLINGS)
        heard[index].append((spelling - _SPELLINGS // 2, time))
    return heard
