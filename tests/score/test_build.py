"""Bars, ties, grace notes, words and marks of the score as played."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import pytest

from retune.errors import Finding, Place, Weight
from retune.pitch import PitchClass
from retune.score.build import build_score
from retune.score.model import Note, Score
from retune.score.options import ReadOptions
from retune.written import MarkKind, WrittenBar, WrittenChordSymbol, WrittenLyric, WrittenScore
from tests.score.written_text import bar, bar_numbers, mark, part, play, remarks, sung

# --- bars ---------------------------------------------------------------------------------


def test_a_bar_is_as_long_as_its_shortest_part() -> None:
    """Breve rests in 4/4 bars, as in many open files of madrigals."""
    score = play(part("Soprano", "C5/4", "D5/4", "E5/4"), part("Bass", "r/8", "r/8", "C3/4"))
    assert [str(one.onset) for one in score.bars] == ["0", "4", "8"]
    assert sung(score, "Bass") == ["C3@8+4"]
    assert remarks(score, "rests longer than the bar") == [
        "note: piece.xml: Bass, bar 1: rests longer than the bar were cut (bars 1-2)"
    ]


def test_a_bar_reaches_to_the_end_of_its_last_note() -> None:
    """A bar left short in one part must not pull that part ahead of the others."""
    score = play(part("Soprano", "C5/3", "D5/4"), part("Bass", "C3/4", "D3/4"))
    assert sung(score, "Soprano") == ["C5@0+3", "D5@4+4"]
    assert remarks(score, "bar too short in this part")


def test_an_empty_bar_is_as_long_as_its_metre() -> None:
    score = play(part("Soprano", "C5/3", bar(), "D5/3", metre=(3, 4)))
    assert sung(score) == ["C5@0+3", "D5@6+3"]


def test_bars_that_are_missing_at_the_end() -> None:
    score = play(part("Soprano", "C5/4", "D5/4"), part("Bass", "C3/4"))
    assert len(score.bars) == 2
    assert remarks(score, "Bass, bar 2: has fewer bars than the score")


def test_pick_up_and_split_bars() -> None:
    bars = [
        bar("C5/1", number="0", implicit=True),
        bar("D5/4", number="1"),
        bar("E5/3", number="2", repeat_end=2),
        bar("F5/1", number="X1", implicit=True, repeat_start=True),
        bar("G5/4", number="3"),
        bar("A5/3", number="4", repeat_end=2),
    ]
    score = play(part("Soprano", *bars), repeats=False)
    assert [(one.number, str(one.begins)) for one in score.bars] == [
        ("0", "3"), ("1", "0"), ("2", "0"), ("X1", "3"), ("3", "0"), ("4", "0")
    ]  # fmt: skip
    assert score.beat_at(Fraction(0)) == 4
    assert score.beat_at(Fraction(8)) == 4
    assert not remarks(score, "time signature")


def test_second_ending_begins_where_the_first_one_does() -> None:
    bars = [
        bar("C5/1"), bar("D5/4"),
        bar("E5/3", ending=(1,), ending_stop=True, repeat_end=2), bar("E5/3", ending=(2,)),
    ]  # fmt: skip
    score = play(part("Soprano", *bars))
    assert [str(one.begins) for one in score.bars] == ["3", "0", "0", "3", "0", "0"]


def test_odd_bars_are_doubted() -> None:
    score = play(part("Soprano", "C5/4", "D5/3", "E5/5", "F5/4"))
    assert remarks(score, "shorter") == [
        "doubt: piece.xml: bar 2: bar shorter than its time signature; kept short"
    ]
    assert remarks(score, "longer") == [
        "doubt: piece.xml: bar 3: bar longer than its time signature; kept as long"
    ]


def test_metre_and_key_come_from_any_part() -> None:
    top = part("Soprano", "C5/4", bar("D5/3"))
    low = part("Bass", bar("C3/4", key=(-2, "minor")), bar("D3/3", metre=(3, 4)))
    first, second = play(top, low).bars
    assert (first.metre, first.key) == ((4, 4), (-2, "minor"))
    assert (second.metre, second.key) == ((3, 4), (-2, "minor"))


# --- ties ---------------------------------------------------------------------------------


def test_ties_join_over_bars_and_keep_their_sources() -> None:
    score = play(part("Alto", "C5/2 D5/2~", "~D5/4~", "~D5/1 E5/3"))
    assert sung(score) == ["C5@0+2", "D5@2+7", "E5@9+3"]
    assert score.notes[1].sources == ("Alto.1.v1s1.1", "Alto.2.v1s1.0", "Alto.3.v1s1.0")


def test_a_tie_changes_voice_but_prefers_its_own() -> None:
    crossing = play(part("SA", bar("C5/4", "G4/4~"), bar("~G4/4", "E4/4")))
    assert sung(crossing, "Alto") == ["G4@0+8", "E4@4+4"]
    unison = play(part("SA", bar("G4/4~", "G4/4~"), bar("~G4/4", "~G4/2 E4/2")))
    assert sung(unison, "Soprano") == ["G4@0+8"]
    assert sung(unison, "Alto") == ["G4@0+6", "E4@6+2"]


def test_enharmonic_ties_join_and_others_do_not() -> None:
    assert sung(play(part("Alto", "G#4/4~", "~Ab4/4"))) == ["G#4@0+8"]
    other = play(part("Alto", "C5/4~", "~C#5/4"))
    assert sung(other) == ["C5@0+4", "C#5@4+4"]
    assert remarks(other, "bar 1, beat 1: tie that leads to no note")
    assert remarks(other, "bar 2, beat 1: tied note without its first note")


def test_one_flag_is_enough_for_neighbours() -> None:
    assert sung(play(part("Alto", "C5/4~", "C5/4"))) == ["C5@0+8"]
    assert sung(play(part("Alto", "C5/4", "~C5/4"))) == ["C5@0+8"]
    assert sung(play(part("Alto", "C5/4", "C5/4"))) == ["C5@0+4", "C5@4+4"]


def test_only_the_tied_member_of_a_chord_is_held() -> None:
    score = play(part("Alto", bar("1.1:E5/4", "1.2:C5/4~"), bar("1.1:F5/4", "1.2:~C5/4")))
    assert sung(score, "Alto 2") == ["C5@0+8"]
    divided = play(part("Alto", "C5+E5/2 C5+E5/2"))
    assert sung(divided, "Alto 2") == ["C5@0+2", "C5@2+2"]


def test_ties_into_endings() -> None:
    def bars(second: str) -> list[WrittenBar]:
        return [
            bar("C5/4~"),
            bar("~C5/4", ending=(1,), ending_stop=True, repeat_end=2),
            bar(second, ending=(2,)),
        ]

    both = play(part("Alto", *bars("~C5/4")))
    assert sung(both) == ["C5@0+8", "C5@8+8"]
    one = play(part("Alto", *bars("C5/4")))
    assert sung(one) == ["C5@0+8", "C5@8+4", "C5@12+4"]
    assert remarks(one, "bar 1, beat 1: tie that leads to no note")


def test_a_tie_out_of_a_repeated_section() -> None:
    score = play(part("Alto", bar("C5/4~", repeat_end=2), "~C5/4"))
    assert sung(score) == ["C5@0+4", "C5@4+8"]


def test_notes_of_one_key_never_overlap_in_a_part() -> None:
    piano = part("Piano", bar("1.1:C4/1 C4/1 C4/2", "1.2:C4/4"), bar("1.1:F#4/4"), staves=2)
    score = play(part("Soprano", "C5/4", "C5/4"), piano)
    assert sung(score, "Piano") == ["C4@0+1", "C4@1+1", "C4@2+2", "F#4@4+4"]


# --- grace notes --------------------------------------------------------------------------


def graces(*bars: str) -> list[Note]:
    return list(play(part("Alto", *bars)).notes)


def test_grace_notes_come_before_the_beat() -> None:
    first, grace, main = graces("C5/2 'D5 E5/2")
    assert (first.duration, first.stolen) == (Fraction(15, 8), Fraction(1, 8))
    assert first.analysed_end == 2
    assert (grace.onset, grace.duration, grace.grace) == (Fraction(15, 8), Fraction(1, 8), True)
    assert (main.onset, main.duration, main.grace) == (2, 2, False)


def test_grace_notes_take_at_most_half() -> None:
    notes = graces("C5/1/4 'D5 'E5 'F5 G5/15/4")
    assert notes[0].duration == Fraction(1, 8)
    assert [note.duration for note in notes[1:4]] == [Fraction(1, 24)] * 3
    assert notes[3].end == Fraction(1, 4)


def test_grace_notes_after_a_rest_take_its_time() -> None:
    first, grace, main = graces("C5/1 r/1 'D5 E5/2")
    assert (first.duration, first.stolen) == (1, 0)
    assert (grace.onset, main.onset) == (Fraction(15, 8), 2)


def test_grace_notes_at_the_very_start() -> None:
    grace, main = graces("'D5 E5/4")
    assert (grace.onset, grace.duration) == (0, Fraction(1, 8))
    assert (main.onset, main.end) == (Fraction(1, 8), 4)


def test_grace_notes_over_a_bar_line_take_from_the_bar_before() -> None:
    first, grace, main = graces("C5/4", "'D5 E5/4")
    assert (first.end, grace.end, main.onset) == (Fraction(31, 8), 4, 4)


# --- words --------------------------------------------------------------------------------


def lyrics(score: Score, name: str | None = None) -> list[str]:
    index = 0 if name is None else [one.name for one in score.parts].index(name)
    return [note.lyric for note in score.notes if note.part == index]


def test_the_verse_follows_the_pass() -> None:
    bars = [
        bar("C5/2=one|two D5/2=Lo-|Mo-", repeat_start=True),
        bar("E5/4=ren|ra", repeat_end=2),
        bar("F5/4=end"),
    ]
    score = play(part("Alto", *bars))
    assert lyrics(score) == ["one", "Lo-", "ren", "two", "Mo-", "ra", "end"]


def test_a_refrain_printed_once_is_sung_each_time() -> None:
    bars = [bar("C5/4=one|two"), bar("D5/4=o"), bar("E5/4=come", repeat_end=2)]
    assert lyrics(play(part("Alto", *bars))) == ["one", "o", "come", "two", "o", "come"]


def test_a_melisma_of_one_verse_takes_no_syllable_of_another() -> None:
    bars = [bar("C5/2=one|two D5/2=ly|"), bar("E5/4=x|y", repeat_end=2)]
    assert lyrics(play(part("Alto", *bars))) == ["one", "ly", "x", "two", "", "y"]


def test_words_of_an_ending_and_of_some_passes() -> None:
    second = WrittenLyric("late", verse="2")
    third = WrittenLyric("thrice", verse="1", passes=(2,))
    ended = bar("E5/4", ending=(2,))
    ended = replace(ended, notes=(replace(ended.notes[0], lyrics=(second,)),))
    opened = bar("C5/4=first")
    opened = replace(
        opened,
        notes=(replace(opened.notes[0], lyrics=(*opened.notes[0].lyrics, third)),),
    )
    first = bar("D5/4=early", ending=(1,), ending_stop=True, repeat_end=2)
    score = play(part("Alto", opened, first, ended))
    assert lyrics(score) == ["first", "early", "thrice", "late"]


def test_verses_that_no_repeat_reaches_are_named() -> None:
    score = play(part("Alto", "C5/4=a|b|c"))
    assert lyrics(score) == ["a"]
    assert remarks(score, "verse 2, 3 is printed, but no repeat leads to it")


def test_voices_without_words_read_their_neighbours() -> None:
    score = play(part("SA", bar("C5/2=Sol D5/2=mi", "E4/4")), part("Bass", "C3/2 r/2"))
    assert lyrics(score, "Alto") == ["Sol"]
    assert lyrics(score, "Bass") == ["Sol"]
    assert remarks(score, "no words of their own in Bass: they sing those of Soprano")


# --- the rest -----------------------------------------------------------------------------


def test_faulty_notes_are_left_out_by_name() -> None:
    score = play(part("Alto", "C5/2 D5/0 C5/2", "C13/2 C5/2"))
    assert [note.onset for note in score.notes] == [0, 2, 6]
    losses = [finding for finding in score.findings if finding.weight is Weight.LOSS]
    assert [(finding.where.bar, finding.what) for finding in losses] == [
        ("1", "left out: note without length"),
        ("2", "left out: note outside the range of MIDI keys (0 to 127)"),
    ]


def test_chord_symbols_and_rehearsal_marks_as_played() -> None:
    symbol = WrittenChordSymbol(PitchClass("D"), "major")
    marks = (mark(MarkKind.CHORD_SYMBOL, symbol, 2), mark(MarkKind.REHEARSAL, "A"))
    score = play(part("Alto", bar("D5/4", marks=marks, repeat_end=2), "E5/4"))
    assert [(one.onset, one.root.name, one.kind) for one in score.chord_symbols] == [
        (2, "D", "major"), (6, "D", "major")
    ]  # fmt: skip
    assert [one.rehearsal for one in score.bars] == ["A", "A", ""]
    assert bar_numbers(score) == "1 1 2"


def test_what_the_file_says_about_itself_is_kept() -> None:
    told = Finding(Weight.DOUBT, "odd", Place(part="Alto", bar="1"))
    written = WrittenScore(
        (part("Alto", "C5/4"),), "Song", "Iva Renn", "Oda Lys", "CC0", "musicxml", (told,)
    )
    score = build_score(written, stem="song", file="song.mxl", options=ReadOptions())
    assert (score.stem, score.title, score.composer) == ("song", "Song", "Iva Renn")
    assert (score.lyricist, score.copyright, score.format) == ("Oda Lys", "CC0", "musicxml")
    assert str(score.findings[0]) == "doubt: song.mxl: Alto, bar 1: odd"
    untitled = build_score(
        replace(written, title=""), stem="song", file=None, options=ReadOptions()
    )
    assert untitled.title == "song"


def test_notes_are_sorted_by_onset_part_and_key() -> None:
    piano = part("Organ", bar("1.1:F#4+A4/4", "2.5:D2/4"), staves=2)
    score = play(part("Bass", "D3/4"), part("Soprano", "D5/2 E5/2"), piano)
    places = [(note.onset, note.part, note.pitch.key) for note in score.notes]
    assert places == sorted(places)
    assert len(places) == 6


@pytest.mark.parametrize("length", ["1/3", "2/7", "1/1024"])
def test_times_are_exact(length: str) -> None:
    score = play(part("Alto", f"C5/{length} D5/{length} E5/1"))
    assert score.notes[2].onset == 2 * Fraction(length)
