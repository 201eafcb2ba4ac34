"""Textures other than four-part harmony: lone lines, unisons, silence, crowds, grace notes."""

from __future__ import annotations

import json
import random
from dataclasses import replace
from fractions import Fraction
from itertools import pairwise

import pytest

from retune.harmony.model import Harmony, Tonic
from retune.pitch import Pitch, PitchClass
from retune.score.model import Note, Part, Score
from retune.tuning import tune
from retune.tuning.policy import Drift, Policy, Temperament
from tests.tuning.textbook import MAJ, MIN, build

SCALE: list[str | None] = ["C4", "D4", "E4", "F4", "G4", "A4", "B4", "C5", "A4", "F4", "G4", "C4"]
# Ptolemy's intense diatonic against equal temperament, in cents.
JUST = {"C": 0.0, "D": 3.910, "E": -13.686, "F": -1.955, "G": 1.955, "A": -15.641, "B": -11.731}


@pytest.mark.parametrize("voices", [1, 2, 5])
@pytest.mark.parametrize("drift", list(Drift))
def test_a_lone_line_takes_the_just_scale(drift: Drift, voices: int) -> None:
    tuned = tune(*build([("C", MAJ)] * len(SCALE), [SCALE] * voices), Policy(drift=drift))
    for one in tuned.notes:
        for segment in one.segments:
            assert segment.ratio is None
            assert segment.cents == pytest.approx(JUST[one.note.pitch.step], abs=0.05)


def test_a_lone_line_after_a_drift_goes_on_from_there() -> None:
    # Two cycles of I-vi-ii-V-I sink 43 cents under `follow`; the solo that comes next stays there.
    chords = [("C", MAJ), ("A", MIN), ("D", MIN), ("G", MAJ)] * 2 + [("C", MAJ)] * 5
    tuned = tune(
        *build(
            chords,
            [
                [*["C5", "C5", "D5", "D5"] * 2, "C5", "D5", "E5", "D5", "C5"],
                [*["G4", "A4", "A4", "G4"] * 2, "G4", None, None, None, None],
                [*["E4", "E4", "F4", "B3"] * 2, "E4", None, None, None, None],
            ],
        ),
        Policy(drift=Drift.FOLLOW),
    )
    last = [one for one in tuned.notes if one.note.part == 0][-1].segments[-1]
    assert last.ratio is None
    assert last.cents == pytest.approx(-43.01, abs=0.3)


def test_silence_between_chords() -> None:
    chords = [("C", MAJ), (None, None), ("F", MAJ), ("C", MAJ)]
    voices: list[list[str | None]] = [
        ["G4", None, "A4", "G4"],
        ["E4", None, "F4", "E4"],
        ["C4", None, "C4", "C4"],
    ]
    for drift in Drift:
        tuned = tune(*build(chords, voices), Policy(drift=drift))
        assert tuned.root_cents[1] is None
        # The pitch goes on across the silence by the scale's own step, 4/3.
        assert tuned.root_cents[2] == pytest.approx(-1.955, abs=1.0)


@pytest.mark.parametrize("drift", list(Drift))
@pytest.mark.parametrize("temperament", list(Temperament))
def test_nothing_at_all(drift: Drift, temperament: Temperament) -> None:
    score = Score("empty", "", (Part(0, "Soprano"),), (), ())
    harmony = Harmony((), (), (), Tonic(PitchClass("C")))
    tuned = tune(score, harmony, Policy(drift=drift, temperament=temperament))
    assert tuned.notes == ()
    json.dumps(tuned.figures, allow_nan=False)


def test_one_note() -> None:
    tuned = tune(*build([("G", MAJ)], [["G4"]], "G"), Policy())
    assert [s.cents for s in tuned.notes[0].segments] == [pytest.approx(0.0, abs=1e-9)]
    json.dumps(tuned.figures, allow_nan=False)


def test_only_an_accompaniment() -> None:
    tuned = tune(*build([("C", MAJ)], [["C4"], ["E4"]], accompaniment=(0, 1)), Policy())
    assert {s.cents for one in tuned.notes for s in one.segments} == {0.0}
    assert tuned.root_cents == (0.0,)


def test_forty_parts() -> None:
    chance = random.Random(40)
    roots = [("C", MAJ, "CEG"), ("A", MIN, "ACE"), ("D", MIN, "DFA"), ("G", MAJ, "GBD")] * 6
    voices: list[list[str | None]] = [
        [f"{chance.choice(tones)}{chance.choice('234')}" for _, _, tones in roots]
        for _ in range(40)
    ]
    chords = [(root, quality) for root, quality, _ in roots]
    tuned = tune(*build(chords, voices), Policy())
    assert tuned.figures["held_shift"]["greatest_cents"] <= 4.9 + 0.005
    assert tuned.figures["purity"]["triad_mean_cents"] < 0.5
    assert all(abs(s.cents) < 40 for one in tuned.notes for s in one.segments)


def test_a_drone_under_many_chords() -> None:
    # A bass C for 200 chords is one note: it never moves more than its cap from chord to chord.
    step = [("C", MAJ), ("F", MAJ)] * 100
    tuned = tune(*build(step, [["G4", "A4"] * 100, ["E4", "F4"] * 100, ["C3"] * 200]), Policy())
    drone = tuned.notes[-1] if len(tuned.notes[-1].segments) > 1 else None
    held = next(one for one in tuned.notes if one.note.part == 2)
    assert drone is None or drone.note.part in (0, 1, 2)
    cents = [s.cents for s in held.segments]
    assert max(abs(b - a) for a, b in pairwise(cents)) <= 4.905
    assert max(map(abs, cents)) < 3.0


def test_grace_notes_take_the_chord_they_lead_to() -> None:
    score, harmony = build([("C", MAJ), ("F", MAJ)], [["G4", "A4"], ["E4", "F4"], ["C4", "C4"]])
    graces = tuple(
        Note(0, Fraction(7, 8), Fraction(1, 8), Pitch.parse(name), grace=True)
        for name in ("A4", "B4")
    )
    # Notes of the harmony are numbered in the score's order, so graces go last here.
    tuned = tune(replace(score, notes=score.notes + graces), harmony, Policy())
    third, other = tuned.notes[-2], tuned.notes[-1]
    root = tuned.root_cents[1]
    assert root is not None
    assert [s.ratio for s in third.segments] == [Fraction(5, 4)]
    assert third.segments[0].cents == pytest.approx(root - 13.686, abs=1e-3)
    assert other.segments[0].ratio in (Fraction(45, 32), Fraction(25, 18))
    assert other.segments[0].chord == 1


def test_far_keys_stay_sane() -> None:
    # Every chord a fifth up, twice round the circle, spelled without end: no runaway pitch.
    names = ["C", "G", "D", "A", "E", "B", "F#", "C#", "G#", "D#", "A#", "E#", "B#"]
    chords = [(name, MAJ) for name in names]
    third = ["E", "B", "F#", "C#", "G#", "D#", "A#", "E#", "B#", "Fx", "Cx", "Gx", "Dx"]
    voices: list[list[str | None]] = [
        [f"{name}4" for name in third],
        [f"{name}3" for name in names],
    ]
    for drift in (Drift.GENTLE, Drift.ANCHORED):
        tuned = tune(*build(chords, voices), Policy(drift=drift))
        assert all(abs(s.cents) < 60 for one in tuned.notes for s in one.segments)
