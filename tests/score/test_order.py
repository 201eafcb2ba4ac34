"""Repeats, endings and jumps played out.

Repeats and endings as MusicXML 4.0 (W3C) defines them; jumps are common practice, no source.
The lilypond MusicXML test suite and music21's corpus are read from the installed music21.
"""

from __future__ import annotations

from pathlib import Path

import music21
import pytest

from retune.errors import LimitError
from retune.limits import Limits
from retune.score.build import build_score
from retune.score.musicxml import read_musicxml
from retune.score.options import ReadOptions
from retune.written import MarkKind, WrittenBar
from tests.score.written_text import bar, bar_numbers, mark, part, play, remarks

SUITE = Path(music21.__file__).parent / "musicxml" / "lilypondTestSuite"

KINDS = {
    "segno": MarkKind.SEGNO,
    "coda": MarkKind.CODA,
    "fine": MarkKind.FINE,
    "dc": MarkKind.DA_CAPO,
    "ds": MarkKind.DAL_SEGNO,
    "to-coda": MarkKind.TO_CODA,
}


def bars(text: str) -> list[WrittenBar]:
    """Bars from a sketch: "|:" and ":|" or ":|3" around them, "[1,2" and "]", signs by name."""
    made: list[WrittenBar] = []
    for sketch in text.split(" / "):
        fields: dict[str, object] = {}
        marks = []
        for token in sketch.split():
            if token == "|:":
                fields["repeat_start"] = True
            elif token.startswith(":|"):
                fields["repeat_end"] = int(token[2:] or 2)
            elif token.startswith("["):
                fields["ending"] = tuple(int(number) for number in token[1:].split(","))
            elif token == "]":
                fields["ending_stop"] = True
            else:
                kind, _, value = token.partition("=")
                onset = 0 if kind in ("segno", "coda") else 3
                marks.append(mark(KINDS[kind], value or None, onset))
        made.append(bar("C5/4", marks=tuple(marks), **fields))
    return made


def order(text: str, **options: object) -> str:
    return bar_numbers(play(part("Alto", *bars(text)), **options))


@pytest.mark.parametrize(
    ("sketch", "played"),
    [
        (" /  / ", "1 2 3"),
        ("|: / :| / ", "1 2 1 2 3"),
        # A missing start goes back to the beginning, or to the end of the section before.
        (" / :| / ", "1 2 1 2 3"),
        ("|: / :| /  / :| / ", "1 2 1 2 3 4 3 4 5"),
        ("|: :|3 / ", "1 1 1 2"),
        ("|: / [1 ] :| / [2 ] / ", "1 2 1 3 4"),
        ("|: / [1,2 ] :| / [3 ] / ", "1 2 1 2 1 3 4"),
        # Endings of two bars; and the second one without a stop.
        ("|: / [1 / ] :| / [2 / ] / ", "1 2 3 1 4 5 6"),
        ("|: / [1 :| / [2 / ", "1 2 1 3 4"),
        # Only the first ending is printed.
        ("|: / [1 ] :| / ", "1 2 1 3"),
        # A repeat sign forgotten between two endings.
        ("|: / [1 ] / [2 ] / ", "1 2 1 3 4"),
        # Numbers that jump: pass 2 takes the ending of pass 1.
        ("|: / [1 ] :| / [3 ] / ", "1 2 1 2 1 3 4"),
        # Two sections, each with endings.
        (
            "|: / [1 ] :| / [2 ] / |: / [1 ] :| / [2 ]",
            "1 2 1 3 4 5 4 6",
        ),
        # Sections inside each other, as in a piece for pipes.
        ("|: / |: :| / :| / ", "1 2 2 3 1 2 2 3 4"),
        # A bracket that no pass reaches is read as if it were not there.
        (" / [2 ] / ", "1 2 3"),
    ],
)
def test_repeats(sketch: str, played: str) -> None:
    assert order(sketch) == played


@pytest.mark.parametrize(
    ("sketch", "played"),
    [
        (" / fine / dc=fine", "1 2 3 1 2"),
        (" / fine / dc", "1 2 3 1 2"),
        (" / dc", "1 2 1 2"),
        # After the jump the repeat is not taken again, and its last ending is played.
        ("|: :| / fine / dc=fine", "1 1 2 3 1 2"),
        ("|: / [1 ] :| / [2 ] fine / dc=fine", "1 2 1 3 4 1 3"),
        # D.C. at a repeat's end waits for the last pass.
        ("fine / |: dc=fine :|", "1 2 2 1"),
        (" / segno /  / fine / ds=fine", "1 2 3 4 5 2 3 4"),
        (" / to-coda / ds=coda / coda", "1 2 3 4"),
        # From the start to the coda sign, then on from the coda.
        (" / to-coda / dc=coda / coda / ", "1 2 3 1 2 4 5"),
        ("segno / to-coda / ds=coda / coda", "1 2 3 1 2 4"),
        # A repeat in the coda is still to be played.
        (" / to-coda / dc=coda / coda |: / :|", "1 2 3 1 2 4 5 4 5"),
        # D.C. in the first ending leads to the second one.
        (" / [1 dc ] / [2 ]", "1 2 1 3"),
        # Two jumps.
        (" / segno / ds / dc", "1 2 3 2 3 4 1 2 3 4"),
    ],
)
def test_jumps(sketch: str, played: str) -> None:
    assert order(sketch) == played


