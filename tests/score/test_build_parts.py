"""Staves split into lines of singers; accompaniment and reductions told apart.

How choirs read a shared staff is common practice, no source.
"""

from __future__ import annotations

import pytest

from retune.errors import UnreadableError, Weight, WishError
from retune.score.model import PartKind, VoiceType
from tests.score.written_text import bar, names, part, play, remarks, sung, words

HIGH, LOW = "C5/2 D5/2", "E4/2 F4/2"


def test_two_voices_on_a_staff_are_two_parts() -> None:
    score = play(part("Soprano Alto", bar(HIGH, LOW)))
    assert names(score) == ["Soprano", "Alto"]
    assert [one.voice_type for one in score.parts] == [VoiceType.SOPRANO, VoiceType.ALTO]
    assert [one.voice for one in score.parts] == ["1", "2"]
    assert sung(score, "Soprano") == ["C5@0+2", "D5@2+2"]
    assert sung(score, "Alto") == ["E4@0+2", "F4@2+2"]


def test_voice_numbers_do_not_matter() -> None:
    """Exporters number voices 1 and 2, 1 and 5, or 5 and 6, and not always from the top."""
    score = play(part("S/A", bar("1.5:C5/4", "1.6:E4/4"), bar("1.2:D5/4", "1.1:F4/4")))
    assert sung(score, "Soprano") == ["C5@0+4", "D5@4+4"]
    assert sung(score, "Alto") == ["E4@0+4", "F4@4+4"]


def test_crossing_voices_keep_their_places() -> None:
    score = play(part("TB", bar("C4/4", "C3/4"), bar("C3/4", "E3/4"), bar("D4/4", "D3/4")))
    assert sung(score, "Tenor") == ["C4@0+4", "C3@4+4", "D4@8+4"]
    assert sung(score, "Bass") == ["C3@0+4", "E3@4+4", "D3@8+4"]


def test_one_voice_alone_is_sung_by_both() -> None:
    bars = [bar(HIGH, LOW), bar("G4/4"), bar("A4/4"), bar(HIGH, LOW), bar("G4/4")]
    score = play(part("SA", *bars))
    assert sung(score, "Alto")[2:4] == ["G4@4+4", "A4@8+4"]
    assert sung(score, "Soprano")[2:4] == ["G4@4+4", "A4@8+4"]
    found = remarks(score, "one voice on the staff")
    assert found == [
        "note: piece.xml: SA, bar 2: one voice on the staff, sung by Soprano and Alto (bars 2-3, 5)"
    ]


def test_a_printed_rest_is_silence_and_a_hidden_one_is_nothing() -> None:
    printed = play(part("SA", bar(HIGH, LOW), bar("G4/4", "r/4")))
    assert sung(printed, "Alto") == ["E4@0+2", "F4@2+2"]
    hidden = play(part("SA", bar(HIGH, LOW), bar("G4/4", "h/4")))
    assert sung(hidden, "Alto") == ["E4@0+2", "F4@2+2", "G4@4+4"]


def test_a_voice_that_begins_within_the_bar_reads_the_other_before() -> None:
    score = play(part("SA", bar("C5/1 D5/1 E5/2", "s/2 C5/2"), bar(HIGH, LOW)))
    assert sung(score, "Alto")[:3] == ["C5@0+1", "D5@1+1", "C5@2+2"]
    long = play(part("SA", bar("E5/4", "s/2 C5/2"), bar(HIGH, LOW)))
    assert sung(long, "Alto")[:2] == ["E5@0+2", "C5@2+2"]


@pytest.mark.parametrize(
    ("text", "soprano", "alto"),
    [("S. solo", True, False), ("A.", False, True), ("Alti", False, True), ("solo", True, False),
     ("tutti", True, True), ("a 2", True, True), ("dolce", True, True)],
)  # fmt: skip
def test_words_say_who_sings(text: str, soprano: bool, alto: bool) -> None:
    bars = [bar(HIGH, LOW), bar("G4/4", marks=(words(text),)), bar("A4/4"), bar(HIGH, LOW)]
    score = play(part("SA", *bars))
    assert ("G4@4+4" in sung(score, "Soprano"), "G4@4+4" in sung(score, "Alto")) == (soprano, alto)
    assert ("A4@8+4" in sung(score, "Soprano"), "A4@8+4" in sung(score, "Alto")) == (soprano, alto)
    assert len(sung(score, "Soprano")) == 4 + 2 * soprano
    assert bool(remarks(score, "one voice on the staff")) is (soprano and alto)


def test_tutti_ends_a_solo() -> None:
    bars = [
        bar(HIGH, LOW),
        bar("G4/4", marks=(words("solo"),)),
        bar("A4/2 B4/2", marks=(words("tutti", 2),)),
    ]
    assert sung(play(part("SA", *bars)), "Alto") == ["E4@0+2", "F4@2+2", "B4@10+2"]


