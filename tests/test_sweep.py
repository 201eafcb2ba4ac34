"""A slow sample of the sweep over music21's corpus (`tests/benchmarks/sweep.py` does it whole)."""

from __future__ import annotations

import pytest

from tests.benchmarks import sweep


@pytest.mark.slow
def test_one_score_in_twelve_is_done() -> None:
    outcomes = sweep.sweep(sweep.corpus_scores()[::12])
    assert len(outcomes) > 150
    assert [o for o in outcomes if o.state == "crashed" or o.seconds > sweep.MOST_SECONDS] == []
    done = sum(outcome.state == "done" for outcome in outcomes)
    assert done >= 0.99 * len(outcomes), sweep.report(outcomes)
