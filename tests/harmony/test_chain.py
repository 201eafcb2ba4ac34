"""The chain against brute force: every segmentation of a short piece, summed one by one."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import product

import numpy as np
import pytest

from retune.harmony import segment as segment_module
from retune.harmony.chain import covered, posterior
from retune.harmony.evidence import gather_evidence
from retune.harmony.states import ROOT_OF, ROOTS, STATES
from retune.harmony.timeline import make_timeline
from retune.harmony.weights import default_weights
from tests.harmony.invented import score_of

SPANS = 3
LIVE = (0, 17, 84)
"""Three states are enough; the others get no score at all."""


def compositions(count: int) -> Iterator[tuple[int, ...]]:
    if count == 0:
        yield ()
    for first in range(1, min(SPANS, count) + 1):
        for rest in compositions(count - first):
            yield (first, *rest)


def test_posterior_is_the_sum_over_all_segmentations() -> None:
    rng = np.random.default_rng(7)
    count = 4
    table = np.zeros((1, count, SPANS, STATES))
    for start, span, state in product(range(count), range(SPANS), LIVE):
        if start + span < count:
            table[0, start, span, state] = rng.uniform(0.2, 3.0)
    odds = rng.uniform(0.2, 3.0, (STATES, ROOTS))
    total = 0.0
    cover = np.zeros((count, STATES))
    for spans in compositions(count):
        for states in product(LIVE, repeat=len(spans)):
            value, start = 1.0, 0
            for place, (span, state) in enumerate(zip(spans, states, strict=True)):
                value *= table[0, start, span - 1, state]
                if place:
                    value *= odds[states[place - 1], ROOT_OF[state]]
                start += span
            total += value
            start = 0
            for span, state in zip(spans, states, strict=True):
                cover[start : start + span, state] += value
                start += span
    found = posterior(table.astype(np.float32), np.array([count]), odds)
    assert found.log_total[0] == pytest.approx(np.log(total), abs=1e-5)
    np.testing.assert_allclose(covered(found.shares)[0], cover / total, atol=1e-5)


def test_windows_change_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    line = "C5:1 B4:1/2 C5:1/2 D5:1 G4:1 A4:1/2 B4:1/2 C5:1 " * 12
    bass = "C3:1 G2:1 F3:1 E3:1 D3:1 G2:1 " * 12
    score = score_of(line, "E4:1 D4:1 F4:1 G4:1 " * 18, bass)
    evidence = gather_evidence(score, make_timeline(score))
    whole = segment_module.segment(evidence, default_weights())
    monkeypatch.setattr(segment_module, "WINDOW", 16)
    monkeypatch.setattr(segment_module, "LANES", 3)
    pieces = segment_module.segment(evidence, default_weights())
    np.testing.assert_array_equal(pieces.states, whole.states)
    np.testing.assert_allclose(pieces.posterior, whole.posterior, atol=1e-4)
