"""The notes before and after each note in its part.

Conventions
-----------
* Neighbours abut: one begins where the other ends. A rest between means there is none.
* Where a part plays chords, the neighbour is the nearest pitch, the lower of two as near.
"""

from __future__ import annotations

import numpy as np

from retune.harmony.states import Ints

NO_NEIGHBOUR = 99
"""Stands for the interval to a neighbour that does not exist."""
_SPREAD = 1024
"""Wider than any interval between two keys."""


def find_neighbours(part: Ints, key: Ints, first: Ints, last: Ints) -> tuple[Ints, Ints]:
    """Semitones from the note before, and to the note after, upwards positive.

    Parameters
    ----------
    part, key, first, last : int64 arrays, shape (notes,)
        Part, MIDI key, and the boundaries at which each note begins and ends.
    """
    moments = int(last.max(initial=0)) + 1
    begins, ends = part * moments + first, part * moments + last
    return -_nearest(ends, key, begins), _nearest(begins, key, ends)


def _nearest(moments: Ints, keys: Ints, wanted: Ints) -> Ints:
    """Interval from each note to the nearest key among those whose moment is the wanted one."""
    if len(keys) == 0:
        return np.zeros(0, dtype=np.int64)
    there = np.unique(moments * _SPREAD + keys)
    here = wanted * _SPREAD + keys
    place = np.searchsorted(there, here)
    nearest = np.full(len(keys), NO_NEIGHBOUR)
    for found in (place, place - 1):
        valid = (found >= 0) & (found < len(there))
        interval = there[np.clip(found, 0, len(there) - 1)] - here
        closer = valid & (np.abs(interval) <= np.minimum(np.abs(nearest), NO_NEIGHBOUR - 1))
        nearest[closer] = interval[closer]
    return nearest
