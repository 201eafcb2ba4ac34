"""The rows of the solve: what every sounding pair, held note, step and anchor asks for.

Conventions
-----------
* Rows refer to unknowns, one for each tuned piece, in piece order.
* Weights as in `policies`; a slice counts by its length in quarter notes.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from retune.tuning.ground import Ground
from retune.tuning.intervals import (
    CONSONANT,
    Flags,
    Floats,
    Ints,
    consonances,
    each_within,
    nearest,
    nearest_directed,
    steps,
)
from retune.tuning.layout import Layout
from retune.tuning.solve import Rows
from retune.tuning.targets import Targets

_PAIRS_AT_ONCE = 400_000
CHOIR = 4
"""Voices to which the weights of links and anchors were set."""
_CENTRE = 100.0
"""Weight of the place of a chord in which the pitch centre is set anew."""
PEDAL = 1e4
"""Weight of the place of a pedal's own notes, which do not give way."""
_DECIDED = 50.0
"""Times `Weights.chord` for pairs with a note whose ratio the director gave."""
_WOLF = 1.0
"""Cents from which a template's interval is a wolf of a consonance."""


def between(links: Ints, weight: Floats, target: Floats) -> Rows:
    """Rows for pairs of unknowns, shape (rows, 2): the right one seen from the left."""
    return Rows(links[:, 0], links[:, 1], weight, target)


def absolute(right: Ints, weight: Floats, target: Floats) -> Rows:
    """Rows that ask for a place rather than a distance."""
    return Rows(np.full(len(right), -1), right, weight, target)


