"""What every piece aims at: its just distance from its root, and its place in the home scale.

Conventions
-----------
* `just` is a chord tone's distance from equal temperament above an untempered root, in cents; 0
  for every other piece.
* `place` is where a piece would stand in the just scale on the home tonic, in cents.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from retune.harmony.model import Harmony, Quality
from retune.tuning.ground import Ground
from retune.tuning.intervals import Flags, Floats
from retune.tuning.layout import Layout
from retune.tuning.ratios import DEGREES, Template, scale_cents
from retune.units import largest_prime, ratio_to_cents

TRIAD_TONES = 3
_TRIADS = (Quality.MAJOR, Quality.MINOR)


@dataclass(frozen=True)
class Targets:
    """Targets of all pieces under one choice of templates.

    Parameters
    ----------
    templates : tuple of Template or None, one for each chord
    roots : ndarray, shape (chords,)
        Where each chord's root would stand in the home scale, in cents.
    just, place : ndarray, shape (pieces,)
    tone : ndarray of bool, shape (pieces,)
        Chord tones that sound with something else.
    septimal : ndarray of bool, shape (pieces,)
        Chord tones whose ratio holds the prime 7.
    triad, home : ndarray of bool, shape (pieces,)
        Whether the piece's chord is a major or minor triad and the piece is no tone added to it;
        whether its root is the tonic in force.
    level : ndarray, shape (pieces,)
        Where that tonic stands, in cents.
    decided : ndarray of bool, shape (pieces,)
        Pieces whose ratio the director gave.
    """

    templates: tuple[Template | None, ...]
    roots: Floats
    just: Floats
    place: Floats
    tone: Flags
    septimal: Flags
    triad: Flags
    home: Flags
    level: Floats
    decided: Flags


def _chord_places(
    layout: Layout, harmony: Harmony, just: Floats, own: Floats, tone: Flags
) -> Floats:
    """Each chord's root, placed so that its tones lie closest to the scale."""
    count = len(harmony.chords)
    weight = np.where(tone, layout.length, 0.0)
    total = np.bincount(layout.chord, weight, minlength=count)
    summed = np.bincount(layout.chord, weight * (own - just), minlength=count)
    return np.divide(summed, total, out=np.zeros(count), where=total > 0.0)


def aim(
    layout: Layout,
    harmony: Harmony,
    templates: tuple[Template | None, ...],
    ground: Ground,
) -> Targets:
    """The targets of every piece.

    Parameters
    ----------
    templates : tuple
        The template chosen for each chord; None where nothing sounds.
    ground : Ground
        Tonics, limits and the director's ratios.
    """
    cents = np.zeros((len(harmony.chords), len(DEGREES) + 1))
    septimal = np.zeros(cents.shape, dtype=bool)
    for index, template in enumerate(templates):
        if template is not None:
            cents[index, : len(template.cents)] = template.cents
            septimal[index, : len(template.cents)] = template.septimal
    just = cents[layout.chord, layout.degree]
    tone = (layout.degree >= 0) & ~layout.lone
    own = _in_scale(layout, ground)
    natural = septimal[layout.chord, layout.degree]
    decided = np.zeros(len(layout.note), dtype=bool)
    for piece, ratio in ground.ratios.items():
        if not layout.lone[piece]:
            just[piece] = above_root(layout, harmony, piece, ratio)
            decided[piece] = tone[piece] = True
            natural[piece] = largest_prime(ratio) == 7
    roots = _chord_places(layout, harmony, just, own, tone)
    triad = np.array([chord.quality in _TRIADS for chord in harmony.chords], dtype=bool)
    home = ground.at_home(harmony)
    return Targets(
        templates=templates,
        roots=roots,
        just=np.where(tone, just, 0.0),
        place=np.where(tone, just + roots[layout.chord], own),
        tone=tone,
        septimal=tone & natural,
        triad=triad[layout.chord] & (layout.degree < TRIAD_TONES),
        home=home[layout.chord],
        level=ground.level[layout.chord],
        decided=decided,
    )


def _in_scale(layout: Layout, ground: Ground) -> Floats:
    """Each piece's place in the just scale on the tonic in force, in cents."""
    spread = {
        limit: np.array([scale_cents(fifths, limit) for fifths in range(-60, 61)])
        for limit in np.unique(ground.limit).tolist()
    }
    above = np.clip(layout.fifths - ground.tonic[layout.chord], -60, 60) + 60
    limits = ground.limit[layout.chord]
    own = np.zeros(len(layout.note))
    for limit, scale in spread.items():
        chosen = limits == limit
        own[chosen] = scale[above[chosen]]
    return own + ground.level[layout.chord]


def above_root(layout: Layout, harmony: Harmony, piece: int, ratio: Fraction) -> float:
    """A ratio's distance from a piece's tempered one above its root, in cents; -600 to 600."""
    root = harmony.chords[int(layout.chord[piece])].root
    steps = (int(layout.key[piece]) - (root.chroma if root is not None else 0)) % 12
    return (ratio_to_cents(ratio) - 100.0 * steps + 600.0) % 1200.0 - 600.0
