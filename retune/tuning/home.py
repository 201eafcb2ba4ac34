"""The home tonic through a piece: where its tuned pitch lies, and the scale on it."""

from __future__ import annotations

from fractions import Fraction

from retune.pitch import PitchClass
from retune.tuning.fixed import CentsOf, temperament
from retune.tuning.model import TunedScore
from retune.tuning.ratios import scale_cents

_HEARD = 0.05
"""Cents; smaller movements of the tonic are none."""

_PLAIN_FIFTH = 1
"""Chords this far from the tonic on the line of fifths say where it lies: their roots are pure
fifths from it, while those further away stand on either side of a comma."""


def home_tonic(tuned: TunedScore) -> PitchClass:
    """The tonic that everything is measured against: the user's, else the one found."""
    return tuned.policy.tonic or tuned.harmony.tonic.root


def home_scale(tuned: TunedScore) -> CentsOf:
    """Cents of a spelled pitch class in the scale on the home tonic, as if it stood at 0.

    The just scale, or the temperament in force.
    """
    tonic = home_tonic(tuned)
    tempered = temperament(tuned.policy.temperament, tonic)
    if tempered is not None:
        return tempered
    limit = tuned.policy.prime_limit
    return lambda pitch: scale_cents(pitch.fifths - tonic.fifths, limit)


def tonic_path(tuned: TunedScore) -> tuple[tuple[Fraction, float], ...]:
    """Where the home tonic's tuned pitch lies: (onset, cents), from onset 0 on.

    Chords on the tonic and on its upper and lower fifth tell it by their roots; it stays between
    them. Before the first of them it lies where that one says, and at 0 where there is none.
    """
    tonic, scale = home_tonic(tuned), home_scale(tuned)
    path: list[tuple[Fraction, float]] = []
    for chord, cents in zip(tuned.harmony.chords, tuned.root_cents, strict=True):
        if chord.root is None or cents is None:
            continue
        if abs(chord.root.fifths - tonic.fifths) <= _PLAIN_FIFTH:
            found = cents - scale(chord.root)
            if not path or abs(path[-1][1] - found) > _HEARD:
                path.append((chord.onset, found))
    if not path:
        return ((Fraction(0), 0.0),)
    return ((Fraction(0), path[0][1]), *path[1:])