def sounding_pairs(layout: Layout) -> Iterator[tuple[Ints, Ints, Floats]]:
    """Every two tuned pieces that sound together, slice by slice, with the slice's length."""
    sung = layout.tuned[layout.cell_piece]
    pieces, where = layout.cell_piece[sung], layout.cell_slice[sung]
    begin = np.cumsum(layout.voices) - layout.voices
    for voices in np.unique(layout.voices[layout.voices > 1]).tolist():
        slices = np.flatnonzero(layout.voices == voices)
        low, high = np.triu_indices(voices, 1)
        stride = max(1, _PAIRS_AT_ONCE // len(low))
        for some in np.array_split(slices, range(stride, len(slices), stride)):
            chosen = begin[some, None]
            yield (
                pieces[chosen + low].ravel(),
                pieces[chosen + high].ravel(),
                layout.quarters[where[chosen + low]].ravel(),
            )


def chord_rows(
    layout: Layout, targets: Targets, ground: Ground
) -> Iterator[tuple[Ints, Ints, Floats, Floats]]:
    """Left piece, right piece, weight and target of everything that sounds together."""
    weights, limits = ground.weights, ground.limit[layout.chord]
    for left, right, quarters in sounding_pairs(layout):
        limit = limits[right]
        distance = layout.key[right] - layout.key[left]
        apart = distance % 12
        unison = apart == 0
        consonant = CONSONANT[apart]
        tones = targets.tone[left] & targets.tone[right]
        just = targets.just[right] - targets.just[left]
        placed = targets.place[right] - targets.place[left]
        sought = np.where(tones, just, placed)
        pure = each_within(consonances, limit, nearest, apart, sought)
        wolf = tones & consonant & (np.abs(pure - just) > _WOLF)
        drawn = np.where(wolf, weights.pure_share * pure + (1 - weights.pure_share) * just, just)
        other = np.where(consonant, pure, _stepped(limit, distance, placed))
        full = np.where(consonant, 1.0, weights.dissonant) * np.where(
            targets.triad[left] & targets.triad[right] & consonant, weights.triad, 1.0
        )
        # A stranger is no pure third from a natural seventh: 7/4 and 9/8 are 9/7 apart.
        natural = targets.septimal[left] | targets.septimal[right]
        part = np.where(consonant, np.where(natural, 0.0, weights.other), weights.clash)
        weight = np.where(tones, full, np.where(unison, 1.0, part))
        target = np.where(unison, 0.0, np.where(tones, drawn, other))
        decided = tones & (targets.decided[left] | targets.decided[right])
        if decided.any():
            target = np.where(decided, just, target)
            weight = np.where(decided, _DECIDED, weight)
        yield left, right, weights.chord * quarters * weight, target


def _stepped(limits: Ints, distance: Ints, cents: Floats) -> Floats:
    """The just size nearest to each signed distance."""
    return each_within(steps, limits, nearest_directed, distance, cents)


def _led(layout: Layout, ground: Ground, links: Ints) -> Floats:
    """Times the weight of links in the part kept smoothest where they lead to."""
    led = layout.part[links[:, 0]] == ground.lead[layout.chord[links[:, 1]]]
    return np.where(led, ground.weights.lead, 1.0)


def held_weights(layout: Layout, ground: Ground) -> Floats:
    """Weight of each held link."""
    return _led(layout, ground, layout.held) * ground.weights.held


def melodic_weights(layout: Layout, ground: Ground) -> Floats:
    """Weight of each melodic link: repeated notes, steps, the part kept smoothest."""
    weights = ground.weights
    left, right = layout.melodic.T
    repeated = layout.key[left] == layout.key[right]
    alone = layout.lone[left] | layout.lone[right]
    step = np.where(alone, weights.lone, 1.0) * weights.melodic
    led = _led(layout, ground, layout.melodic)
    weighed: Floats = led * np.where(repeated, weights.repeated, step)
    weighed[_centred_anew(layout, ground)] = 0.0
    return weighed


def _centred_anew(layout: Layout, ground: Ground) -> Flags:
    """Steps across which the pitch centre is set anew, which bind nothing."""
    left, right = layout.chord[layout.melodic].T
    crossing: Flags = (left != right) & ground.centred[right]
    return crossing


def melodic_targets(layout: Layout, x: Floats, ground: Ground) -> Floats:
    """The just size nearest to each melodic link as x stands; 0 for repeated notes."""
    left, right = layout.melodic.T
    distance = layout.key[right] - layout.key[left]
    size = _stepped(ground.limit[layout.chord[right]], distance, x[right] - x[left])
    return np.where(distance == 0, 0.0, size)


def anchor_weights(layout: Layout, targets: Targets, ground: Ground) -> Floats:
    """How hard each piece is drawn to its place in the home scale.

    A slice's weight is shared by its voices, up to `CHOIR`; of more voices each has the same, as
    their held and melodic links grow in number too.
    """
    voices = np.clip(layout.voices, 1, CHOIR)
    share = (layout.quarters / voices)[layout.cell_slice]
    chord = layout.chord
    drawn = layout.per_piece(share) * ground.anchor[chord]
    drawn[targets.home] *= ground.tonic_pull[chord][targets.home]
    first = chord == chord[layout.tuned][:1]
    drawn[first] += ground.weights.start * layout.length[first]
    drawn[ground.centred[chord]] += _CENTRE
    return drawn


def bridges(layout: Layout, ground: Ground) -> Ints:
    """Pairs of pieces across boundaries that no held or melodic link of the voices crosses."""
    sung = np.flatnonzero(layout.tuned)
    links = np.concatenate((layout.held, layout.melodic))
    links = links[layout.tuned[links].all(axis=1)]
    crossed = np.unique(layout.first[links[:, 1]])
    # The lowest-numbered piece of each slice that sounds stands for all of it.
    cells = layout.tuned[layout.cell_piece]
    slices, index = np.unique(layout.cell_slice[cells], return_index=True)
    pieces = layout.cell_piece[cells][index]
    fresh = ~np.isin(slices, crossed) & (layout.first[pieces] == slices)
    fresh[:1] = False
    fresh &= ~ground.centred[layout.chord[pieces]]
    after = np.flatnonzero(fresh)
    return np.stack((pieces[after - 1], pieces[after]), axis=1) if len(sung) else links[:0]
