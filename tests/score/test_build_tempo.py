"""Tempo and dynamics as played.

That a forte is velocity 90 is MusicXML's definition (W3C, element sound); tempo words, fermatas
and hairpins are common practice, no source.
"""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import pytest

from retune.score.model import Score
from retune.score.tempo_words import Turn, metronome_in, tempo_word
from retune.written import Mark, MarkKind
from tests.score.written_text import bar, mark, part, play, remarks, words


def tempi(*marks: Mark, bars: int = 4, **fields: object) -> list[tuple[str, str]]:
    """Tempo changes of a piece of one long note a bar, all marks in its first bar."""
    made = [bar("C5/4", marks=marks), *(bar("C5/4") for _ in range(bars - 1))]
    return changes(play(part("Alto", *made, **fields)))


def changes(score: Score) -> list[tuple[str, str]]:
    return [(str(change.onset), str(change.qpm)) for change in score.tempo.changes]


def tempo(qpm: int, onset: int = 0) -> Mark:
    return mark(MarkKind.TEMPO, Fraction(qpm), onset)


def test_default_is_said() -> None:
    score = play(part("Alto", "C5/4"))
    assert changes(score) == [("0", "100")]
    assert remarks(score, "no tempo given")


def test_numbers_win_over_words() -> None:
    assert tempi(words("Adagio"), tempo(72)) == [("0", "72")]


@pytest.mark.parametrize(
    ("metre", "length", "qpm"), [((4, 4), 4, "132"), ((2, 2), 4, "264"), ((6, 8), 3, "198")]
)
def test_words_count_beats(metre: tuple[int, int], length: int, qpm: str) -> None:
    made = bar(f"C5/{length}", marks=(words("Allegro"),))
    assert changes(play(part("Alto", made, metre=metre))) == [("0", qpm)]


def test_parts_that_disagree() -> None:
    score = play(
        part("Soprano", bar("C5/4", marks=(tempo(60),))),
        part("Bass", bar("C3/4", marks=(tempo(66),))),
    )
    assert changes(score) == [("0", "60")]
    assert remarks(score, "different tempi")


def test_unbelievable_tempo() -> None:
    assert tempi(tempo(0), tempo(90, 2)) == [("0", "90")]


def test_rit_until_a_tempo() -> None:
    first = bar("C5/4", marks=(tempo(80),))
    second = bar("C5/4", marks=(words("rit."),))
    third = bar("C5/4", marks=(words("a tempo"),))
    assert changes(play(part("Alto", first, second, third))) == [
        ("0", "80"), ("4", "75"), ("5", "70"), ("6", "65"), ("7", "60"), ("8", "80")
    ]  # fmt: skip


def test_accel_leads_to_the_next_mark() -> None:
    first = bar("C5/4", marks=(tempo(80), words("accel.", 2)))
    second = bar("C5/4", marks=(tempo(120),))
    assert changes(play(part("Alto", first, second))) == [
        ("0", "80"), ("2", "100"), ("3", "120")
    ]  # fmt: skip


def test_rit_that_nothing_ends() -> None:
    score = play(part("Alto", bar("C5/4", marks=(tempo(80), words("rit."))), *["C5/4"] * 6))
    assert changes(score)[-2:] == [("15", "60"), ("16", "80")]
    assert remarks(score, "bar 1: nothing ends this change of tempo")
    # At the end of a piece there is nothing to come back to.
    last = play(part("Alto", bar("C5/4", marks=(tempo(80),)), bar("C5/4", marks=(words("rit."),))))
    assert changes(last)[-1] == ("7", "60")
    assert not remarks(last, "nothing ends")


def test_tempo_primo_and_shifts() -> None:
    bars = [
        bar("C5/4", marks=(tempo(60),)),
        bar("C5/4", marks=(tempo(90),)),
        bar("C5/4", marks=(words("più mosso"),)),
        bar("C5/4", marks=(words("a tempo"),)),
        bar("C5/4", marks=(words("Tempo I"),)),
        bar("C5/4", marks=(words("doppio movimento"),)),
    ]
    assert [qpm for _, qpm in changes(play(part("Alto", *bars)))] == [
        "60", "90", "108", "90", "60", "120"
    ]  # fmt: skip


def test_a_repeat_begins_in_its_own_tempo() -> None:
    bars = [
        bar("C5/4", marks=(tempo(60),)),
        bar("C5/4", marks=(tempo(90),), repeat_end=2),
    ]
    assert changes(play(part("Alto", *bars))) == [
        ("0", "60"), ("4", "90"), ("8", "60"), ("12", "90")
    ]  # fmt: skip


def test_a_fermata_stretches_once_for_all_parts() -> None:
    top = part("Soprano", bar("C5/2 D5/2^", marks=(tempo(60),)), "E5/4")
    low = part("Bass", bar("C3/2 D3/1 E3/1^"), "C3/4")
    score = play(top, low)
    # Seconds at 60 are quarter notes; the last of the first bar lasts 1.75 times as long.
    assert changes(score)[1] == ("3", "240/7")
    assert score.tempo.seconds(Fraction(8)) == pytest.approx(8.75)
    assert play(top, low, fermatas=False).tempo.seconds(Fraction(8)) == 8


