"""The templates each chord may take, and how good each is in itself.

Conventions
-----------
* Alternatives stand in order of preference; a chord that does not sound has none.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction
from functools import cache
from itertools import combinations

import numpy as np

from retune.harmony.model import Degree, Harmony
from retune.score.model import Score
from retune.tuning.intervals import CONSONANT, consonances, nearest
from retune.tuning.layout import Layout
from retune.tuning.ratios import AUGMENTED_SIXTH, Template, templates, with_added

Options = list[tuple[Template, ...]]
"""The alternatives of each chord."""

_DOMINANT = (0, 4, 7, 10)


def sixth_chords(score: Score, harmony: Harmony) -> frozenset[int]:
    """Chords whose seventh is spelled as an augmented sixth above the root."""
    found = set()
    for fragment in harmony.fragments:
        if fragment.degree is Degree.SEVENTH:
            root = harmony.chords[fragment.chord].root
            pitch = score.notes[fragment.note].pitch.pitch_class
            if root is not None and pitch.fifths - root.fifths == AUGMENTED_SIXTH:
                found.add(fragment.chord)
    return frozenset(found)


@cache
def wolves(template: Template, degrees: frozenset[int], limit: int) -> float:
    """Sum of the squared cents by which the sounding consonances of a template are impure.

    >>> from retune.harmony.model import Quality
    >>> ninth, sixteen = templates(Quality.DOMINANT_SEVENTH, 5)
    >>> wolves(ninth, frozenset({0, 1, 2, 3}), 5)
    0.0
    >>> round(wolves(sixteen, frozenset({0, 1, 2, 3}), 5) ** 0.5, 3)
    21.506
    """
    total = 0.0
    for low, high in combinations(sorted(degrees), 2):
        apart = (template.semitones[high] - template.semitones[low]) % 12
        if CONSONANT[apart]:
            cents = template.cents[high] - template.cents[low]
            pure = nearest(consonances(limit), np.array([apart]), np.array([cents]))[0]
            total += round(abs(cents - float(pure)), 9) ** 2
    return total


def is_exception(template: Template, first: Template) -> bool:
    """Whether a dominant seventh is not 4:5:6:7 where that is preferred."""
    return template.semitones[:4] == _DOMINANT and template.limit < 7 <= first.limit


def options_of(score: Score, harmony: Harmony, limits: Sequence[int]) -> Options:
    """The templates each chord may take, the preferred one first; none where nothing sounds.

    `limits` holds the prime limit of each chord.
    """
    sixths = sixth_chords(score, harmony)
    return [
        tuple(
            with_added(one, chord.added, limit)
            for one in templates(chord.quality, limit, chord.index in sixths)
        )
        if chord.quality
        else ()
        for chord, limit in zip(harmony.chords, limits, strict=True)
    ]


def that_agree(options: Options, layout: Layout, ratios: Mapping[int, Fraction]) -> Options:
    """The alternatives that hold the ratios given to single pieces, where a chord has any."""
    kept = list(options)
    for piece, ratio in ratios.items():
        chord, degree = int(layout.chord[piece]), int(layout.degree[piece])
        agreeing = tuple(
            one
            for one in kept[chord]
            if one.ratios is not None
            and 0 <= degree < len(one.ratios)
            and one.ratios[degree] == ratio
        )
        kept[chord] = agreeing or kept[chord]
    return kept


def preferred(options: Options) -> tuple[Template | None, ...]:
    """The first alternative of each chord."""
    return tuple(next(iter(one), None) for one in options)
