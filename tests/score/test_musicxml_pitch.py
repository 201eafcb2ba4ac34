"""Sounding pitch: transposition, octave clefs, fractional alterations, keys.

Sources: MusicXML 4.0 (W3C), elements transpose, clef-octave-change, alter, key.
"""

from __future__ import annotations

import pytest

from retune.errors import Weight
from retune.limits import Limits
from retune.score.musicxml import read_musicxml
from retune.score.musicxml.transposition import Transposition, interval
from retune.written import WrittenBar, WrittenChordSymbol
from tests.score.musicxml_text import (
    attributes,
    note,
    part_text,
    read,
    read_bar,
    read_part,
    said,
    score_text,
)

OCTAVE_CLEF = "<clef><sign>G</sign><line>2</line><clef-octave-change>-1</clef-octave-change></clef>"


def transpose(
    chromatic: str, diatonic: str | None = None, octave: str | None = None, number: str = ""
) -> str:
    steps = "" if diatonic is None else f"<diatonic>{diatonic}</diatonic>"
    turn = "" if octave is None else f"<octave-change>{octave}</octave-change>"
    staff = f' number="{number}"' if number else ""
    return f"<transpose{staff}>{steps}<chromatic>{chromatic}</chromatic>{turn}</transpose>"


def key(fifths: str) -> str:
    return f"<key><fifths>{fifths}</fifths></key>"


def names(bar: WrittenBar) -> list[str]:
    return [n.pitch.name for n in bar.notes]


# Instruments and their intervals: any book on orchestration (common practice, no source).
@pytest.mark.parametrize(
    ("transposition", "written", "sounding"),
    [
        (transpose("-2", "-1"), "C5", "Bb4"),  # clarinet in B flat
        (transpose("-3", "-2"), "C5", "A4"),  # clarinet in A
        (transpose("-7", "-4"), "F#4", "B3"),  # horn in F
        (transpose("3", "2"), "B4", "D5"),  # clarinet in E flat
        (transpose("-9", "-5"), "C5", "Eb4"),  # alto saxophone
        (transpose("0", "0", "-1"), "C5", "C4"),  # tenor on a plain treble clef
        (transpose("0", None, "-1"), "C5", "C4"),  # the same without <diatonic>
        (transpose("-2", None), "C5", "Bb4"),
        (transpose("-2", "-1", "-1"), "D5", "C4"),  # tenor saxophone
        (transpose("-12", "-7"), "F4", "F3"),
        (transpose("6", "4"), "C4", "Gb4"),
        (transpose("6", "3"), "C4", "F#4"),
    ],
)
def test_written_becomes_sounding_pitch(transposition: str, written: str, sounding: str) -> None:
    assert names(read_bar(attributes(transposition) + note(written))) == [sounding]


def test_the_key_sounds_too_and_stays_within_seven_signs() -> None:
    """A part written in G flat for a clarinet in B flat sounds in E, not in F flat."""
    bar = read_bar(attributes(key("-6") + transpose("-2", "-1")) + note("Gb4"))
    assert names(bar) == ["E4"]
    assert bar.key == (4, None)
    assert read_bar(attributes(key("2") + transpose("-2", "-1")) + note()).key == (0, None)
    assert read_bar(attributes(transpose("-2", "-1") + key("2")) + note()).key == (0, None)


def test_a_transposition_changes_from_where_it_stands() -> None:
    part = read_part(
        attributes(transpose("-2", "-1")) + note("C5"),
        note("C5") + attributes(transpose("0", "0")) + note("C5"),
    )
    assert [names(bar) for bar in part.bars] == [["Bb4"], ["Bb4", "C5"]]


def test_a_transposition_may_hold_for_one_staff() -> None:
    bar = read_bar(
        attributes("<staves>2</staves>" + transpose("0", "0", "-1", number="2"))
        + note("C5", 4, "<staff>1</staff>")
        + note("C5", 4, "<staff>2</staff>")
    )
    assert names(bar) == ["C5", "C4"]


