"""Which vowel of a singer brings out which of the partials that are shared.

The levels are those of the model of the choir voice on the sung formants of G. Bennett and
X. Rodet, "Synthesis of the singing voice" (in Mathews and Pierce, eds, *Current Directions in
Computer Music Research*, MIT Press 1989), which have a row for soprano, alto, tenor and bass;
mezzo-soprano and baritone lie between two of them. They are targets of a synthesis, not
measurements of singers.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from retune.score.model import VoiceType
from retune.voice.formants import formants
from retune.voice.vowelhint import levels_db

SUNG_VOWELS = ("i", "e", "a", "o", "u")
"""The vowels that the table has."""

_FIRST_TWO = 2


@dataclass(frozen=True, slots=True)
class VowelLevel:
    """How strong one partial is on one vowel.

    `level_db` is its level against the whole tone's power; `formant` (1 or 2) at `formant_hz` is
    the one nearest to it, `cents` how far above it.
    """

    vowel: str
    level_db: float
    formant: int
    formant_hz: float
    cents: float


def vowel_levels(f0: float, voice: VoiceType, partial: int) -> tuple[VowelLevel, ...]:
    """The vowels of the table by how strong they make a partial, the strongest first.

    Parameters
    ----------
    f0 : float
        Hz.
    voice : VoiceType
    partial : int
        From 1, the fundamental.

    >>> [one.vowel for one in vowel_levels(130.8, VoiceType.BASS, 5)][0]
    'a'
    """
    found = []
    for vowel in SUNG_VOWELS:
        first_two = formants(voice, vowel).raised(f0).hz[:_FIRST_TWO]
        apart = [1200.0 * math.log2(hz / (partial * f0)) for hz in first_two]
        nearest = min(range(_FIRST_TWO), key=lambda index: abs(apart[index]))
        level = float(levels_db(f0, voice, vowel)[partial - 1])
        found.append(VowelLevel(vowel, level, nearest + 1, first_two[nearest], apart[nearest]))
    return tuple(sorted(found, key=lambda one: -one.level_db))
