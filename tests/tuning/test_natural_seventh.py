"""Dominant sevenths 4:5:6:7 in the close-harmony piece: the comma of 64/63 goes where it must.

A tone held over a natural seventh is no pure third from it: 9/8 over 7/4 is 9/7, 435.084 cents
(Barlow 1987, table 2), so it may not draw the chord away.
"""

from __future__ import annotations

import itertools
from fractions import Fraction
from pathlib import Path

import pytest

from retune.harmony import analyse
from retune.harmony.model import Quality
from retune.score.read import read
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy

FIXTURES = Path(__file__).parents[2] / "fixtures"
SEPTIMAL_COMMA = 27.264


@pytest.fixture(scope="module")
def lantern() -> TunedScore:
    score = read(FIXTURES / "lantern-street.musicxml")
    return tune(score, analyse(score), Policy(prime_limit=7))


def test_roots_stay_within_a_septimal_comma_or_so(lantern: TunedScore) -> None:
    roots = [cents for cents in lantern.root_cents if cents is not None]
    # Equal temperament, the just scale and one comma are apart by no more (16 + 27 cents).
    assert max(map(abs, roots)) < 16 + SEPTIMAL_COMMA


def test_a_suspension_over_a_natural_seventh_leaves_the_chord_alone(lantern: TunedScore) -> None:
    score, chords = lantern.score, lantern.harmony.chords
    pairs = [
        (before, after)
        for before, after in itertools.pairwise(chords)
        if score.bar_at(before.onset).number == "12" and after.quality is Quality.DOMINANT_SEVENTH
    ]
    for before, after in pairs:
        one, other = lantern.root_cents[before.index], lantern.root_cents[after.index]
        assert one is not None
        assert other is not None
        assert abs(other - one) < 15


def test_most_sevenths_are_natural(lantern: TunedScore) -> None:
    chords = lantern.harmony.chords
    sevenths = {
        segment.ratio
        for note in lantern.notes
        for segment in note.segments
        if chords[segment.chord].quality is Quality.DOMINANT_SEVENTH
    }
    assert Fraction(7, 4) in sevenths
    assert Fraction(9, 5) not in sevenths
