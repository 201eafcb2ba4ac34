"""The bundled scores, tuned once for all tests of tracks and sound."""

from __future__ import annotations

from functools import cache
from pathlib import Path

from retune.harmony import analyse
from retune.score.read import read
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy, Temperament

FIXTURES = Path(__file__).parents[2] / "fixtures"
NAMES = tuple(sorted(path.stem for path in FIXTURES.glob("*.musicxml")))


@cache
def tuned(name: str, temperament: Temperament = Temperament.JUST) -> TunedScore:
    """One bundled score, tuned by the default policy but for its temperament."""
    score = read(FIXTURES / f"{name}.musicxml")
    return tune(score, analyse(score), Policy(temperament=temperament))
