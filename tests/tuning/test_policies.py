"""What each wish of the director does to the tuned pitches."""

from __future__ import annotations

import math
from dataclasses import replace
from fractions import Fraction
from typing import Any

import pytest

from retune.errors import WishError
from retune.harmony.model import Quality
from retune.pitch import PitchClass
from retune.tuning import tune
from retune.tuning.model import TunedNote, TunedScore
from retune.tuning.policy import (
    Drift,
    FixedTuning,
    Policy,
    Pull,
    Temperament,
)
from retune.units import largest_prime, ratio_to_cents
from tests.tuning.textbook import DOM, MAJ, MIN, build, pump

CADENCE = [("C", MAJ), ("F", MAJ), ("G", DOM), ("C", MAJ)]
VOICES: list[list[str | None]] = [
    ["G4", "A4", "G4", "G4"],
    ["E4", "F4", "D4", "E4"],
    ["C4", "C4", "B3", "C4"],
    ["C3", "F2", "G2", "C3"],
]


def by_part(tuned: TunedScore, part: int) -> list[TunedNote]:
    return [one for one in tuned.notes if one.note.part == part]


def ratios(tuned: TunedScore, chord: int) -> set[str]:
    return {
        str(segment.ratio)
        for one in tuned.notes
        for segment in one.segments
        if segment.chord == chord
    }


@pytest.mark.parametrize("limit", [3, 5, 7])
def test_a_plain_cadence_by_prime_limit(limit: int) -> None:
    tuned = tune(*build(CADENCE, VOICES), Policy(prime_limit=limit))
    third = {3: "81/64", 5: "5/4", 7: "5/4"}[limit]
    assert ratios(tuned, 0) == {"1", third, "3/2"}
    for one in tuned.notes:
        for segment in one.segments:
            assert segment.ratio is not None
            assert largest_prime(segment.ratio) <= limit
            # The tuned pitch is that ratio above the chord's root, to a fraction of a cent.
            root = tuned.root_cents[segment.chord]
            name = tuned.harmony.chords[segment.chord].root
            assert root is not None
            assert name is not None
            above = 100 * ((one.note.pitch.key - name.chroma) % 12) + segment.cents - root
            assert above == pytest.approx(ratio_to_cents(segment.ratio), abs=0.7)


def test_the_home_tonic_stands_at_zero() -> None:
    for drift in Drift:
        tuned = tune(*build(CADENCE, VOICES), Policy(drift=drift))
        assert tuned.root_cents[0] == pytest.approx(0.0, abs=1.5)


def test_another_tonic_stands_at_zero_when_asked() -> None:
    tuned = tune(
        *build([("C", MAJ), ("G", MAJ)], [["C4", "B3"], ["E4", "D4"], ["G4", "G4"]]),
        Policy(tonic=PitchClass("G"), drift=Drift.ANCHORED),
    )
    assert tuned.root_cents[1] == pytest.approx(0.0, abs=0.5)


def test_limit_seven_lists_the_exception_that_a_held_note_forces() -> None:
    # F and D are held from a chord on D into the dominant seventh, whose fifth and seventh they
    # become: 6/5 apart before, 7/6 would be wanted after.
    tuned = tune(
        *build(
            [("D", MIN), ("G", DOM), ("C", MAJ)],
            [["F4", "F4", "E4"], ["D4", "D4", "C4"], ["A3", "B3", "C4"], ["D3", "G3", "C3"]],
        ),
        Policy(prime_limit=7),
    )
    assert ratios(tuned, 1) != {"1", "5/4", "3/2", "7/4"}
    assert any("not 7/4" in finding.what and "held" in finding.what for finding in tuned.findings)
    free = tune(
        *build(
            [("C", MAJ), ("G", DOM), ("C", MAJ)],
            [["E4", "F4", "E4"], ["C4", "D4", "C4"], ["G3", "B3", "G3"], ["C3", "G2", "C3"]],
        ),
        Policy(prime_limit=7),
    )
    assert ratios(free, 1) == {"1", "5/4", "3/2", "7/4"}
    assert not any("7/4" in finding.what for finding in free.findings)


