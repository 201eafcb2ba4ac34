"""The figures of a stretch that was cut out of a tuned score."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from retune.tuning import figures
from retune.tuning.alternatives import options_of, preferred
from retune.tuning.ground import make_ground
from retune.tuning.home import home_tonic
from retune.tuning.layout import lay_out
from retune.tuning.model import TunedScore
from retune.tuning.targets import aim


def refigured(tuned: TunedScore) -> TunedScore:
    """The same score with its figures counted anew, from its tuned pitches as they are."""
    score, harmony = tuned.score, tuned.harmony
    layout, tonic = lay_out(score, harmony), home_tonic(tuned)
    ground = make_ground(score, harmony, layout, tuned.policy, tonic, None)
    templates = preferred(options_of(score, harmony, ground.limit.tolist()))
    targets = aim(layout, harmony, templates, ground)
    x = np.zeros(len(layout.note))
    for piece, (note, first) in enumerate(zip(layout.note, layout.first, strict=True)):
        onset = harmony.slices[first].onset
        segments = tuned.notes[note].segments
        x[piece] = next((s for s in segments if s.onset <= onset < s.end), segments[-1]).cents
    counted = figures.all_figures(
        score, harmony, layout, targets, x, ground, tonic, tuned.root_cents
    )
    return replace(tuned, figures=counted)
