"""From a score and its harmony to the tuned score."""

from __future__ import annotations

import numpy as np

from retune.choices import NO_CHOICES, Choices
from retune.errors import Finding, WishError
from retune.harmony.model import Harmony
from retune.pitch import PitchClass
from retune.score.model import Score
from retune.tuning import figures
from retune.tuning.alternatives import options_of, preferred, that_agree
from retune.tuning.assemble import Assembler, root_cents
from retune.tuning.choose import Chooser
from retune.tuning.findings import findings
from retune.tuning.fixed import CentsOf, accompaniment, temperament
from retune.tuning.ground import make_ground
from retune.tuning.intervals import Floats
from retune.tuning.layout import Layout, lay_out
from retune.tuning.model import TunedScore
from retune.tuning.placement import Problem, place
from retune.tuning.policy import Policy
from retune.tuning.ratios import scale_cents
from retune.tuning.targets import aim


def tune(
    score: Score, harmony: Harmony, policy: Policy, choices: Choices = NO_CHOICES
) -> TunedScore:
    """Give every note its tuned pitch.

    Parameters
    ----------
    score : Score
    harmony : Harmony
        The analysis of that score.
    policy : Policy
    choices : Choices, optional
        The director's decisions; in a temperament they bear on nothing but the roots.

    Raises
    ------
    WishError
        Where the policy names a part that the score does not have.
    """
    lead = _lead(score, policy.melody)
    tonic = policy.tonic or harmony.tonic.root
    layout = lay_out(score, harmony)
    ground = make_ground(score, harmony, layout, policy, tonic, lead, choices)
    options = options_of(score, harmony, ground.limit.tolist())
    options = that_agree(options, layout, ground.ratios)
    targets = aim(layout, harmony, preferred(options), ground)
    tempered = temperament(policy.temperament, tonic)
    unmoving = accompaniment(policy.accompaniment_tuning, tonic)

    found: tuple[Finding, ...] = ()
    fixed = _piece_cents(score, layout, unmoving)
    if tempered is None:
        home = ground.at_home(harmony)
        root = np.array([unmoving(c.root) if c.root else 0.0 for c in harmony.chords])
        choice = Chooser(layout, options, targets.roots, home, root, ground).search()
        targets = aim(layout, harmony, choice.templates, ground)
        start = targets.place + (choice.roots - targets.roots)[layout.chord]
        problem = Problem(layout, targets, policy, ground, start, fixed, root[layout.chord])
        x = place(problem)
        found = findings(score, harmony, layout, options, choice.templates, x, problem.cap)
        scale = _home_scale(tonic, policy.prime_limit)
        roots = root_cents(layout, harmony, targets, x, scale)
    else:
        x = np.where(layout.tuned, _piece_cents(score, layout, tempered), fixed)
        scale = tempered
        roots = tuple(tempered(c.root) if c.root else None for c in harmony.chords)
    just = tempered is None
    assembler = Assembler(score, harmony, layout, targets, x, roots, ground, just)
    return TunedScore(
        score=score,
        harmony=harmony,
        policy=policy,
        notes=assembler.notes(scale, unmoving),
        root_cents=roots,
        figures=figures.all_figures(score, harmony, layout, targets, x, ground, tonic, roots),
        findings=found,
    )


def _lead(score: Score, name: str | None) -> int | None:
    """Index of the part kept smoothest."""
    if name is None:
        return None
    wanted = name.strip().casefold()
    for part in score.parts:
        if part.name.casefold() == wanted:
            return part.index
    names = ", ".join(part.name for part in score.parts)
    raise WishError(f"no part is called '{name}'", hint=f"The parts are {names}")


def _home_scale(tonic: PitchClass, limit: int) -> CentsOf:
    return lambda pitch: scale_cents(pitch.fifths - tonic.fifths, limit)


def _piece_cents(score: Score, layout: Layout, cents_of: CentsOf) -> Floats:
    """Every piece's cents in a tuning that does not move."""
    cents = np.array([cents_of(note.pitch.pitch_class) for note in score.notes])
    pieces: Floats = cents[layout.note]
    return pieces
