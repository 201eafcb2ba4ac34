"""The package's own figures against definitions written apart from it, for the benchmark."""

from __future__ import annotations

import json
from collections.abc import Callable

import pytest

from retune.harmony.model import Harmony
from retune.score.model import Score
from retune.tuning import tune
from retune.tuning.policy import Drift, Policy, Temperament
from tests.benchmarks.tuning_measures import measure
from tests.tuning.textbook import DOM, MAJ, MIN, benedetti, build, pump


def cadence() -> tuple[Score, Harmony]:
    chords = [("C", MAJ), ("A", MIN), ("D", MIN), ("G", DOM), ("C", MAJ)]
    return build(
        chords,
        [
            ["G4", "A4", "A4", "G4", "G4"],
            ["E4", "E4", "F4", "F4", "E4"],
            ["C4", "C4", "D4", "B3", "C4"],
            ["C3", "A2", "D3", "G2", "C3"],
        ],
    )


PIECES = {"pump": lambda: pump(3), "benedetti": lambda: benedetti(3), "cadence": cadence}
POLICIES = {
    "default": Policy(),
    "any": Policy(held_shift=float("inf")),
    "seven": Policy(prime_limit=7),
    "three": Policy(prime_limit=3),
    "follow": Policy(drift=Drift.FOLLOW),
    "equal": Policy(temperament=Temperament.EQUAL),
    "meantone": Policy(temperament=Temperament.MEANTONE),
}


@pytest.mark.parametrize("policy", POLICIES.values(), ids=POLICIES)
@pytest.mark.parametrize("piece", PIECES.values(), ids=PIECES)
def test_figures_agree(piece: Callable[[], tuple[Score, Harmony]], policy: Policy) -> None:
    score, harmony = piece()
    tuned = tune(score, harmony, policy)
    pitching = [[(s.onset, s.end, s.cents) for s in one.segments] for one in tuned.notes]
    apart = measure(score, harmony, pitching, policy.prime_limit)
    figures = tuned.figures
    assert figures["purity"]["mean_cents"] == pytest.approx(apart.vk_mean, abs=1e-5)
    assert figures["purity"]["rms_cents"] == pytest.approx(apart.vk_rms, abs=1e-5)
    assert figures["purity"]["triad_mean_cents"] == pytest.approx(apart.vx_mean, abs=1e-5)
    assert figures["purity"]["triad_rms_cents"] == pytest.approx(apart.vx_rms, abs=1e-5)
    within = 100 * figures["purity"]["triad_time_within_1_cent"]
    assert within == pytest.approx(apart.vx_within_1, abs=1e-3)
    assert figures["held_shift"]["greatest_cents"] == pytest.approx(apart.held_most, abs=1e-5)
    assert figures["held_shift"]["mean_cents"] == pytest.approx(apart.held_mean, abs=1e-5)
    assert figures["held_shift"]["over_5_cents"] == apart.held_over_5
    assert figures["melody"]["mean_cents"] == pytest.approx(apart.melody_mean, abs=1e-5)
    repeated = 100 * figures["melody"]["repeated_over_5_cents"]
    assert repeated == pytest.approx(apart.repeated_over_5, abs=1e-3)
    drift = abs(figures["drift"]["greatest_cents"])
    assert drift == pytest.approx(apart.drift_most, abs=0.1)
    json.dumps(figures, allow_nan=False)


def test_equal_temperament_figures() -> None:
    # A root-position triad: 5/4 misses by 13.686, 3/2 by 1.955, 6/5 by 15.641 cents.
    score, harmony = build([("C", MAJ)], [["G4"], ["E4"], ["C4"]])
    purity = tune(score, harmony, Policy()).figures["purity"]
    assert purity["equal_temperament_mean_cents"] == pytest.approx(31.283 / 3, abs=1e-3)
    assert purity["mean_cents"] == pytest.approx(0.0, abs=1e-3)
    assert purity["triad_time_within_1_cent"] == 1.0


def test_the_bar_of_the_greatest_drift_is_named() -> None:
    tuned = tune(*pump(3), Policy(drift=Drift.FOLLOW))
    drift = tuned.figures["drift"]
    assert drift["bar"] == "13"
    assert drift["greatest_cents"] == pytest.approx(-3 * 21.506, abs=0.15)
    assert drift["final_cents"] == drift["greatest_cents"]
    assert drift["tonic_chords"] == 4