def test_an_augmented_sixth_is_known_by_its_spelling() -> None:
    chords = [("C", MIN), ("Ab", DOM), ("G", MAJ)]
    voices: list[list[str | None]] = [
        ["Eb5", "F#5", "G5"],
        ["G4", "Eb4", "D4"],
        ["C4", "C4", "B3"],
        ["C3", "Ab2", "G2"],
    ]
    five, seven = (tune(*build(chords, voices, "C"), Policy(prime_limit=n)) for n in (5, 7))
    assert ratios(five, 1) == {"1", "5/4", "3/2", "225/128"}
    assert ratios(seven, 1) == {"1", "5/4", "3/2", "7/4"}


def test_a_tempered_chord_has_no_ratio_and_is_listed() -> None:
    tuned = tune(
        *build(
            [("C", MAJ), ("C", Quality.AUGMENTED), ("F", MAJ)],
            [["G4", "G#4", "A4"], ["E4", "E4", "F4"], ["C4", "C4", "C4"]],
        ),
        Policy(),
    )
    assert ratios(tuned, 1) in ({"None"}, {"1", "5/4", "25/16"})
    assert (ratios(tuned, 1) == {"None"}) == any("tempered" in f.what for f in tuned.findings)


def test_unknown_melody_names_the_parts() -> None:
    with pytest.raises(WishError, match="Part 1, Part 2, Part 3, Part 4"):
        tune(*build(CADENCE, VOICES), Policy(melody="Lead"))


@pytest.mark.parametrize(
    "wrong",
    [
        {"prime_limit": 11},
        {"held_shift": -1.0},
        {"held_shift": math.nan},
        {"drift_within": math.inf},
        {"reference_hz": 0.0},
    ],
)
def test_wishes_that_cannot_be(wrong: dict[str, Any]) -> None:
    with pytest.raises(WishError):
        Policy(**wrong)


def test_the_melody_is_smoothest() -> None:
    score, harmony = pump(4)
    plain = tune(score, harmony, Policy())
    led = tune(score, harmony, Policy(melody="part 2"))

    def unrest(tuned: TunedScore) -> float:
        cents = [s.cents for one in by_part(tuned, 1) for s in one.segments]
        notes = [one.note.pitch.key for one in by_part(tuned, 1) for _ in one.segments]
        return sum(
            abs(b - a)
            for a, b, low, high in zip(cents, cents[1:], notes, notes[1:], strict=False)
            if low == high
        )

    assert unrest(led) < unrest(plain)


@pytest.mark.parametrize("pull", list(Pull))
@pytest.mark.parametrize(
    "tuning",
    [
        FixedTuning("equal", (0.0,) * 12),
        FixedTuning("uneven", tuple(float(key % 5) * 3 - 6 for key in range(12))),
        None,
    ],
)
def test_an_accompaniment_keeps_its_own_tuning(tuning: FixedTuning | None, pull: Pull) -> None:
    organ: list[list[str | None]] = [["C4", "F4", "G4", "C4"], ["E4", "A4", "B4", "E4"]]
    score, harmony = build(CADENCE, VOICES + organ, accompaniment=(4, 5))
    tuned = tune(score, harmony, Policy(accompaniment_tuning=tuning, accompaniment_pull=pull))
    # Quarter-comma meantone by spelling on the home tonic: its fifth is the fourth root of 5.
    fifth = 1200 * math.log2(5) / 4 - 700
    for one in (*by_part(tuned, 4), *by_part(tuned, 5)):
        pitch = one.note.pitch
        wanted = tuning.cents[pitch.key % 12] if tuning else fifth * pitch.pitch_class.fifths
        assert [s.ratio for s in one.segments] == [None] * len(one.segments)
        assert all(s.cents == pytest.approx(wanted, abs=2e-3) for s in one.segments)
    voices = [
        (one.note.pitch, segment)
        for part in range(4)
        for one in by_part(tuned, part)
        for segment in one.segments
    ]
    plain = tune(*build(CADENCE, VOICES), Policy())
    if tuning is not None and tuning.name == "equal":
        roots = [s.cents for _, s in voices if s.ratio in (1, Fraction(3, 2))]
        bound = {Pull.ROOTS: 2.2, Pull.ALL: 4.0}[pull]
        assert math.sqrt(sum(c * c for c in roots) / len(roots)) < bound
        thirds = [s.cents for _, s in voices if s.ratio == Fraction(5, 4)]
        free = [s.cents for one in plain.notes for s in one.segments if s.ratio == Fraction(5, 4)]
        drawn = sum(map(abs, thirds)) / len(thirds)
        # Only under `all` do thirds give way to the accompaniment.
        assert (drawn < sum(map(abs, free)) / len(free) - 2.0) == (pull is Pull.ALL)


