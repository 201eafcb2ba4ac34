"""ABC, sign by sign, against the standard (2.1) and its worked examples (from memory)."""

from __future__ import annotations

from contextlib import suppress
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from retune.adapters.abc_tokens import passes_of, syllables_of
from retune.adapters.notation import read_notation
from retune.errors import LimitError, RetuneError
from retune.limits import Limits
from retune.written import MarkKind, WrittenBar, WrittenNote, WrittenScore


def tune(music: str, *fields: str) -> WrittenScore:
    """A tune with unit length 1/4, in 4/4 and C unless the fields say otherwise."""
    head = {"X": "1", "T": "Lantern", "M": "4/4", "L": "1/4", "K": "C"}
    head |= dict(field.split(":", 1) for field in fields)
    key = head.pop("K")
    text = "\n".join([f"{name}:{value}" for name, value in head.items()] + [f"K:{key}", music])
    return read_notation(text.encode(), "abc")


def bars(music: str, *fields: str) -> tuple[WrittenBar, ...]:
    return tune(music, *fields).parts[0].bars


def notes(music: str, *fields: str) -> list[WrittenNote]:
    return [note for bar in bars(music, *fields) for note in bar.notes]


def names(music: str, *fields: str) -> str:
    return " ".join(note.pitch.name for note in notes(music, *fields))


# --- pitch ------------------------------------------------------------------------------------


def test_octaves() -> None:
    assert names("C,, C, C c c' c''") == "C2 C3 C4 C5 C6 C7"


def test_accidentals_hold_to_the_bar_line_and_over_a_tie() -> None:
    assert names("^F F =F _B | F B") == "F#4 F#4 F4 Bb4 F4 B4"
    assert names("^^F __B | ^C4- | C2 C2") == "F##4 Bbb4 C#4 C#4 C4"


@pytest.mark.parametrize(
    ("key", "fifths", "mode"),
    [  # The standard's table of key signatures.
        ("C#", 7, "major"),
        ("Ebmaj", -3, "major"),
        ("Am", 0, "minor"),
        ("G Mix", 0, "mixolydian"),
        ("D dorian", 0, "dorian"),
        ("E phr", 0, "phrygian"),
        ("F Lydian", 0, "lydian"),
        ("Bloc", 0, "locrian"),
        ("F#m", 3, "minor"),
        ("HP", 2, "mixolydian"),
        ("none", 0, None),
    ],
)
def test_keys(key: str, fifths: int, mode: str | None) -> None:
    assert bars("CDEF|", f"K:{key}")[0].key == (fifths, mode)


def test_a_key_adds_accidentals_of_its_own() -> None:
    assert names("G A B c", "K:D Phr ^f") == "G4 A4 Bb4 C5"
    assert names("F E B", "K:D Phr ^f") == "F#4 Eb4 Bb4"


@pytest.mark.parametrize(
    ("clef", "first"),
    [
        ("C", "C5"),
        ("C clef=treble-8", "C4"),
        ("C treble8", "C4"),
        ("C clef=treble+8", "C6"),
        ("C clef=bass", "C5"),
        ("C bass", "C3"),  # before clef= was known: two octaves down
        ("C octave=-1", "C4"),
        ("C transpose=-2", "Bb4"),
    ],
)
def test_clefs_and_transpositions(clef: str, first: str) -> None:
    assert names("c d e f", f"K:{clef}").split()[0] == first


# --- time -------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("music", "lengths"),
    [
        ("A A2 A/ A/2 A// A3/2 A3/", "1 2 1/2 1/2 1/4 3/2 3/2"),
        ("A>B A<B A>>B A > B", "3/2 1/2 1/2 3/2 7/4 1/4 3/2 1/2"),
        ("(3ABc (2AB", "2/3 2/3 2/3 3/2 3/2"),
        ("(3:2:4ABcd", "2/3 2/3 2/3 2/3"),
        ("[CE]2 [C2E2]", "2 2 2 2"),
    ],
)
def test_lengths(music: str, lengths: str) -> None:
    found = [note.duration for note in notes(music, "M:none")]
    assert found == [Fraction(length) for length in lengths.split()]


def test_fields_inside_a_tune() -> None:
    found = bars("A4 | [M:3/4][K:D] F3 | [L:1/8] F6 |")
    assert [(bar.length, bar.metre) for bar in found] == [(4, (4, 4)), (3, (3, 4)), (3, None)]
    assert [bar.notes[0].pitch.name for bar in found] == ["A4", "F#4", "F#4"]


def test_rests_of_bars_and_parts_of_bars() -> None:
    found = bars("A2 z2 | Z2 | x4 | A4 |")
    assert [bar.length for bar in found] == [4, 4, 4, 4, 4]
    assert [rest.hidden for bar in found for rest in bar.rests] == [False, False, False, True]


def test_music_without_bar_lines_is_barred_by_its_metre() -> None:
    found = bars("A3 !fermata!B6 c3 |]")
    assert [bar.length for bar in found] == [4, 4, 4]
    heads = [note for bar in found for note in bar.notes]
    assert [(n.pitch.step, n.duration) for n in heads] == [
        ("A", 3), ("B", 1), ("B", 4), ("B", 1), ("C", 3),
    ]  # fmt: skip
    assert [(n.tie_stop, n.tie_start) for n in heads[1:4]] == [
        (False, True), (True, True), (True, False),
    ]  # fmt: skip
    assert [bool(n.marks) for n in heads] == [False, False, False, True, False]


