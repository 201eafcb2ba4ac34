"""What is asked of each chord: the policy of the piece, with the director's choices in place.

Conventions
-----------
* Arrays hold one value for each chord of the harmony unless said otherwise; a chord follows the
  choices in force where it begins.
* A tonic's `level` is where it stands, in cents from equal temperament of its own key.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from fractions import Fraction

import numpy as np

from retune.choices import NO_CHOICES, Choices, PedalChoice, Span
from retune.harmony.model import Harmony
from retune.pitch import PitchClass
from retune.score.model import Score
from retune.tuning.intervals import Flags, Floats, Ints
from retune.tuning.layout import Layout
from retune.tuning.policies import WEIGHTS, Weights
from retune.tuning.policy import Drift, Policy
from retune.tuning.ratios import scale_cents

NONE = -1
"""Stands for no part."""

PEDAL_PULL = 20.0
"""How much harder than in the policy `gentle` everything is drawn to the scale on a pedal: a
chord's tones stay pure among themselves, its place is given by the pedal."""


@dataclass(frozen=True)
class Ground:
    """The wishes for every chord as arrays; `ratios` and `pedals` hold pieces of the layout.

    Parameters
    ----------
    weights : Weights
        Those of the piece's policy; `anchor` and `tonic_pull` replace its own.
    limit : ndarray of int
        Prime limits.
    tonic : ndarray of int
        Place of the tonic on the line of fifths.
    level, anchor, tonic_pull, cap : ndarray
    lead : ndarray of int
        Index of the part kept smoothest, or `NONE`.
    within : ndarray of bool
        Whether the home tonic is bound to a range there.
    centred : ndarray of bool
        Chords in which the pitch centre is set anew.
    ratios : dict of int to Fraction
        Ratios above the root that the director gave to single pieces.
    pedals : ndarray of bool, shape (pieces,)
        Pieces that sound a pedal's own pitch class.
    """

    weights: Weights
    limit: Ints
    tonic: Ints
    level: Floats
    anchor: Floats
    tonic_pull: Floats
    cap: Floats
    lead: Ints
    within: Flags
    centred: Flags
    ratios: dict[int, Fraction] = field(default_factory=dict)
    pedals: Flags = field(default_factory=lambda: np.zeros(0, dtype=bool))

    def at_home(self, harmony: Harmony) -> Flags:
        """Chords whose root is the tonic in force."""
        roots = [None if one.root is None else one.root.fifths for one in harmony.chords]
        return np.array(
            [root == tonic for root, tonic in zip(roots, self.tonic.tolist(), strict=True)],
            dtype=bool,
        )


def make_ground(
    score: Score,
    harmony: Harmony,
    layout: Layout,
    policy: Policy,
    tonic: PitchClass,
    lead: int | None,
    choices: Choices = NO_CHOICES,
) -> Ground:
    """The wishes for every chord of a piece.

    Parameters
    ----------
    tonic : PitchClass
        The home tonic.
    lead : int or None
        Index of the part that the policy keeps smoothest.
    """
    onsets = [chord.onset for chord in harmony.chords]
    count, weights = len(onsets), WEIGHTS[policy.drift]
    ground = Ground(
        weights=weights,
        limit=np.full(count, policy.prime_limit),
        tonic=np.full(count, tonic.fifths),
        level=np.zeros(count),
        anchor=np.full(count, weights.anchor),
        tonic_pull=np.full(count, weights.tonic),
        cap=np.full(count, policy.held_shift),
        lead=np.full(count, NONE if lead is None else lead),
        within=np.full(count, policy.drift is Drift.WITHIN),
        centred=np.zeros(count, dtype=bool),
        pedals=np.zeros(len(layout.note), dtype=bool),
    )
    if choices == NO_CHOICES:
        return ground
    _passages(ground, onsets, choices)
    _centres(ground, harmony, choices)
    for pedal in choices.pedals:
        _pedal(ground, onsets, layout, pedal)
    return replace(ground, ratios=dict(_ratios(score, harmony, layout, choices)))


def _inside(onsets: list[Fraction], span: Span) -> Flags:
    return np.array([span.holds(onset) for onset in onsets], dtype=bool)


def _passages(ground: Ground, onsets: list[Fraction], choices: Choices) -> None:
    for passage in choices.passages:
        inside = _inside(onsets, passage.span)
        if passage.prime_limit is not None:
            ground.limit[inside] = passage.prime_limit
        if passage.drift is not None:
            drift = Drift(passage.drift)
            ground.anchor[inside] = WEIGHTS[drift].anchor
            ground.tonic_pull[inside] = WEIGHTS[drift].tonic
            ground.within[inside] = drift is Drift.WITHIN
        if passage.held_shift is not None:
            ground.cap[inside] = passage.held_shift
        if passage.melody is not None:
            ground.lead[inside] = passage.melody
    for chord in choices.chords:
        if chord.limit is not None:
            end = onsets[-1] + 1 if chord.end is None else chord.end
            inside = _inside(onsets, Span(chord.onset, end))
            if chord.end is None:
                inside = _containing(onsets, chord.onset)
            ground.limit[inside] = chord.limit


def _containing(onsets: list[Fraction], onset: Fraction) -> Flags:
    """The chord that sounds at an onset; chords cover the piece."""
    found = np.zeros(len(onsets), dtype=bool)
    before = [index for index, begins in enumerate(onsets) if begins <= onset]
    if before:
        found[before[-1]] = True
    return found


def _centres(ground: Ground, harmony: Harmony, choices: Choices) -> None:
    onsets = [chord.onset for chord in harmony.chords]
    for centre in sorted(choices.centres, key=lambda one: one.onset):
        here = _containing(onsets, centre.onset)
        later = np.maximum.accumulate(here)
        ground.centred[here] = True
        ground.level[later] = centre.cents
        if centre.tonic is not None:
            ground.tonic[later] = centre.tonic.fifths


def _pedal(ground: Ground, onsets: list[Fraction], layout: Layout, pedal: PedalChoice) -> None:
    """Everything in the span measured against the pedal, which stands where it would at home."""
    inside, fifths = _inside(onsets, pedal.span), pedal.pitch.fifths
    if not inside.any():
        return
    first = int(np.flatnonzero(inside)[0])
    level = pedal.cents
    if level is None:
        above = fifths - int(ground.tonic[first])
        level = float(ground.level[first]) + scale_cents(above, int(ground.limit[first]))
    ground.tonic[inside], ground.level[inside] = fifths, level
    ground.anchor[inside] = PEDAL_PULL * WEIGHTS[Drift.GENTLE].anchor
    ground.within[inside] = False
    ground.pedals[inside[layout.chord] & (layout.key % 12 == pedal.pitch.chroma)] = True


def _ratios(
    score: Score, harmony: Harmony, layout: Layout, choices: Choices
) -> Iterator[tuple[int, Fraction]]:
    """Pieces with a ratio of their own.

    Those of the part's note at the onset, and of its same note again within the chord, which
    could not stand elsewhere without being heard to move.
    """
    onsets = [chord.onset for chord in harmony.chords]
    for choice in choices.ratios:
        here = _containing(onsets, choice.onset)
        own = np.flatnonzero(here[layout.chord] & (layout.part == choice.part))
        notes = [score.notes[int(layout.note[piece])] for piece in own.tolist()]
        meant = {
            note.pitch.key % 12
            for note in notes
            if note.analysed_onset <= choice.onset < note.analysed_end
        }
        for piece, note in zip(own.tolist(), notes, strict=True):
            if note.pitch.key % 12 in meant:
                yield piece, choice.ratio
