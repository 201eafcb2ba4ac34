"""Notes cut at metric accents, and how each piece is approached and left.

Conventions
-----------
* A note is cut once, at the first point of the finest pulse inside it that is stronger than its
  onset. The head tells how the pitch enters, the tail whether it is suspended.
* A tail begins with a slice; where every voice holds through the point it begins with the next.
* A step is one or two semitones.
* "weak" means the piece ends at a stronger moment than it begins.
* Approaches are the ways a non-chord tone can enter and leave; chord tones have one too, but
  there it costs nothing.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from retune.harmony.metre import grid_points, metric_levels
from retune.harmony.neighbours import NO_NEIGHBOUR
from retune.harmony.states import Bools, Ints
from retune.harmony.timeline import Timeline
from retune.score.model import Score

APPROACHES: tuple[str, ...] = (
    "passing weak",
    "passing strong",
    "neighbour weak",
    "neighbour strong",
    "escape weak",
    "escape strong",
    "repeated weak",
    "repeated strong",
    "appoggiatura weak",
    "appoggiatura strong",
    "entry weak",
    "entry strong",
    "anticipation",
    "same again",
    "chordal",
    "suspended",
    "held",
)
"""Names of the approaches; weights carry them, and their places number them."""

_PLACE = {name: i for i, name in enumerate(APPROACHES)}


@dataclass(frozen=True)
class Pieces:
    """Heads and tails of the analysed notes.

    All arrays have shape (pieces,): place in `Timeline.notes`, first and last slice (last
    excluded), place in `APPROACHES`.
    """

    note: Ints
    first: Ints
    last: Ints
    approach: Ints


def cut_notes(score: Score, timeline: Timeline) -> Pieces:
    """Cut every analysed note into a head and, where it crosses an accent, a tail."""
    cut = _cuts(score, timeline)
    into, out = timeline.into, timeline.out
    has_tail = cut < timeline.last
    weak = timeline.level[timeline.first] < timeline.level[cut]
    head = _head_approach(into, out, weak)
    tail = np.where((out < 0) & (out >= -2), _PLACE["suspended"], _PLACE["held"])
    everything = np.arange(len(cut))
    return Pieces(
        note=np.concatenate([everything, everything[has_tail]]),
        first=np.concatenate([timeline.first, cut[has_tail]]),
        last=np.concatenate([cut, timeline.last[has_tail]]),
        approach=np.concatenate([head, tail[has_tail]]),
    )


def _cuts(score: Score, timeline: Timeline) -> Ints:
    """Slice at which each note's tail begins; its last slice where it has none."""
    points = grid_points(score.bars, float(timeline.time[-1]))
    strength = metric_levels(score.bars, points)
    onset = timeline.time[timeline.first]
    level = timeline.level[timeline.first]
    accent = np.full(len(onset), np.inf)
    for value in range(4):
        stronger = np.append(points[strength > value], np.inf)
        rows = level == value
        accent[rows] = stronger[np.searchsorted(stronger, onset[rows] + 1e-6, side="right")]
    cut = np.searchsorted(timeline.time, accent - 1e-6)
    return np.asarray(np.minimum(cut, timeline.last), dtype=np.int64)


def _head_approach(into: Ints, out: Ints, weak: Bools) -> Ints:
    step_in = (np.abs(into) >= 1) & (np.abs(into) <= 2)
    step_out = (np.abs(out) >= 1) & (np.abs(out) <= 2)
    no_in = np.abs(into) == NO_NEIGHBOUR
    leap_in = ~step_in & ~no_in & (into != 0)
    same_way = into * out > 0
    strong = (~weak).astype(np.int64)
    rules = (
        (step_in & step_out & same_way, _PLACE["passing weak"] + strong),
        (step_in & step_out, _PLACE["neighbour weak"] + strong),
        (step_in & (out == 0) & weak, np.full(len(into), _PLACE["anticipation"])),
        (step_in & (out == 0), np.full(len(into), _PLACE["same again"])),
        (step_in, _PLACE["escape weak"] + strong),
        ((into == 0) & step_out, _PLACE["repeated weak"] + strong),
        (leap_in & step_out, _PLACE["appoggiatura weak"] + strong),
        (no_in & step_out, _PLACE["entry weak"] + strong),
    )
    return np.select([rule for rule, _ in rules], [value for _, value in rules], _PLACE["chordal"])
