"""Rehearsal notes: each reason on a textbook progression, against figures from outside."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import pytest

from retune.harmony.model import Harmony, Quality
from retune.page.data import page_data
from retune.page.rehearsal import (
    MOST_NOTES,
    Reason,
    RehearsalNote,
    concerning,
    hard_places,
    hardest,
    rehearsal_notes,
)
from retune.pitch import PitchClass
from retune.score.model import Score, VoiceType
from retune.score.tempo import TempoChange, TempoMap
from retune.tuning import tune
from retune.tuning.policy import Drift, Policy, Temperament
from tests.tracks.pieces import NAMES, tuned
from tests.tuning.textbook import DOM, MAJ, MIN, build

Chords = list[tuple[str | None, Quality | None]]


def places(
    chords: Chords, voices: list[list[str | None]], policy: Policy | None = None
) -> tuple[RehearsalNote, ...]:
    """What is found in a progression of half notes, one second each."""
    return tuned_places(*build(chords, voices, quarters=2), policy)


def tuned_places(
    score: Score, harmony: Harmony, policy: Policy | None = None
) -> tuple[RehearsalNote, ...]:
    return hard_places(tune(score, harmony, policy or Policy()))


def only(notes: tuple[RehearsalNote, ...], reason: Reason) -> RehearsalNote:
    (found,) = [note for note in notes if note.reason is reason]
    return found


def test_held_note_of_a_comma_pump_is_found_where_the_comma_is() -> None:
    """I-vi-ii: the A of vi, 5/3, is 40/27 above the D of ii, 9/8, and its fifth only a syntonic
    comma higher (81/80, 21.5 cents: M. Hauptmann, Die Natur der Harmonik und der Metrik, 1853)."""
    chords: Chords = [("C", MAJ), ("A", MIN), ("D", MIN), ("G", MAJ), ("C", MAJ)]
    voices: list[list[str | None]] = [
        ["C5", "C5", "D5", "D5", "C5"],
        ["G4", "A4", "A4", "G4", "G4"],
        ["E4", "E4", "F4", "B3", "C4"],
        ["C3", "A2", "D3", "G2", "C3"],
    ]
    (held,) = [n for n in places(chords, voices) if n.reason is Reason.HELD and n.parts == (1,)]
    assert (held.bars, held.beat) == (("3",), 1)
    assert "from Am into Dm" in held.text
    assert "a comma (22 cents) higher" in held.text
    assert held.severity == pytest.approx(21.506, abs=1e-3)


def test_third_on_top_tells_its_cents_and_beats() -> None:
    """C3 and E4 beat 5.19 times a second in equal temperament, where the fifth partial meets the
    fourth of a third, the second of a tenth (handbook, voice.md 3.1)."""
    third = only(places([("C", MAJ)], [["E4"], ["G3"], ["C3"]]), Reason.THIRD)
    assert third.parts == (0,)
    assert third.text.startswith("E4, the third of C, lies on top: 14 cents lower")
    assert third.listen == (
        "Tune to Part 3's C3: the 2nd partial of your E4 meets its 5th, without beats when in "
        "tune; 5.2 beats a second as on a piano."
    )


def test_third_that_moves_alone_is_found_and_one_in_the_middle_is_not() -> None:
    chords: Chords = [("C", MAJ), ("C", MIN)]
    moving: list[list[str | None]] = [["G4", "G4"], ["E4", "Eb4"], ["C3", "C3"]]
    third = only(places(chords, moving), Reason.THIRD)
    assert (third.parts, third.bars) == ((1,), ("2",))
    assert "moves there alone: 16 cents higher" in third.text
    assert not places(chords[:1], [["G4"], ["E4"], ["C3"]])


def test_leap_into_a_third_names_the_interval() -> None:
    chords: Chords = [("C", MAJ), ("F", MAJ)]
    voices: list[list[str | None]] = [["G4", "F4"], ["E4", "C4"], ["C3", "A3"]]
    leap = only(places(chords, voices), Reason.LEAP)
    assert leap.parts == (2,)
    assert leap.text.startswith("Leap of a major sixth up to A3, the third of F: 14 cents lower")
    # A fifth of the choir that leaps into a fifth is no news.
    assert not [n for n in places(chords, [["C3", "C4"], ["E4", "F4"]]) if n.parts == (0,)]


def test_repeated_note_that_must_move_says_by_how_much() -> None:
    piece = tuned("lantern-street")
    found = tune(piece.score, piece.harmony, Policy(prime_limit=7))
    again = [note for note in hard_places(found) if note.reason is Reason.REPEATED]
    assert again
    for note in again:
        line = [one for one in found.notes if one.note.part == note.parts[0]]
        (place,) = [n for n, one in enumerate(line) if one.note.onset == note.onset]
        before, here = line[place - 1], line[place]
        assert before.note.pitch == here.note.pitch
        moved = here.segments[0].cents - before.segments[-1].cents
        way = "higher" if moved > 0 else "lower"
        assert f"{abs(moved):.0f} cents {way} than just before" in note.text


def test_doubtful_chord_tells_which_voice_the_other_reading_moves() -> None:
    """F above D is 7/6 in G7 = 4:5:6:7, 6/5 in D minor: 36/35 = 48.77 cents (methods.md B6)."""
    score, harmony = build([("G", DOM)], [["F5"], ["B4"], ["G4"], ["D4"]], quarters=2)
    doubt = replace(harmony.chords[0], confidence=0.4, runner_up=(PitchClass("D"), Quality.MINOR))
    harmony = replace(harmony, chords=(doubt,))
    found = only(tuned_places(score, harmony, Policy(prime_limit=7)), Reason.DOUBT)
    assert found.parts == ()
    assert found.text.startswith("G7 or Dm? The root is in doubt.")
    assert "As Dm, Part 1's F5 stands 49 cents higher above Part 4's D4." in found.text
    # Within limit 5 both readings have 6/5, and the doubt is about who belongs to the chord.
    plain = only(tuned_places(score, harmony, Policy()), Reason.DOUBT)
    assert "Part 2's B4 belongs to G7 alone." in plain.text


def test_augmented_sixth_is_no_stray_seventh() -> None:
    """A German sixth is 225/128 within limit 5 (handbook, methods.md B5): nothing was forced."""
    voices: list[list[str | None]] = [["F#5"], ["Eb5"], ["C5"], ["Ab3"]]
    kinds = {note.reason for note in places([("Ab", DOM)], voices)}
    assert Reason.SEVENTH not in kinds


def test_certain_chord_is_no_doubt() -> None:
    score, harmony = build([("G", DOM)], [["F5"], ["B4"], ["G4"], ["D4"]], quarters=2)
    kinds = {note.reason for note in tuned_places(score, harmony, Policy(prime_limit=7))}
    assert Reason.DOUBT not in kinds


def test_entry_after_the_choir_has_sunk_by_a_comma() -> None:
    """One I-vi-ii-V pump with pure steps sinks by 21.5 cents (Hauptmann, as above)."""
    cycle: Chords = [("C", MAJ), ("A", MIN), ("D", MIN), ("G", MAJ)]
    soprano: list[str | None] = ["C5", "C5", "D5", "D5"]
    voices: list[list[str | None]] = [
        [*soprano, "C5", "C5"],
        ["G4", "A4", "A4", "G4", "G4", "G4"],
        ["E4", "E4", "F4", "B3", "E4", "E4"],
        ["C3", "A2", "D3", "G2", "C3", "C3"],
        ["C4", None, None, None, None, "C4"],
    ]
    score, harmony = build([*cycle, ("C", MAJ), ("C", MAJ)], voices, quarters=2)
    entry = only(tuned_places(score, harmony, Policy(drift=Drift.FOLLOW)), Reason.ENTRY)
    assert (entry.parts, entry.bars) == ((4,), ("6",))
    assert "22 cents lower than when this part last sang" in entry.text
    anchored = tuned_places(score, harmony, Policy(drift=Drift.ANCHORED))
    assert Reason.ENTRY not in {note.reason for note in anchored}


def test_edge_of_the_range_of_a_known_voice() -> None:
    """Sopranos up to G5 (Kostka & Payne; handbook, voice.md 5.1)."""
    score, harmony = build([("A", MAJ), ("C", MAJ)], [["A5", "G5"], ["E4", "C4"]], quarters=2)
    parts = (replace(score.parts[0], voice_type=VoiceType.SOPRANO), score.parts[1])
    found = only(tuned_places(replace(score, parts=parts), harmony), Reason.RANGE)
    assert (found.parts, found.bars) == ((0,), ("1",))
    assert found.text == "A5 lies 2 semitones beyond the top of the usual range of a soprano."


def test_short_chords_are_left_alone() -> None:
    """Corrections are slow: nothing under half a second is tuned by ear (voice.md 6.5)."""
    score, harmony = build([("C", MAJ), ("F", MAJ)], [["E4", "C4"], ["G3", "A3"], ["C3", "F3"]])
    slow, quick = (
        replace(score, tempo=TempoMap((TempoChange(Fraction(0), Fraction(qpm)),)))
        for qpm in (60, 121)
    )
    assert tuned_places(slow, harmony)
    assert not tuned_places(quick, harmony)


def test_what_is_the_same_is_said_once_with_all_its_bars() -> None:
    chords: Chords = [("C", MAJ), ("G", MAJ), ("C", MAJ), ("G", MAJ)]
    voices: list[list[str | None]] = [
        ["E4", "D4", "E4", "D4"], ["G3", "B3", "G3", "B3"], ["C3", "G2", "C3", "G2"],
    ]  # fmt: skip
    third = only(places(chords, voices), Reason.THIRD)
    assert third.bars == ("1", "3")
    assert third.onsets == (0, 4)


@pytest.mark.parametrize("name", NAMES)
def test_few_are_chosen_and_all_stand_in_the_score(name: str) -> None:
    piece = tuned(name)
    every, chosen = hard_places(piece), rehearsal_notes(piece)
    assert len(chosen) == min(len(every), MOST_NOTES)
    assert set(chosen) <= set(every)
    numbers = {bar.number for bar in piece.score.bars}
    for note in every:
        assert note.text
        assert set(note.bars) <= numbers
        for bar, onset in zip(note.bars, note.onsets, strict=True):
            assert piece.score.bar_at(onset).number == bar
    groups = [(note.reason, note.parts, note.text) for note in every]
    assert len(set(groups)) == len(groups)


def test_choice_is_spread_over_parts_reasons_and_bars() -> None:
    def note(severity: float, part: int, bar: int, reason: Reason) -> RehearsalNote:
        onset = Fraction(4 * bar)
        return RehearsalNote(
            reason, (onset,), (str(bar),), Fraction(1), (part,), severity, "Why", "Listen"
        )

    first = note(20.0, 0, 1, Reason.THIRD)
    like = note(19.0, 0, 2, Reason.THIRD)
    same_bar = note(18.0, 1, 1, Reason.THIRD)
    other = note(15.0, 1, 3, Reason.LEAP)
    assert hardest((same_bar, like, other, first), 2) == (first, other)
    assert set(hardest((same_bar, like, other, first), 9)) == {first, like, same_bar, other}


def test_temperament_has_nothing_to_tune() -> None:
    reasons = {note.reason for note in hard_places(tuned("harbour-hymn", Temperament.EQUAL))}
    assert reasons <= {Reason.RANGE, Reason.DOUBT}


def test_page_is_told_the_hardest_and_each_part_its_own() -> None:
    piece = tuned("lantern-street")
    advice = page_data(piece, piece, {})["advice"]
    assert sum(one["main"] for one in advice) == MOST_NOTES
    assert {one["kind"] for one in advice} == {"tuning"}
    for part in piece.score.parts:
        own = list(concerning(hard_places(piece), part.index))
        told = [one for one in advice if not one["who"] or part.index in one["who"]]
        assert min(len(own), 6) <= len(told)
    starts = [one["at"][0][1] for one in advice]
    assert starts == sorted(starts)
