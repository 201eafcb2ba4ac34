"""States of slices made chords: rests told apart, equal neighbours joined, roots named.

Conventions
-----------
* A rest of all parts up to `BREATH` belongs to the chord before it; longer silence, and silence
  at the start, is a chord without root, of confidence 1.
* Confidence is the posterior probability of the root, averaged over the chord's sounding time.
  The weights were learned from music in several parts, so it is lowered where a line sounds
  alone, down to `LONE_LINE` of itself.
* Where one pitch class is all that sounds, the chord is a plain major or minor one.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from retune.choices import ChordChoice
from retune.harmony.evidence import Evidence
from retune.harmony.metre import TOLERANCE
from retune.harmony.model import Chord, Quality
from retune.harmony.naming import spell_root
from retune.harmony.segment import Segmentation
from retune.harmony.states import QUALITIES, QUALITY_OF, ROOT_OF, ROOTS, Floats, Ints
from retune.harmony.timeline import Timeline

BREATH = 2.0
"""Quarter notes."""
LONE_LINE = 0.6
WORTH_NAMING = 0.005
"""Least probability of a runner-up."""

_SPELLINGS = 1024

_MAJOR, _MINOR = (QUALITIES.index(quality) for quality in (Quality.MAJOR, Quality.MINOR))
_SILENCE = -1
"""The state of slices in which nothing sounds and no chord lasts."""


def make_chords(
    timeline: Timeline,
    evidence: Evidence,
    found: Segmentation,
    choices: Sequence[ChordChoice] = (),
) -> tuple[Chord, ...]:
    """The chords of a segmentation, covering all slices; those that were chosen as chosen."""
    if evidence.count == 0:
        return ()
    states = _plain_where_lone(evidence, _with_rests(evidence, found.states))
    decided = _decide(timeline, found, states, choices)
    chords = _chords(timeline, evidence, found, states)
    return tuple(_as_decided(chord, decided) for chord in chords) if decided else chords


def _chords(
    timeline: Timeline, evidence: Evidence, found: Segmentation, states: Ints
) -> tuple[Chord, ...]:
    firsts = _firsts(states)
    lasts = [*firsts[1:].tolist(), evidence.count]
    shares = _shares(evidence, found, firsts) * _trust(evidence, firsts)[:, None, None]
    heard = _heard(evidence, firsts)
    return tuple(
        _chord(index, (first, last), int(states[first]), timeline, shares[index], heard[index])
        for index, (first, last) in enumerate(zip(firsts.tolist(), lasts, strict=True))
    )


def _decide(
    timeline: Timeline, found: Segmentation, states: Ints, choices: Sequence[ChordChoice]
) -> dict[int, ChordChoice]:
    """Set the states of chosen chords; returns the choices by slice."""
    decided: dict[int, ChordChoice] = {}
    firsts = _firsts(states).tolist()
    for choice in choices:
        if choice.root is None and choice.quality is None:
            continue
        first = max(bisect_right(timeline.boundaries, choice.onset) - 1, 0)
        if choice.end is None:
            after = bisect_right(firsts, first)
            last = firsts[after] if after < len(firsts) else len(states)
        else:
            last = max(bisect_right(timeline.boundaries, choice.end) - 1, first + 1)
        last = min(last, len(states))
        state = _chosen(found, states, first, last, choice)
        if state is None:
            continue
        sounding = states[first:last] != _SILENCE
        states[first:last][sounding] = state
        decided |= dict.fromkeys(range(first, last), choice)
    return decided


def _chosen(
    found: Segmentation, states: Ints, first: int, last: int, choice: ChordChoice
) -> int | None:
    """The state of a choice; a quality it leaves open is the likeliest over the root."""
    before = states[first:last][states[first:last] != _SILENCE]
    if not len(before):
        return None
    root = int(before[0]) // len(QUALITIES) if choice.root is None else choice.root.chroma
    if choice.quality is not None:
        return root * len(QUALITIES) + QUALITIES.index(Quality(choice.quality))
    shares = found.posterior[first:last].reshape(-1, ROOTS, len(QUALITIES))[:, root]
    return root * len(QUALITIES) + int(shares.sum(axis=0).argmax())


def _as_decided(chord: Chord, decided: dict[int, ChordChoice]) -> Chord:
    """A chord that the director chose is sure, and its root spelled as it was chosen."""
    own = next((decided[i] for i in range(chord.first, chord.last) if i in decided), None)
    if own is None or chord.root is None:
        return chord
    root = chord.root
    if own.root is not None and own.root.chroma == root.chroma:
        root = own.root
    return replace(chord, root=root, confidence=1.0, runner_up=None, decided=True)


def _firsts(states: Ints) -> Ints:
    """First slice of each run of one state."""
    return np.flatnonzero(np.diff(states, prepend=_SILENCE - 1))


def _plain_where_lone(evidence: Evidence, states: Ints) -> Ints:
    """States made major or minor, as the surroundings have it, where one pitch class sounds."""
    firsts = _firsts(states)
    lone = np.add.reduceat(evidence.held, firsts, axis=0).astype(bool).sum(axis=1) == 1
    root = states[firsts] // len(QUALITIES)
    run, near = np.arange(len(firsts)), evidence.profile[firsts]
    minor = near[run, (root + 3) % 12] > near[run, (root + 4) % 12]
    plain = root * len(QUALITIES) + np.where(minor, _MINOR, _MAJOR)
    lasting = np.diff(firsts, append=evidence.count)
    return np.where(np.repeat(lone, lasting), np.repeat(plain, lasting), states)


def _trust(evidence: Evidence, firsts: Ints) -> Floats:
    """How far the posterior is to be believed, `LONE_LINE` to 1, by run."""
    tones = evidence.sounding.sum(axis=1)
    sounding = np.add.reduceat(evidence.length * (tones > 0), firsts)
    alone = np.add.reduceat(evidence.length * (tones == 1), firsts)
    return np.asarray(1 - (1 - LONE_LINE) * alone / np.maximum(sounding, TOLERANCE))


def _with_rests(evidence: Evidence, states: Ints) -> Ints:
    """States with silence in its place: short rests last with the chord before."""
    states = states.copy()
    silent = np.concatenate([[False], evidence.bass < 0, [False]])
    starts = np.flatnonzero(silent[1:] & ~silent[:-1])
    ends = np.flatnonzero(silent[:-1] & ~silent[1:])
    for start, end in zip(starts.tolist(), ends.tolist(), strict=True):
        lasts = start > 0 and evidence.time[end] - evidence.time[start] <= BREATH + TOLERANCE
        states[start:end] = states[start - 1] if lasts else _SILENCE
    return states


def _chord(
    index: int,
    slices: tuple[int, int],
    state: int,
    timeline: Timeline,
    shares: Floats,
    heard: list[tuple[int, float]],
) -> Chord:
    first, last = slices
    onset = timeline.boundaries[first]
    duration = timeline.boundaries[last] - onset
    if state == _SILENCE:
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