def test_steps_that_do_not_fit_the_semitones_are_named() -> None:
    score = read(attributes(transpose("-2", "-5")) + note("C5"))
    assert names(score.parts[0].bars[0]) == ["Bb4"]
    assert len(score.findings) == 1


def test_a_transposition_that_names_its_octave_twice_adds_both_and_is_named() -> None:
    score = read(attributes(transpose("-12", "-7", "-1")) + note("C6"))
    assert names(score.parts[0].bars[0]) == ["C4"]
    assert "names its octave twice" in said(score)[0]


def test_a_doubled_part_sounds_at_both_octaves() -> None:
    """MusicXML 4.0, <double>: the music is doubled one octave down, or up with above="yes"."""
    double = "<transpose><chromatic>0</chromatic><double/></transpose>"
    score = read(attributes(double) + note("C4"))
    bar = score.parts[0].bars[0]
    assert names(bar) == ["C4", "C3"]
    assert len({n.source for n in bar.notes}) == 2
    lowest = read_bar(attributes(double) + note("C4").replace("<octave>4", "<octave>-1"))
    assert names(lowest) == ["C-1"]
    above = double.replace("<double/>", '<double above="yes"/>')
    assert names(read_bar(attributes(above) + note("C4"))) == ["C4", "C5"]


def test_an_octave_clef_alone_changes_nothing() -> None:
    part = read_part(attributes(OCTAVE_CLEF) + note("C4"))
    assert names(part.bars[0]) == ["C4"]
    assert part.clefs == ("G8",)


@pytest.mark.parametrize(
    ("written", "sounding", "reading"),
    # A tenor's notes lie about the middle line of his clef, B3.
    [
        (("C4", "E4", "A3"), ["C4", "E4", "A3"], "once"),
        (("C5", "E5", "A4"), ["C4", "E4", "A3"], "twice"),
    ],
)
def test_clef_and_transposition_together_are_settled_by_range(
    written: tuple[str, ...], sounding: list[str], reading: str
) -> None:
    score = read(
        attributes(OCTAVE_CLEF + transpose("0", "0", "-1")) + "".join(note(n) for n in written)
    )
    assert names(score.parts[0].bars[0]) == sounding
    assert len(score.findings) == 1
    assert score.findings[0].what.endswith(f"read as lowered {reading}")


def test_first_clefs_are_kept_for_each_staff() -> None:
    clefs = "<staves>2</staves>" + "".join(
        f'<clef number="{n}"><sign>{sign}</sign></clef>' for n, sign in ((1, "C"), (2, "F"))
    )
    part = read_part(attributes(clefs) + note(), attributes("<clef><sign>G</sign></clef>") + note())
    assert part.clefs == ("C", "F")
    assert part.staves == 2


@pytest.mark.parametrize(
    ("alter", "sounding"),
    [
        ("0.5", "C4"),
        ("-0.5", "C4"),
        ("0.51", "C#4"),
        ("1.5", "C#4"),
        ("-1.41", "Cb4"),
        ("0.14", "C4"),
    ],
)
def test_alterations_between_keys_take_the_nearest_and_are_named(alter: str, sounding: str) -> None:
    """MusicXML 4.0, <alter>: microtonal alterations are decimals, 0.5 a quarter tone."""
    text = note("C#4").replace("<alter>1", f"<alter>{alter}")
    score = read(text)
    assert names(score.parts[0].bars[0]) == [sounding]
    assert score.findings[0].weight is Weight.LOSS
    assert "nearest key" in score.findings[0].what