def test_chords_of_two_for_two_groups() -> None:
    """Hymns: one voice with chords where both move together, two voices where they do not."""
    score = play(part("Soprano & Alto", bar("C5+E4/2 D5+F4/2"), bar(HIGH, LOW), bar("G4/4")))
    assert names(score) == ["Soprano", "Alto"]
    assert sung(score, "Soprano") == ["C5@0+2", "D5@2+2", "C5@4+2", "D5@6+2", "G4@8+4"]
    assert sung(score, "Alto") == ["E4@0+2", "F4@2+2", "E4@4+2", "F4@6+2", "G4@8+4"]


def test_a_divided_voice_is_two_parts_all_through() -> None:
    score = play(part("Soprano", "C5/4", "C5+E5/4", "C5/2 C5+F5/2"))
    assert names(score) == ["Soprano 1", "Soprano 2"]
    assert sung(score, "Soprano 1") == ["C5@0+4", "E5@4+4", "C5@8+2", "F5@10+2"]
    assert sung(score, "Soprano 2") == ["C5@0+4", "C5@4+4", "C5@8+2", "C5@10+2"]
    (found,) = remarks(score, "divided")
    assert found.startswith("note: piece.xml: Soprano, bar 2: Soprano is divided into 2 lines")
    assert found.endswith("(bars 2-3)")


def test_a_second_voice_in_a_few_bars_divides_too() -> None:
    score = play(part("Tenor", "C4/4", bar("E4/4", "C4/2 D4/2"), "E4/4"))
    assert names(score) == ["Tenor 1", "Tenor 2"]
    assert sung(score, "Tenor 2") == ["C4@0+4", "C4@4+2", "D4@6+2", "E4@8+4"]


def test_divided_into_three_and_two() -> None:
    score = play(part("Alto", "C4+E4+G4/4", "C4+E4/4", "C4/4"))
    assert names(score) == ["Alto 1", "Alto 2", "Alto 3"]
    assert [sung(score, name)[1] for name in names(score)] == ["E4@4+4", "E4@4+4", "C4@4+4"]


def test_a_divided_group_on_a_shared_staff() -> None:
    score = play(part("SA", bar("E5+C5/4", "G4/4"), bar("C5/4", "E4/4"), bar("G4/4")))
    assert names(score) == ["Soprano 1", "Soprano 2", "Alto"]
    assert sung(score, "Soprano 2") == ["C5@0+4", "C5@4+4", "G4@8+4"]
    assert sung(score, "Alto") == ["G4@0+4", "E4@4+4", "G4@8+4"]


def test_a_numbered_part_that_divides_gets_letters() -> None:
    score = play(part("Tenor 1", "C4+E4/4"), part("Tenor 2", "A3/4"))
    assert names(score) == ["Tenor 1a", "Tenor 1b", "Tenor 2"]


def test_equal_names_are_numbered_past_taken_ones() -> None:
    pieces = [part("Soprano", "C5/4", id="P1"), part("soprano", "B4/4", id="P2")]
    assert names(play(*pieces)) == ["Soprano 1", "soprano 2"]
    taken = [*pieces, part("Soprano 1", "E5/4", id="P3")]
    assert names(play(*taken)) == ["Soprano 2", "soprano 3", "Soprano 1"]


def test_closed_score_in_one_part_with_two_staves() -> None:
    four = bar("1.1:C5/4", "1.2:G4/4", "2.5:E4/4", "2.6:C3/4")
    assert names(play(part("SATB", four))) == ["Soprano", "Alto", "Tenor", "Bass"]
    # Without a name, the ranges and their order tell.
    unnamed = play(part("", four))
    assert names(unnamed) == ["Soprano", "Alto", "Tenor", "Bass"]
    assert remarks(unnamed, "without names were taken for")
    assert [(one.staff, one.voice) for one in unnamed.parts] == [
        (1, "1"), (1, "2"), (2, "5"), (2, "6")
    ]  # fmt: skip


def test_nameless_parts_that_are_no_four_voices() -> None:
    assert names(play(*(part("", text, id=text) for text in ("C5/4", "E4/4", "C3/4")))) == [
        "Part 1", "Part 2", "Part 3"
    ]  # fmt: skip
    low = play(*(part("", text, id=text) for text in ("C3/4", "E3/4", "G3/4", "C4/4")))
    assert names(low) == ["Part 1", "Part 2", "Part 3", "Part 4"]


def test_names_that_programs_write_by_default() -> None:
    voices = [part("Voice", text, id=text) for text in ("C5/4", "G4/4", "E4/4", "C3/4")]
    assert names(play(*voices)) == ["Soprano", "Alto", "Tenor", "Bass"]
    people = [
        part(name, text)
        for name, text in (("Mira", "C5/4"), ("Oda", "G4/4"), ("Tam", "E4/4"), ("Ulf", "C3/4"))
    ]
    assert names(play(*people)) == ["Mira", "Oda", "Tam", "Ulf"]