def test_fermatas_on_rests_and_bar_lines() -> None:
    rest = play(part("Alto", bar("C5/2 r/2^", marks=(tempo(60),))))
    assert rest.tempo.seconds(Fraction(4)) == pytest.approx(5.5)
    line = play(part("Alto", bar("C5/4", marks=(tempo(60), mark(MarkKind.FERMATA, None, 4)))))
    assert line.tempo.seconds(Fraction(4)) == pytest.approx(4.75)


@pytest.mark.parametrize(
    ("text", "turn", "value"),
    [
        ("Andante con moto", Turn.SET, Fraction(86)),
        ("Allegro ma non troppo", Turn.SET, Fraction(120)),
        ("Sehr langsam", Turn.SET, Fraction(44)),
        ("Modéré", Turn.SET, Fraction(92)),
        ("poco rit.", Turn.RAMP, Fraction(6, 7)),
        ("ritardando", Turn.RAMP, Fraction(3, 4)),
        ("langsamer werden", Turn.RAMP, Fraction(3, 4)),
        ("stringendo", Turn.RAMP, Fraction(5, 4)),
        ("ritenuto", Turn.SHIFT, Fraction(4, 5)),
        ("L’istesso tempo", Turn.SHIFT, Fraction(1)),
        ("a tempo", Turn.RETURN, Fraction(1)),
        ("Tempo primo", Turn.FIRST, Fraction(1)),
    ],
)
def test_tempo_words(text: str, turn: Turn, value: Fraction) -> None:
    word = tempo_word(text)
    assert word is not None
    assert (word.turn, word.value) == (turn, value)


@pytest.mark.parametrize("text", ["dolce", "spirit", "engraved by hand", "solo", "", "longest"])
def test_other_words(text: str) -> None:
    assert tempo_word(text) is None


def test_metronome_marks_in_words() -> None:
    assert metronome_in("Allegro (♩ = 96)") == 96
    assert metronome_in("M.M. = 72") == 72
    assert metronome_in("verse 2") is None


# --- dynamics -----------------------------------------------------------------------------


def velocities(score: Score, name: str | None = None) -> list[int]:
    index = 0 if name is None else [one.name for one in score.parts].index(name)
    return [note.velocity for note in score.notes if note.part == index]


def dynamic(value: str | int, onset: int = 0, staff: int = 0) -> Mark:
    return mark(MarkKind.DYNAMIC, value, onset, staff)


def hairpin(value: str, onset: int) -> Mark:
    return mark(MarkKind.HAIRPIN, value, onset)


FOUR = "C5/1 C5/1 C5/1 C5/1"


def test_dynamics_hold() -> None:
    score = play(part("Alto", bar(FOUR, marks=(dynamic("f"), dynamic("p", 2))), "C5/4"))
    assert velocities(score) == [90, 90, 57, 57, 57]


def test_hairpins_run_in_a_straight_line_to_the_next_dynamic() -> None:
    marks = (dynamic("p"), hairpin("crescendo", 0), hairpin("stop", 3), dynamic("f", 3))
    assert velocities(play(part("Alto", bar(FOUR, marks=marks)))) == [57, 68, 79, 90]


def test_a_hairpin_to_nowhere_goes_one_level() -> None:
    marks = (dynamic("f"), hairpin("diminuendo", 0), hairpin("stop", 2))
    assert velocities(play(part("Alto", bar(FOUR, marks=marks)))) == [90, 84, 78, 78]


def test_cresc_in_words() -> None:
    marks = (dynamic("p"), words("cresc."))
    bars = bar(FOUR, marks=marks), bar("C5/4", marks=(dynamic("f"),))
    got = velocities(play(part("Alto", *bars)))
    assert got == sorted(got)
    assert (got[0], got[2], got[-1]) == (57, round((57 + 90) / 2), 90)


def test_stresses_and_accents_touch_one_onset() -> None:
    marks = (dynamic("p"), dynamic("sfz", 1), dynamic("fp", 2))
    got = velocities(play(part("Alto", bar("C5/1 C5/1 C5/1 C5/1>", marks=marks))))
    assert got == [57, 79, 90, 69]


def test_a_velocity_on_the_note_counts_alone() -> None:
    first = bar("C5/4", marks=(dynamic("p"),))
    first = replace(first, notes=(replace(first.notes[0], dynamic=101),))
    assert velocities(play(part("Alto", first, "C5/4"))) == [101, 57]


def test_dynamics_above_the_top_staff_hold_for_all() -> None:
    score = play(
        part("Soprano", bar("C5/4", marks=(dynamic("pp"),))),
        part("Bass", bar("C3/4")),
        part("Organ", bar("F#4/4", marks=(dynamic("f"),))),
    )
    assert velocities(score, "Bass") == [45]
    assert velocities(score, "Organ") == [90]


def test_each_staff_has_its_own_dynamics() -> None:
    both = bar("1.1:C5/4", "1.2:G4/4", "2.5:E4/4", "2.6:C3/4",
               marks=(dynamic("p", staff=1), dynamic("f", staff=2)))  # fmt: skip
    score = play(part("SATB", both))
    assert [velocities(score, one.name) for one in score.parts] == [[57], [57], [90], [90]]


def test_a_repeat_begins_as_loud_as_it_is_written() -> None:
    bars = bar("C5/4", marks=(dynamic("p"),)), bar("C5/4", marks=(dynamic("f"),), repeat_end=2)
    assert velocities(play(part("Alto", *bars))) == [57, 90, 57, 90]


def test_no_dynamics() -> None:
    assert velocities(play(part("Alto", "C5/4"))) == [80]
