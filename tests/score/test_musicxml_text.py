"""Lyrics, titles, the part list. Sources: MusicXML 4.0 (W3C), elements lyric, part-list, work,
identification, credit; elisions of the lyric range of SMuFL 1.4 (U+E550 to U+E552)."""

from __future__ import annotations

import pytest

from retune.errors import Weight
from retune.limits import Limits
from retune.score.musicxml import read_musicxml
from retune.written import WrittenLyric, WrittenScore
from tests.score.musicxml_text import note, part_text, read_bar, said, score_text


def lyrics(*elements: str) -> tuple[WrittenLyric, ...]:
    return read_bar(note(inner="".join(elements))).notes[0].lyrics


def lyric(text: str, attributes: str = "", syllabic: str = "") -> str:
    place = f"<syllabic>{syllabic}</syllabic>" if syllabic else ""
    return f"<lyric {attributes}>{place}<text>{text}</text></lyric>"


def test_syllables_keep_their_verse_and_their_place_in_the_word() -> None:
    assert lyrics(lyric("Hal", 'number="1"', "begin"), lyric("Freu", 'number="2"', "single")) == (
        WrittenLyric("Hal", "begin", "1"),
        WrittenLyric("Freu", "single", "2"),
    )


@pytest.mark.parametrize(
    ("attributes", "verse"),
    [
        ("", "1"),
        ('number="3"', "3"),
        ('number="part1verse2"', "2"),
        ('name="Verse 4"', "4"),
        ('name="Verse"', "1"),
        ('number="chorus"', "chorus"),
        ('number="2" name="Chorus"', "chorus"),
        ('number="2" name="Verse"', "2"),
        ('number="descant"', "descant"),
    ],
)
def test_verses_have_numbers_or_names(attributes: str, verse: str) -> None:
    assert lyrics(lyric("la", attributes))[0].verse == verse


@pytest.mark.parametrize(
    ("elision", "text"),
    [
        ("<elision/>", "co\u203fe"),
        ("<elision>\u203f</elision>", "co\u203fe"),
        ("<elision> </elision>", "co\u203fe"),
        ("<elision>_</elision>", "co\u203fe"),
        ("<elision>\ue551</elision>", "co\u203fe"),
        ("<elision>~</elision>", "co~e"),
        ("", "coe"),
    ],
)
def test_elided_syllables_are_joined(elision: str, text: str) -> None:
    assert lyrics(f"<lyric><text>co</text>{elision}<text>e</text></lyric>")[0].text == text


@pytest.mark.parametrize(
    ("first", "second", "together"),
    [
        ("end", "begin", "middle"),
        ("single", "begin", "begin"),
        ("end", "single", "end"),
        ("single", "single", "single"),
    ],
)
def test_elided_syllables_take_one_place(first: str, second: str, together: str) -> None:
    syllables = lyrics(
        f"<lyric><syllabic>{first}</syllabic><text>a</text><elision/>"
        f"<syllabic>{second}</syllabic><text>b</text></lyric>"
    )
    assert syllables[0].syllabic == together


def test_a_line_that_only_extends_is_no_syllable() -> None:
    assert lyrics("<lyric><extend/></lyric>", "<lyric><text> </text></lyric>", "<lyric/>") == ()
    assert lyrics("<lyric><text>ah</text><extend/></lyric>")[0].text == "ah"


def test_humming_is_sung() -> None:
    assert lyrics('<lyric number="2"><humming/></lyric>') == (WrittenLyric("mm", "single", "2"),)


def test_a_syllable_may_be_for_some_passes() -> None:
    assert lyrics(lyric("la", 'time-only="1, 3"'))[0].passes == (1, 3)
    assert lyrics(lyric("la"))[0].passes == ()


def test_white_space_in_a_syllable_is_settled() -> None:
    assert lyrics(lyric("\n  la   la\n"))[0].text == "la la"


# --- titles -------------------------------------------------------------------------------

WORK = "<work><work-title>Harbour Mass</work-title></work>"


def read_headed(head: str, part_list: str = '<score-part id="P1"/>') -> WrittenScore:
    return read_musicxml(score_text(part_text(note()), head=head, part_list=part_list), Limits())


def credit(kind: str, words: str, size: str = "12") -> str:
    named = f"<credit-type>{kind}</credit-type>" if kind else ""
    return (
        f'<credit page="1">{named}<credit-words font-size="{size}">{words}</credit-words></credit>'
    )


