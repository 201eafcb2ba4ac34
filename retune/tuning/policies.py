"""What each drift policy asks of the solve, in weights.

Conventions
-----------
* Weights multiply squared cents. Those of chords and anchors are for one quarter note, those of
  held, melodic and repeated notes for one link.

Origin: the least-squares formulation goes back to deLaubenfels (2000-2001) and to Stange, Wick
and Hinrichsen (2018); the weights were set on Bach chorales, Monteverdi's third book and
Palestrina, and change the result little when multiplied or divided by three.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from retune.tuning.policy import Drift


@dataclass(frozen=True, slots=True)
class Weights:
    """Weights of the rows of the solve.

    Parameters
    ----------
    chord : float
        Two chord tones, consonant, in any chord but a triad.
    triad : float
        Times `chord` in major and minor triads.
    dissonant : float
        Times `chord` for a dissonant pair of chord tones.
    pure_share : float
        Share of a chord-tone pair's weight drawn to the pure consonance where its template
        gives a wolf, such as 32/27 for a minor third.
    wolf : float
        Times `chord` for a template's own impure consonances, when templates are chosen.
    other, clash : float
        A pair with a non-chord tone, consonant or dissonant, times `chord`.
    held : float
        A note held into the next piece.
    melodic, repeated : float
        A step or leap, and a note struck again.
    lead : float
        Times `held`, `melodic` and `repeated` in the part kept smoothest.
    lone : float
        Times `melodic` where a line sounds alone.
    anchor : float
        The just scale on the home tonic.
    tonic : float
        Times `anchor` in chords on the home tonic.
    start : float
        The first chord's place.
    bridge : float
        The root's place across a silence, for which nothing else speaks.
    fixed : float
        A voice drawn to a part that cannot move.
    """

    chord: float = 4.0
    triad: float = 2.0
    dissonant: float = 0.2
    pure_share: float = 0.5
    wolf: float = 0.1
    other: float = 0.6
    clash: float = 0.02
    held: float = 1.0
    melodic: float = 0.1
    repeated: float = 5.0
    lead: float = 10.0
    lone: float = 5.0
    anchor: float = 0.05
    tonic: float = 15.0
    start: float = 0.0
    bridge: float = 0.1
    fixed: float = 4.0


_GENTLE = Weights()

WEIGHTS: dict[Drift, Weights] = {
    Drift.FOLLOW: replace(_GENTLE, anchor=1e-6, tonic=1.0, start=1.0),
    Drift.WITHIN: replace(_GENTLE, anchor=0.03, tonic=1.0),
    Drift.GENTLE: _GENTLE,
    Drift.ANCHORED: replace(_GENTLE, anchor=0.2, tonic=30.0),
}
