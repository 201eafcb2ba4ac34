"""Ratios, targets and tuned pitches.

`tune` is loaded when asked for, so that policies can be named without numpy.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from retune.tuning.tuner import tune as tune

__all__ = ["tune"]


def __getattr__(name: str) -> Any:
    if name == "tune":
        from retune.tuning.tuner import tune

        return tune
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
