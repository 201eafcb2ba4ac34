"""Score to harmony, on one page."""

from __future__ import annotations

from retune.choices import NO_CHOICES, Choices
from retune.harmony.chords import make_chords
from retune.harmony.colour import add_tones
from retune.harmony.evidence import gather_evidence
from retune.harmony.model import Harmony
from retune.harmony.nonchord import find_roles
from retune.harmony.segment import segment
from retune.harmony.timeline import make_slices, make_timeline
from retune.harmony.tonic import find_tonic
from retune.harmony.weights import Weights, default_weights
from retune.pitch import PitchClass
from retune.score.model import Score


def analyse(
    score: Score, tonic: PitchClass | None = None, choices: Choices = NO_CHOICES
) -> Harmony:
    """Find the local root, quality and non-chord tones of a whole score.

    Parameters
    ----------
    score : Score
        The piece as played; it may be silent or empty.
    tonic : PitchClass, optional
        The home tonic where it is known; found otherwise.
    choices : Choices, optional
        Roots and qualities that the director chose. Nothing else of the analysis changes by
        them, but for equal neighbours that become one chord.

    Returns
    -------
    Harmony
        Slices and chords covering the piece without gaps, a fragment for every chord that each
        note sounds in, and the home tonic.
    """
    return analyse_with(score, default_weights(), tonic, choices)


def analyse_with(
    score: Score,
    weights: Weights,
    tonic: PitchClass | None = None,
    choices: Choices = NO_CHOICES,
) -> Harmony:
    """Analyse with other weights than the package's own."""
    timeline = make_timeline(score)
    evidence = gather_evidence(score, timeline)
    found = segment(evidence, weights)
    chords = make_chords(timeline, evidence, found, choices.chords)
    tonic_found = find_tonic(score, evidence, chords, tonic)
    fragments = find_roles(timeline, chords)
    chords, fragments = add_tones(score, timeline.boundaries, chords, fragments)
    return Harmony(
        slices=make_slices(score, timeline),
        chords=chords,
        fragments=fragments,
        tonic=tonic_found,
    )
