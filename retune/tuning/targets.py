"""What every piece aims at: its just distance from its root, and its place in the home scale.

Conventions
-----------
* `just` is a chord tone's distance from equal temperament above an untempered root, in cents; 0
  for every other piece.
* `place` is where a piece would stand in the just scale on the home tonic, in cents.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from retune.harmony.model import Harmony, Quality
from retune.pitch import PitchClass
from retune.tuning.intervals import Flags, Floats
from retune.tuning.layout import Layout
from retune.tuning.ratios import DEGREES, Template, scale_cents

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
        whether its root is the home tonic.
    """

    templates: tuple[Template | None, ...]
    roots: Floats
    just: Floats
    place: Floats
    tone: Flags
    septimal: Flags
    triad: Flags
    home: Flags


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
    tonic: PitchClass,
    limit: int,
) -> Targets:
    """The targets of every piece.

    Parameters
    ----------
    templates : tuple
        The template chosen for each chord; None where nothing sounds.
    tonic : PitchClass
        The home tonic, at 0 cents.
    limit : int
        The prime limit in force.
    """
    cents = np.zeros((len(harmony.chords), len(DEGREES) + 1))
    septimal = np.zeros(cents.shape, dtype=bool)
    for index, template in enumerate(templates):
        if template is not None:
            cents[index, : len(template.cents)] = template.cents
            septimal[index, : len(template.cents)] = template.septimal
    just = cents[layout.chord, layout.degree]
    tone = (layout.degree >= 0) & ~layout.lone
    spread = {fifths: scale_cents(fifths, limit) for fifths in range(-60, 61)}
    own = np.array([spread[int(f)] for f in np.clip(layout.fifths - tonic.fifths, -60, 60)])
    roots = _chord_places(layout, harmony, just, own, tone)
    triad = np.array([chord.quality in _TRIADS for chord in harmony.chords], dtype=bool)
    home = np.array([chord.root == tonic for chord in harmony.chords], dtype=bool)
    return Targets(
        templates=templates,
        roots=roots,
        just=np.where(tone, just, 0.0),
        place=np.where(tone, just + roots[layout.chord], own),
        tone=tone,
        septimal=tone & septimal[layout.chord, layout.degree],
        triad=triad[layout.chord] & (layout.degree < TRIAD_TONES),
        home=home[layout.chord],
    )
