"""Which template a chord takes from its surroundings."""

from __future__ import annotations

import random
from fractions import Fraction

import pytest

from retune.harmony import analyse
from retune.harmony.model import Quality
from retune.pitch import Pitch
from retune.score.model import Bar, Note, Part, Score
from retune.tuning import tune
from retune.tuning.alternatives import is_exception, wolves
from retune.tuning.policy import Drift, Policy, Pull
from retune.tuning.ratios import templates
from retune.units import largest_prime
from tests.tuning.textbook import DOM, MAJ, MIN, build


def seventh_of(
    chords: list[tuple[str | None, Quality | None]], voices: list[list[str | None]]
) -> str:
    """Ratio of the note F4 in the second chord."""
    tuned = tune(*build(chords, voices), Policy())
    return next(
        str(segment.ratio)
        for one in tuned.notes
        for segment in one.segments
        if segment.chord == 1 and one.note.pitch.name == "F4"
    )


def test_a_seventh_held_from_the_subdominant_is_its_root() -> None:
    # F, the root of IV (4/3), stays as the seventh of V (3/2): (4/3) / (3/2) = 16/9.
    voices: list[list[str | None]] = [
        ["F4", "F4", "E4"],
        ["C4", "B3", "C4"],
        ["A3", "G3", "G3"],
        ["F3", "G2", "C3"],
    ]
    assert seventh_of([("F", MAJ), ("G", DOM), ("C", MAJ)], voices) == "16/9"


def test_a_seventh_struck_over_a_held_fifth_is_pure_above_it() -> None:
    # D sounds on as the fifth of V and F comes in a pure minor third above it: 3/2 * 6/5 = 9/5.
    voices: list[list[str | None]] = [
        ["D4", "F4", "E4"],
        ["B3", "D4", "C4"],
        ["G3", "B3", "G3"],
        ["G2", "G2", "C3"],
    ]
    assert seventh_of([("G", MAJ), ("G", DOM), ("C", MAJ)], voices) in ("9/5", "16/9")
    # Without surroundings, the purer chord is taken.
    assert seventh_of([(None, None), ("G", DOM)], [[None, one[1]] for one in voices]) == "9/5"


def test_what_a_template_costs() -> None:
    whole = frozenset({0, 1, 2, 3})
    pure, even = templates(Quality.DOMINANT_SEVENTH, 5)
    assert wolves(pure, whole, 5) == 0.0
    # 32/27 between fifth and seventh instead of 6/5: one comma.
    assert wolves(even, whole, 5) == pytest.approx(21.506**2, abs=0.05)
    assert wolves(even, frozenset({0, 1, 3}), 5) == 0.0
    # A tempered diminished seventh: minor thirds and a major sixth, each 15.641 off.
    tempered = templates(Quality.DIMINISHED_SEVENTH, 5)[0]
    assert wolves(tempered, whole, 5) == pytest.approx(4 * 15.641**2, abs=0.1)
    harmonic, *others = templates(Quality.DOMINANT_SEVENTH, 7)
    assert wolves(harmonic, whole, 7) == 0.0
    assert not is_exception(harmonic, harmonic)
    assert all(is_exception(other, harmonic) for other in others)
    assert not is_exception(even, pure)


def invented(seed: int, parts: int, count: int = 60) -> Score:
    """Random lines with rests, ties over bars and leaps; no music at all."""
    chance = random.Random(seed)
    notes = []
    for part in range(parts):
        onset = Fraction(0)
        while onset < count:
            length = Fraction(chance.choice((1, 1, 2, 2, 3, 4, 8)), chance.choice((1, 2, 3)))
            if chance.random() < 0.8:
                step, alter = chance.choice("CDEFGAB"), chance.choice((0, 0, 0, 0, 1, -1))
                notes.append(Note(part, onset, length, Pitch(step, alter, chance.choice((3, 4)))))
            onset += length
    notes.sort(key=lambda note: (note.onset, note.part, note.pitch.key))
    bars = tuple(Bar(i, i, str(i + 1), Fraction(4 * i), Fraction(4)) for i in range(count // 4 + 2))
    names = tuple(Part(i, f"Part {i + 1}") for i in range(parts))
    return Score("invented", "", names, tuple(notes), bars)


WISHES = [
    Policy(),
    Policy(drift=Drift.WITHIN, drift_within=5.0, held_shift=1.0),
    Policy(drift=Drift.FOLLOW, prime_limit=7),
    Policy(drift=Drift.ANCHORED, held_shift=0.0, prime_limit=3, melody="Part 1"),
    Policy(held_shift=0.01, accompaniment_pull=Pull.ALL),
]


@pytest.mark.parametrize("wish", WISHES)
@pytest.mark.parametrize(("seed", "parts"), [(1, 1), (2, 2), (3, 4), (4, 9)])
def test_whatever_is_played_the_promises_hold(seed: int, parts: int, wish: Policy) -> None:
    score = invented(seed, parts)
    tuned = tune(score, analyse(score), wish)
    assert [one.note for one in tuned.notes] == list(score.notes)
    for one in tuned.notes:
        assert one.segments[0].onset == one.note.onset
        assert one.segments[-1].end == one.note.end
        for before, after in zip(one.segments, one.segments[1:], strict=False):
            assert before.end == after.onset
            assert abs(after.cents - before.cents) <= wish.held_shift + 0.005
        for segment in one.segments:
            assert segment.ratio is None or largest_prime(segment.ratio) <= wish.prime_limit
            assert abs(segment.cents) < (600.0 if wish.drift is Drift.FOLLOW else 130.0)


def test_a_chord_of_minor_thirds_keeps_its_common_tones_held() -> None:
    tuned = tune(
        *build(
            [("A", MIN), ("F", MAJ)],
            [["E5", "F5"], ["C5", "C5"], ["A4", "A4"]],
        ),
        Policy(),
    )
    for one in tuned.notes:
        cents = [segment.cents for segment in one.segments]
        assert max(cents) - min(cents) < 0.5