@pytest.mark.parametrize(
    ("head", "title"),
    [
        (WORK, "Harbour Mass"),
        ("<movement-title>Kyrie</movement-title>", "Kyrie"),
        (f"{WORK}<movement-title>Kyrie</movement-title>", "Harbour Mass: Kyrie"),
        (
            "<work><work-title>Kyrie</work-title></work><movement-title>Kyrie I</movement-title>",
            "Kyrie I",
        ),
        (credit("title", "Low Tide"), "Low Tide"),
        (credit("", "anonymous", "10") + credit("", "Low Tide", "22"), "Low Tide"),
        (credit("composer", "N. N.", "22"), ""),
        ("", ""),
    ],
)
def test_titles(head: str, title: str) -> None:
    assert read_headed(head).title == title


def test_composer_lyricist_and_rights() -> None:
    score = read_headed(
        '<identification><creator type="composer">A. Example</creator>'
        '<creator type="poet">B. Example</creator><creator type="lyricist">C. Example</creator>'
        '<creator type="arranger">D. Example</creator>'
        "<rights>CC0</rights><rights>2026</rights></identification>"
    )
    assert (score.composer, score.lyricist) == ("A. Example", "B. Example, C. Example")
    assert score.copyright == "CC0; 2026"
    assert score.format == "musicxml"
    printed = credit("composer", "E. Example") + credit("rights", "free")
    assert read_headed(printed).composer == "E. Example"
    assert read_headed(printed).copyright == "free"


# --- the part list ------------------------------------------------------------------------


def test_parts_have_names_instruments_programs_and_groups() -> None:
    part_list = (
        '<part-group number="1" type="start"><group-name>Choir</group-name></part-group>'
        '<part-group number="2" type="start"><group-symbol>bracket</group-symbol></part-group>'
        '<score-part id="P1"><part-name>Soprano</part-name>'
        "<part-abbreviation>S.</part-abbreviation>"
        '<score-instrument id="I1"><instrument-name>Voice</instrument-name>'
        "<instrument-sound>voice.soprano</instrument-sound></score-instrument>"
        '<midi-instrument id="I1"><midi-program>53</midi-program></midi-instrument></score-part>'
        '<part-group number="2" type="stop"/><part-group number="1" type="stop"/>'
        '<score-part id="P2"><part-name></part-name><part-name-display>'
        "<display-text>Organ</display-text></part-name-display></score-part>"
        '<score-part id="P3"><score-instrument id="I3"><instrument-name>Tenor</instrument-name>'
        "</score-instrument></score-part>"
    )
    text = score_text(
        *(part_text(note(), id=f"P{number}") for number in (1, 2, 3)), part_list=part_list
    )
    first, second, third = read_musicxml(text, Limits()).parts
    assert (first.name, first.abbreviation, first.group) == ("Soprano", "S.", "Choir")
    assert (first.instrument, first.program) == ("voice.soprano", 52)
    assert (second.name, second.group, second.program) == ("Organ", "", None)
    assert (third.name, third.instrument) == ("Tenor", "Tenor")


def test_parts_come_in_the_order_of_the_part_list() -> None:
    text = score_text(
        part_text(note("C4"), id="B"),
        part_text(note("D4"), id="A"),
        part_list='<score-part id="A"/><score-part id="B"/>',
    )
    assert [part.id for part in read_musicxml(text, Limits()).parts] == ["A", "B"]


def test_nameless_music_takes_the_unclaimed_entries() -> None:
    """The unofficial MusicXML test suite has such a file, 41g."""
    text = score_text(part_text(note()).replace(' id="P1"', ""))
    score = read_musicxml(text, Limits())
    assert [part.name for part in score.parts] == ["Alto"]
    assert not score.findings


def test_what_does_not_match_the_part_list_is_named() -> None:
    text = score_text(
        part_text(note(), id="X"),
        part_text(note(), id="X"),
        part_list='<score-part id="P1"><part-name>Alto</part-name></score-part>',
    )
    score = read_musicxml(text, Limits())
    assert len({part.id for part in score.parts}) == 2
    assert len({n.source for p in score.parts for b in p.bars for n in b.notes}) == 2
    assert said(score)[-1] == "loss: Alto: the part is listed but has no music"
    assert score.findings[0].weight is Weight.DOUBT


def test_a_score_without_a_part_list_is_still_read() -> None:
    text = f"<score-partwise>{part_text(note())}</score-partwise>".encode()
    assert read_musicxml(text, Limits()).parts[0].name == "Part 1"