def test_a_sign_in_the_first_half_of_a_bar_leads_to_that_bar() -> None:
    first = bar("C5/4")
    second = bar("C5/4", marks=(mark(MarkKind.SEGNO),))
    late = bar("C5/4", marks=(mark(MarkKind.SEGNO, onset=3),))
    third = bar("C5/4", marks=(mark(MarkKind.DAL_SEGNO, "fine", 3),))
    fine = bar("C5/4", marks=(mark(MarkKind.FINE, None, 3),))
    assert bar_numbers(play(part("Alto", first, second, fine, third))) == "1 2 3 4 2 3"
    assert bar_numbers(play(part("Alto", first, late, fine, third))) == "1 2 3 4 3"


def test_two_coda_signs_without_words() -> None:
    sign = (mark(MarkKind.CODA),)
    made = [
        bar("C5/4"),
        bar("C5/4"),
        bar("C5/4", marks=sign),
        bar("C5/4", marks=(mark(MarkKind.DA_CAPO, "coda", 3),)),
        bar("C5/4", marks=sign),
    ]
    assert bar_numbers(play(part("Alto", *made))) == "1 2 3 4 1 2 5"


def test_signs_of_any_part_hold_for_all() -> None:
    top = part("Soprano", bar("C5/4"), bar("C5/4", repeat_end=2))
    low = part(
        "Bass",
        bar("C3/4", marks=(mark(MarkKind.FINE),)),
        bar("C3/4", marks=(mark(MarkKind.DA_CAPO),)),
    )
    score = play(top, low)
    assert bar_numbers(score) == "1 2 1 2 1"
    assert len([note for note in score.notes if note.part == 1]) == 5


def test_once_as_written() -> None:
    sketch = "|: / [1 ] :| / [2 ] fine / dc=fine"
    assert order(sketch, repeats=False) == "1 2 3 4"


def test_runs_count_the_passes() -> None:
    score = play(part("Alto", *bars("|: / [1 ] :| / [2 ] / fine / dc=fine")))
    assert [(one.number, one.run) for one in score.bars] == [
        ("1", 1), ("2", 1), ("1", 2), ("3", 2), ("4", 1), ("5", 1),
        ("1", 2), ("3", 2), ("4", 1),
    ]  # fmt: skip


@pytest.mark.parametrize(
    ("sketch", "remark"),
    [
        ("|: / ", "bar 1: a repeat starts here but never ends"),
        (" / ds", "bar 2: D.S. without a segno"),
        (" / to-coda / dc=coda", "without a coda sign"),
        (" / dc=fine", "without a Fine"),
        ("fine / dc / ", "bar 3: no repeat or jump leads here"),
    ],
)
def test_doubts(sketch: str, remark: str) -> None:
    found = remarks(play(part("Alto", *bars(sketch))))
    assert any(remark in text for text in found), found


def test_limits_hold_for_what_is_played() -> None:
    piece = part("Alto", *bars(" / :|999"))
    limits = Limits(max_notes=1000)
    with pytest.raises(LimitError, match=r"piece\.xml: bar 1: more than 1000 notes"):
        play(piece, limits=limits)
    assert len(play(piece, limits=limits, repeats=False).notes) == 2
    with pytest.raises(LimitError, match="plays longer than 60 seconds"):
        play(piece, limits=Limits(max_seconds=60))


def test_nested_repeats_cannot_grow_without_bound() -> None:
    sketch = " / ".join(["|:"] * 40 + [":|"] * 40)
    with pytest.raises(LimitError):
        order(sketch, limits=Limits(max_notes=10_000))


@pytest.mark.parametrize(
    ("name", "played"),
    [
        ("45a-SimpleRepeat", "1 1 1 1 1 2"),
        ("45b-RepeatWithAlternatives", "1 2 1 3 4"),
        ("45c-RepeatMultipleTimes", "1 2 3 2 3 2 3 2 3 2 3 4 5 6 7 4 5 6 7 4 5 6 7 8"),
        ("45e-Repeats-Nested-Alternatives", "1 2 1 3 4 5 5 6 7 6 8 9 8 9 10"),
        ("45g-Repeats-NotEnded", "1 2"),
    ],
)
def test_lilypond_suite(name: str, played: str) -> None:
    text = (SUITE / f"{name}.xml").read_text("utf-8")
    # The suite's repeats hold rests alone; sound them, so that there is something to play.
    text = text.replace("<rest/>", "<pitch><step>C</step><octave>5</octave></pitch>")
    text = text.replace('<rest measure="yes"/>', "<pitch><step>C</step><octave>5</octave></pitch>")
    written = read_musicxml(text.encode(), Limits())
    score = build_score(written, stem=name, file=None, options=ReadOptions())
    assert bar_numbers(score) == played
