"""Slices, roots and qualities, non-chord tones.

`analyse` takes a `Score` and gives its `Harmony`; the values are described in `model`.
"""

from retune.harmony.analysis import analyse
from retune.harmony.model import (
    Chord,
    Degree,
    Fragment,
    Harmony,
    Quality,
    Role,
    Slice,
    Tonic,
)

__all__ = [
    "Chord",
    "Degree",
    "Fragment",
    "Harmony",
    "Quality",
    "Role",
    "Slice",
    "Tonic",
    "analyse",
]