@pytest.mark.parametrize(
    "broken",
    [
        "<pitch><step>H</step><octave>4</octave></pitch>",
        "<pitch><step>C</step></pitch>",
        "<pitch><step>C</step><octave>99</octave></pitch>",
        "<pitch><step>C</step><octave>-1</octave><alter>-1</alter></pitch>",
        "<pitch><step>C</step><alter>1e9</alter><octave>4</octave></pitch>",
        "<pitch><step>C</step><alter>99</alter><octave>4</octave></pitch>",
        "<pitch/>",
        "",
    ],
)
def test_notes_without_a_sensible_pitch_are_left_out_and_named(broken: str) -> None:
    score = read(f"<note>{broken}<duration>4</duration></note>" + note("D4"))
    assert names(score.parts[0].bars[0]) == ["D4"]
    assert score.parts[0].bars[0].notes[0].onset == 1
    assert score.findings[0].weight is Weight.LOSS


def test_a_printed_accidental_against_the_pitch_is_named() -> None:
    score = read(note("B4", 4, "<accidental>sharp</accidental>"))
    assert names(score.parts[0].bars[0]) == ["B4"]
    assert "printed accidental" in said(score)[0]
    assert not read(note("Bb4", 4, "<accidental>flat</accidental>")).findings


def test_keys_of_other_kinds_are_named() -> None:
    steps = "<key><key-step>F</key-step><key-alter>1</key-alter></key>"
    score = read(attributes(steps) + note())
    assert score.parts[0].bars[0].key is None
    assert score.findings[0].weight is Weight.LOSS


def test_keys_carry_their_mode_and_cancels_are_passed_over() -> None:
    full = "<key><cancel>3</cancel><fifths>-2</fifths><mode>Minor</mode></key>"
    assert read_bar(attributes(full) + note()).key == (-2, "minor")
    assert read_bar(attributes(full.replace("Minor", "none")) + note()).key == (-2, None)


def test_a_key_after_the_last_note_belongs_to_the_next_bar() -> None:
    part = read_part(attributes(key("1")) + note() + attributes(key("2")), note())
    assert [bar.key for bar in part.bars] == [(1, None), (2, None)]


@pytest.mark.parametrize(
    ("time", "metre"),
    [
        ("<beats>3</beats><beat-type>4</beat-type>", (3, 4)),
        ("<beats>3+2</beats><beat-type>8</beat-type>", (5, 8)),
        (
            "<beats>3</beats><beat-type>8</beat-type><beats>2</beats><beat-type>4</beat-type>",
            (7, 8),
        ),
        ("<beats>0</beats><beat-type>4</beat-type>", None),
        ("<beats>4</beats><beat-type>0</beat-type>", None),
        ("<beats>4</beats>", None),
        ("<senza-misura/>", None),
    ],
)
def test_metres(time: str, metre: tuple[int, int] | None) -> None:
    """MusicXML 4.0, <time>: composite signatures by + or by several pairs."""
    score = read(attributes(f"<time>{time}</time>") + note())
    assert score.parts[0].bars[0].metre == metre
    assert bool(score.findings) is (metre is None)


def test_staves_with_their_own_keys_use_the_first() -> None:
    keys = '<key number="1"><fifths>2</fifths></key><key number="2"><fifths>-1</fifths></key>'
    score = read(attributes("<staves>2</staves>" + keys) + note())
    assert score.parts[0].bars[0].key == (2, None)
    assert score.findings[0].weight is Weight.NOTE


def test_intervals_agree_with_the_line_of_fifths() -> None:
    """Each whole number of fifths up, as steps and semitones (common practice, no source)."""
    table = {(7, 4): 1, (2, 1): 2, (-2, -1): -2, (1, 1): -5, (1, 0): 7, (-1, -1): 5, (0, 0): 0}
    for (chromatic, diatonic), fifths in table.items():
        assert interval(chromatic, diatonic, 0, 0) == (Transposition(chromatic, fifths), True)


def test_chord_symbols_sound_too() -> None:
    harmony = "<harmony><root><root-step>C</root-step></root><kind>major</kind></harmony>"
    text = score_text(part_text(attributes(transpose("-2", "-1")) + harmony + note("C5")))
    mark = read_musicxml(text, Limits()).parts[0].bars[0].marks[0]
    assert isinstance(mark.value, WrittenChordSymbol)
    assert mark.value.root.name == "Bb"
