"""Just-intonation targets for every note of a choral score.

======================  ==========================================================
``read``                a score file -> `Score`, as played
``analyse``             `Score` -> `Harmony`: chord by chord, the local root
``tune``                `Score`, `Harmony`, `Policy` -> `TunedScore`
``write``               `TunedScore` -> files of the chosen exporters in a folder
``Policy``              what the director asks of the tuning
``ReadOptions``         how a file is read: repeats, fermatas, accompaniment, limits
``RetuneError``         what every function raises: what, where, what to do next
======================  ==========================================================

For example::

    import retune

    score = retune.read("hymn.musicxml")
    harmony = retune.analyse(score)
    tuned = retune.tune(score, harmony, retune.Policy(prime_limit=5))
    retune.write(tuned, ["midi", "scala", "notes"], "out")

Names load on first use, so that importing the package costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from retune.errors import RetuneError
    from retune.harmony import analyse
    from retune.pipeline import write
    from retune.score.options import ReadOptions
    from retune.score.read import read
    from retune.tuning import tune
    from retune.tuning.policy import Policy

__version__ = "0.1.0"
__all__ = ["Policy", "ReadOptions", "RetuneError", "analyse", "read", "tune", "write"]

_HOMES = {
    "Policy": "retune.tuning.policy",
    "ReadOptions": "retune.score.options",
    "RetuneError": "retune.errors",
    "analyse": "retune.harmony",
    "read": "retune.score.read",
    "tune": "retune.tuning",
    "write": "retune.pipeline",
}


def __getattr__(name: str) -> object:
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'retune' has no attribute '{name}'")


def __dir__() -> list[str]:
    return sorted([*__all__, "__version__"])