def test_a_pick_up_is_bar_0_and_a_divided_bar_keeps_its_number() -> None:
    found = bars("G | A B c :| d | c4 |", "M:4/4")
    assert [(bar.number, bar.implicit) for bar in found] == [
        ("0", True), ("1", False), ("1", True), ("2", False),
    ]  # fmt: skip


# --- order ------------------------------------------------------------------------------------


def test_repeats_and_endings() -> None:
    found = bars("|: A4 | B4 |1,3 c4 :|2 d4 || e4 :: f4 :|")
    assert [bar.repeat_start for bar in found] == [True, False, False, False, False, True]
    assert [bar.repeat_end for bar in found] == [0, 0, 2, 0, 2, 2]
    assert [bar.ending for bar in found] == [(), (), (1, 3), (2,), (), ()]
    assert [bar.ending_stop for bar in found] == [False, False, True, True, False, False]


@pytest.mark.parametrize(
    ("text", "passes"), [("1", (1,)), ("1,3", (1, 3)), ("1-3", (1, 2, 3)), ("x", ())]
)
def test_passes(text: str, passes: tuple[int, ...]) -> None:
    assert passes_of(text) == passes


def test_signs_of_order_and_of_singing() -> None:
    found = bars("!segno! A4 | HB2 .c2 | !f!!<(!d4 | !<)!e4 !D.C.alfine! |")
    kinds = [(bar.number, m.kind, m.value) for bar in found for m in bar.marks]
    assert kinds == [
        ("1", MarkKind.SEGNO, None),
        ("3", MarkKind.DYNAMIC, "f"),
        ("3", MarkKind.HAIRPIN, "crescendo"),
        ("4", MarkKind.HAIRPIN, "stop"),
        ("4", MarkKind.DA_CAPO, "fine"),
    ]
    assert [sorted(note.marks) for note in found[1].notes] == [["fermata"], ["staccato"]]


@pytest.mark.parametrize(
    ("field", "qpm"),
    [("1/4=90", 90), ("3/8=50", 75), ('"Slow" 1/2=40', 80), ("1/4 3/8=40", 100), ("120", 120)],
)
def test_tempi(field: str, qpm: int) -> None:
    marks = bars("A4|", f"Q:{field}")[0].marks
    assert [mark.value for mark in marks if mark.kind is MarkKind.TEMPO] == [qpm]


# --- words ------------------------------------------------------------------------------------


def test_words_follow_the_standards_signs() -> None:
    line = "Lan-tern _ on~the * wa - ter | now"
    assert list(syllables_of(line))[:4] == ["Lan-", "tern", "_", "on the"]
    found = notes(f"A B c d | e f g a | b c' d' e' | c4 |\nw: {line}")
    assert [n.lyrics[0].text if n.lyrics else "" for n in found] == [
        "Lan", "tern", "", "on the", "", "wa", "", "ter", "now", "", "", "", "",
    ]  # fmt: skip
    assert [n.lyrics[0].syllabic for n in found if n.lyrics] == [
        "begin", "end", "single", "begin", "end", "single",
    ]  # fmt: skip


def test_lines_of_words_are_verses() -> None:
    (first, second) = notes("A2 B2|\nw: come in\nw: go out")
    assert [(w.verse, w.text) for w in first.lyrics] == [("1", "come"), ("2", "go")]
    assert [(w.verse, w.text) for w in second.lyrics] == [("1", "in"), ("2", "out")]


def test_left_over_syllables_are_told() -> None:
    score = tune("A2 B2|\nw: one two three")
    assert any("more syllables than notes" in finding.what for finding in score.findings)


# --- pieces -----------------------------------------------------------------------------------


def several(*tunes: str) -> bytes:
    head = "X:{}\nT:Two Boats\n{}\nM:4/4\nL:1/4\nK:C{}\n{}\n"
    return "\n".join(
        head.format(number, *one.split("|", 2)) for number, one in enumerate(tunes, start=1)
    ).encode()


def test_tunes_named_as_parts_are_one_piece() -> None:
    score = read_notation(several("T:Cantus||cdef|]", "T:Bassus| clef=bass|C,4 C,4|]"), "abc")
    assert [part.name for part in score.parts] == ["Cantus", "Bassus"]
    assert any("2 tunes of one title" in finding.what for finding in score.findings)


def test_tunes_of_one_length_in_two_clefs_are_one_piece() -> None:
    score = read_notation(several("N:||cdef|]", "N:| clef=bass|C,4|]"), "abc")
    assert len(score.parts) == 2


def test_variants_of_a_tune_stay_apart() -> None:
    with pytest.raises(RetuneError, match="2 pieces"):
        read_notation(several("N:||cdef|]", "N:||cdfe|]"), "abc")


# --- limits -----------------------------------------------------------------------------------


@pytest.mark.parametrize("music", ["A99999 " * 300, "Z99999 " * 300])
def test_endless_notes_and_rests_are_refused(music: str) -> None:
    with pytest.raises(LimitError):
        tune(music, "M:1/4", "L:9999/1")


@given(st.text(alphabet="ABCabcz[]|:123/'(),>-!{}HKM\n\"&%^_=.~w ", max_size=120))
def test_any_music_reads_or_is_refused(music: str) -> None:
    with suppress(RetuneError):
        for bar in bars(music):
            assert bar.length >= 0
            assert all(note.onset + note.duration <= bar.length for note in bar.notes)


def test_limits_reach_the_reader() -> None:
    with pytest.raises(LimitError):
        read_notation(b"X:1\nK:C\nCDEF|\n", "abc", limits=Limits(max_notes=2))
