"""Chord symbols of the score as evidence: a wish for a state, never a command.

Conventions
-----------
* Kinds are the kind values of MusicXML 4.0. A kind that none of the ten qualities stands for,
  such as a suspended chord, speaks for its root alone.
* A symbol holds until the next one, at most `HOLDS`; the kind "none" ends it.
* A score with only a few symbols here and there says nothing of the rest: symbols count where
  their own times cover `LEAST_COVER` of the piece.
"""

from __future__ import annotations

import numpy as np

from retune.harmony.metre import TOLERANCE
from retune.harmony.model import Quality
from retune.harmony.states import QUALITIES, STATES, Bytes, Floats
from retune.score.model import ChordSymbol

NO_CHORD = "none"
HOLDS = 8.0
"""Quarter notes: two bars of common time."""
LEAST_COVER = 0.5
QUALITY_OF_KIND: dict[str, Quality] = {
    "major": Quality.MAJOR,
    "major-sixth": Quality.MAJOR,
    "minor": Quality.MINOR,
    "minor-sixth": Quality.MINOR,
    "augmented": Quality.AUGMENTED,
    "augmented-seventh": Quality.AUGMENTED,
    "diminished": Quality.DIMINISHED,
    "diminished-seventh": Quality.DIMINISHED_SEVENTH,
    "half-diminished": Quality.HALF_DIMINISHED,
    "dominant": Quality.DOMINANT_SEVENTH,
    "dominant-ninth": Quality.DOMINANT_SEVENTH,
    "dominant-11th": Quality.DOMINANT_SEVENTH,
    "dominant-13th": Quality.DOMINANT_SEVENTH,
    "major-seventh": Quality.MAJOR_SEVENTH,
    "major-ninth": Quality.MAJOR_SEVENTH,
    "major-11th": Quality.MAJOR_SEVENTH,
    "major-13th": Quality.MAJOR_SEVENTH,
    "minor-seventh": Quality.MINOR_SEVENTH,
    "minor-ninth": Quality.MINOR_SEVENTH,
    "minor-11th": Quality.MINOR_SEVENTH,
    "minor-13th": Quality.MINOR_SEVENTH,
    "major-minor": Quality.MINOR_MAJOR_SEVENTH,
}


def read_symbols(symbols: tuple[ChordSymbol, ...], time: Floats) -> Bytes:
    """How far each state is what the symbols say, shape (n, 120).

    1 for the root, 2 for root and quality; `time` holds the boundaries of the n slices in
    quarter notes, shape (n + 1,).
    """
    wished = np.zeros((len(time) - 1, STATES), dtype=np.int8)
    ordered = sorted(symbols, key=lambda symbol: symbol.onset)
    onsets = np.array([float(symbol.onset) for symbol in ordered])
    ends = np.minimum(np.append(onsets[1:], time[-1]), onsets + HOLDS)
    if (ends - onsets).sum() < LEAST_COVER * time[-1]:
        return wished
    places = np.searchsorted(time[:-1], np.stack([onsets, ends]) - TOLERANCE).tolist()
    for symbol, first, last in zip(ordered, *places, strict=True):
        if symbol.kind == NO_CHORD:
            continue
        low = symbol.root.chroma * len(QUALITIES)
        wished[first:last, low : low + len(QUALITIES)] = 1
        quality = QUALITY_OF_KIND.get(symbol.kind)
        if quality is not None:
            wished[first:last, low + QUALITIES.index(quality)] = 2
    return wished