def test_a_soloist_takes_pure_thirds_over_an_equal_accompaniment() -> None:
    organ: list[list[str | None]] = [["C3", "F3", "G3", "C3"], ["G3", "C4", "D4", "G3"]]
    score, harmony = build(
        [("C", MAJ), ("F", MAJ), ("G", MAJ), ("C", MAJ)],
        [["E4", "A4", "B4", "E4"], *organ],
        accompaniment=(1, 2),
    )
    tuned = tune(score, harmony, Policy())
    for one in by_part(tuned, 0):
        assert one.segments[0].cents == pytest.approx(-13.686, abs=1.0)


FIFTHS = {
    Temperament.EQUAL: 0.0,
    Temperament.PYTHAGOREAN: 1.955,
    Temperament.MEANTONE: 696.578 - 700,
}


@pytest.mark.parametrize(("temperament", "fifth"), FIFTHS.items())
def test_temperaments_for_comparison(temperament: Temperament, fifth: float) -> None:
    tuned = tune(*build(CADENCE, VOICES), Policy(temperament=temperament))
    for one in tuned.notes:
        for segment in one.segments:
            assert segment.ratio is None
            place = one.note.pitch.pitch_class.fifths
            assert segment.cents == pytest.approx(fifth * place, abs=5e-3)
    assert tuned.root_cents[1] == pytest.approx(-fifth, abs=5e-3)


def test_the_reference_pitch_is_not_in_the_cents() -> None:
    score, harmony = build(CADENCE, VOICES)
    low, high = (tune(score, harmony, Policy(reference_hz=hz)) for hz in (415.0, 466.0))
    assert low.notes == high.notes
    one = low.notes[0]
    assert high.hz(one, one.segments[0]) / low.hz(one, one.segments[0]) == pytest.approx(466 / 415)


def test_the_same_piece_gives_the_same_pitches() -> None:
    score, harmony = pump(3)
    assert tune(score, harmony, Policy()) == tune(score, harmony, Policy())


def test_transposition_moves_nothing() -> None:
    # The same progression on D: home tonic D at 0 cents, all else as before.
    up = [[name and _up(name) for name in line] for line in VOICES]
    chords = [("D", MAJ), ("G", MAJ), ("A", DOM), ("D", MAJ)]
    here = tune(*build(CADENCE, VOICES), Policy())
    there = tune(*build(chords, up, "D"), Policy())
    for one, other in zip(here.notes, there.notes, strict=True):
        for a, b in zip(one.segments, other.segments, strict=True):
            assert a.cents == pytest.approx(b.cents, abs=1e-6)
            assert a.ratio == b.ratio


def _up(name: str) -> str:
    steps = {"C": "D", "D": "E", "E": "F#", "F": "G", "G": "A", "A": "B", "B": "C#"}
    octave = int(name[-1]) + (name[0] == "B")
    return f"{steps[name[0]]}{octave}"


def test_segments_cover_each_note() -> None:
    score, harmony = pump(2)
    tuned = tune(score, harmony, Policy())
    assert [one.note for one in tuned.notes] == list(score.notes)
    for one in tuned.notes:
        assert one.segments[0].onset == one.note.onset
        assert one.segments[-1].end == one.note.end
        for before, after in zip(one.segments, one.segments[1:], strict=False):
            assert before.end == after.onset
            assert before.chord != after.chord or before.cents != after.cents


def test_time_taken_by_grace_notes_is_not_in_the_segments() -> None:
    score, harmony = build(CADENCE, VOICES)
    first = score.notes[0]
    shorter = replace(first, duration=Fraction(3, 4), stolen=Fraction(1, 4))
    score = replace(score, notes=(shorter, *score.notes[1:]))
    tuned = tune(score, harmony, Policy())
    assert tuned.notes[0].segments[-1].end == Fraction(3, 4)