def test_instrument_and_program_help_where_the_name_does_not() -> None:
    sopr = part("Part 1", "C5/4", instrument="voice.soprano", id="P1")
    organ = part("Part 2", bar("1.1:C4/4", "2.5:C2/4"), program=19, staves=2, id="P2")
    score = play(sopr, organ)
    assert [(one.name, one.kind) for one in score.parts] == [
        ("Soprano", PartKind.VOICE),
        ("Part 2", PartKind.ACCOMPANIMENT),
    ]


def test_a_voice_in_the_wrong_octave_is_doubted() -> None:
    assert remarks(play(part("Tenor", "C5/4 D5/4")), "an octave too high for its voice (tenor)")
    assert not remarks(play(part("Tenor", "C4/4 D4/4")), "octave")


# --- accompaniment ------------------------------------------------------------------------

CHOIR = part("Soprano", "C5/4", "D5/4"), part("Bass", "C3/4", "D3/4")


def test_a_keyboard_stays_one_part_that_cannot_move() -> None:
    organ = part("Orgel", bar("1.1:E5/4", "1.2:C5+G4/4", "2.5:C3/4 C2/4"), staves=2)
    score = play(*CHOIR, organ)
    assert names(score) == ["Soprano", "Bass", "Orgel"]
    assert [one.tuned for one in score.parts] == [True, True, False]
    assert len(sung(score, "Orgel")) == 5
    assert score.parts[2].voice_type is None


def test_a_bare_continuo_line_moves_and_one_with_chords_does_not() -> None:
    bare = play(*CHOIR, part("Basso continuo", "C2/4", "D2/4"))
    assert bare.parts[2].kind is PartKind.VOICE
    played = play(*CHOIR, part("Continuo", bar("1.1:C4/4", "2.2:C2/4"), staves=2))
    assert played.parts[2].kind is PartKind.ACCOMPANIMENT


def test_a_wordless_instrument_can_move() -> None:
    score = play(*CHOIR, part("Violin", "E5/4", "F5/4"))
    assert (score.parts[2].kind, score.parts[2].voice_type) == (PartKind.VOICE, None)


REDUCTION = part("Piano", bar("1.1:C5/4", "2.5:C3/4"), bar("1.1:D5/4", "2.5:D3/4"), staves=2)


def test_a_keyboard_that_only_doubles_is_left_out() -> None:
    score = play(*CHOIR, REDUCTION)
    assert (names(score), score.left_out) == (["Soprano", "Bass"], ("Piano",))
    assert remarks(score, "it doubles the voices 100% of the time; name 'Piano' as accompaniment")


def test_a_keyboard_with_notes_of_its_own_sounds() -> None:
    own = part("Piano", bar("1.1:C5/4", "2.5:C3/4"), bar("1.1:F#5/4", "2.5:D3/4"), staves=2)
    assert play(*CHOIR, own).left_out == ()


@pytest.mark.parametrize("name", ["Piano (for rehearsal only)", "Klavierauszug"])
def test_a_reduction_by_name(name: str) -> None:
    other = part(name, "F#5/4", "F#5/4")
    assert play(*CHOIR, other).left_out == (name,)
    assert play(*CHOIR, other, accompaniment=(name.upper(),)).left_out == ()


def test_a_reduction_by_words_in_the_score() -> None:
    piano = part("Piano", bar("F#5/4", marks=(words("for rehearsal only"),)), "F#5/4")
    assert play(*CHOIR, piano).left_out == ("Piano",)


def test_wishes() -> None:
    score = play(*CHOIR, REDUCTION, accompaniment=("piano", "BASS"))
    assert [one.tuned for one in score.parts] == [True, False, False]
    with pytest.raises(WishError, match="Did you mean Soprano\\? Its parts are: Soprano, Bass"):
        play(*CHOIR, accompaniment=("Sopran",))


def test_a_wish_may_name_the_part_of_the_file() -> None:
    score = play(part("Women", bar(HIGH, LOW)), part("Bass", "C3/4"), accompaniment=("women",))
    assert [one.tuned for one in score.parts] == [False, False, True]


def test_keyboard_alone_is_tuned() -> None:
    hymn = part("Piano", bar("1.1:C5/4", "1.2:G4/4", "2.5:E4/4", "2.6:C3/4"), staves=2)
    score = play(hymn)
    assert names(score) == ["Soprano", "Alto", "Tenor", "Bass"]
    assert all(one.tuned for one in score.parts)
    assert remarks(score, "no part for voices")
    assert not any(one.tuned for one in play(hymn, accompaniment=("Piano",)).parts)


def test_unpitched_parts() -> None:
    drums = part("Drums", "r/4", unpitched=7)
    score = play(*CHOIR, drums)
    assert score.left_out == ("Drums",)
    assert [f.weight for f in score.findings if "7 unpitched notes" in f.what] == [Weight.LOSS]


def test_nothing_to_sing() -> None:
    with pytest.raises(UnreadableError, match=r"piece\.xml: the score has no notes"):
        play(part("Alto", "r/4"))
