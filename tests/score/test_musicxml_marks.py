"""Directions, tempo, dynamics, jumps, bar lines and chord symbols.

Sources: MusicXML 4.0 (W3C), elements direction, sound, metronome, barline, ending, repeat,
harmony. What words such as D.C. al Fine mean is common practice, no source.
"""

from __future__ import annotations

from fractions import Fraction

import pytest

from retune.errors import Weight
from retune.pitch import PitchClass
from retune.score.musicxml.tempo import per_minute
from retune.written import MarkKind, WrittenChordSymbol
from tests.score.musicxml_text import (
    attributes,
    direction,
    marks,
    note,
    read,
    read_bar,
    read_part,
    rest,
    values,
)

# --- tempo --------------------------------------------------------------------------------


def metronome(inner: str) -> str:
    return direction(f"<metronome>{inner}</metronome>")


def beat(unit: str, per: str = "", dots: int = 0) -> str:
    number = f"<per-minute>{per}</per-minute>" if per else ""
    return f"<beat-unit>{unit}</beat-unit>{'<beat-unit-dot/>' * dots}{number}"


@pytest.mark.parametrize(
    ("mark", "quarters"),
    [
        (beat("quarter", "72"), 72),
        (beat("half", "60"), 120),
        (beat("quarter", "60", dots=1), 90),
        (beat("eighth", "120", dots=1), 90),
        (beat("quarter", "c. 72"), 72),
        (beat("quarter", "ca.72"), 72),
        (beat("quarter", "60-66"), 63),
        (beat("quarter", "60 – 66"), 63),
        (beat("quarter", "92.5"), Fraction(185, 2)),
    ],
)
def test_metronome_marks_in_quarter_notes_a_minute(mark: str, quarters: int | Fraction) -> None:
    assert values(read_bar(metronome(mark) + note()), MarkKind.TEMPO) == [quarters]


def test_a_metric_modulation_counts_from_the_tempo_before() -> None:
    """MusicXML 4.0, <metronome>: two beat units mean that the second equals the first."""
    bar = read_bar(
        metronome(beat("quarter", "60"))
        + note()
        + metronome(beat("quarter") + beat("half"))
        + note()
        + metronome(beat("half") + beat("quarter", dots=1))
        + note()
    )
    assert values(bar, MarkKind.TEMPO) == [60, 120, 90]


def test_a_modulation_may_be_written_with_notes() -> None:
    def one(kind: str, dots: str = "") -> str:
        return f"<metronome-note><metronome-type>{kind}</metronome-type>{dots}</metronome-note>"

    relation = "<metronome-relation>equals</metronome-relation>"
    modulation = one("quarter", "<metronome-dot/>") + relation + one("half")
    bar = read_bar(metronome(beat("quarter", "90")) + note() + metronome(modulation) + note())
    assert values(bar, MarkKind.TEMPO) == [90, 120]


@pytest.mark.parametrize(
    "broken", [beat("quarter", "fast"), beat("crotchet", "60"), "", beat("long")]
)
def test_marks_that_give_no_tempo_are_named(broken: str) -> None:
    score = read(metronome(broken) + note())
    assert not marks(score.parts[0].bars[0], MarkKind.TEMPO)
    assert score.findings[0].weight is Weight.LOSS


def test_played_and_printed_tempo_of_one_place_count_once() -> None:
    printed = f"<metronome>{beat('quarter', '72')}</metronome>"
    assert values(
        read_bar(direction(printed, '<sound tempo="72.5"/>') + note()), MarkKind.TEMPO
    ) == [Fraction(145, 2)]
    score = read(direction(printed) + '<sound tempo="120"/>' + note())
    assert values(score.parts[0].bars[0], MarkKind.TEMPO) == [120]
    assert "printed and played tempo differ" in score.findings[0].what
    corrected = read('<sound tempo="120"/>' + direction(printed, '<sound tempo="72"/>') + note())
    assert values(corrected.parts[0].bars[0], MarkKind.TEMPO) == [72]
    assert not corrected.findings


def test_a_tempo_of_nothing_is_no_tempo() -> None:
    """MusicXML 4.0, <sound tempo>: 0 means that the program should ask."""
    assert not read('<sound tempo="0"/>' + note()).findings
    assert read('<sound tempo="1e9"/>' + note()).findings
    assert not read_bar('<sound tempo="99999999"/>' + note()).marks


def test_per_minute_needs_a_number() -> None:
    assert per_minute("") is None
    assert per_minute("12345") is None


# --- words, dynamics, hairpins, rehearsal marks --------------------------------------------


def test_words_stand_where_they_stand() -> None:
    text = direction(
        "<words>Poco</words><words> adagio\n</words>", "<voice>2</voice><staff>1</staff>"
    )
    mark = marks(read_bar(note() + text + note()), MarkKind.WORDS)[0]
    assert (mark.value, mark.onset, mark.staff, mark.voice) == ("Poco adagio", 1, 1, "2")


def test_offsets_move_a_direction() -> None:
    bar = read_bar(note() + direction("<words>dolce</words>", "<offset>-2</offset>") + note())
    assert marks(bar, MarkKind.WORDS)[0].onset == Fraction(1, 2)
    early = read_bar(direction("<words>dolce</words>", "<offset>-99</offset>") + note())
    assert marks(early, MarkKind.WORDS)[0].onset == 0


def test_dynamics_are_signs_or_the_velocity_the_file_gives_them() -> None:
    def sign(name: str, inner: str = "") -> str:
        return direction(f"<dynamics>{name}</dynamics>", inner)

    played = '<sound dynamics="100"/>'
    bar = read_bar(
        sign("<mf/>")
        + sign("<f/>", played)
        + sign("<sfz/>", played)
        + sign("<other-dynamics>sotto voce</other-dynamics>")
        + played
        + note(inner="<notations><dynamics><pp/></dynamics></notations>")
    )
    assert values(bar, MarkKind.DYNAMIC) == ["mf", 90, "sfz", "sotto voce", 90, "pp"]


def test_hairpins() -> None:
    kinds = ("crescendo", "continue", "stop", "diminuendo", "stop")
    bar = read_bar("".join(direction(f'<wedge type="{k}"/>') for k in kinds) + note())
    assert values(bar, MarkKind.HAIRPIN) == ["crescendo", "stop", "diminuendo", "stop"]


def test_rehearsal_marks() -> None:
    assert values(
        read_bar(direction("<rehearsal> A </rehearsal>") + note()), MarkKind.REHEARSAL
    ) == ["A"]


# --- jumps --------------------------------------------------------------------------------

JUMPS = (
    MarkKind.SEGNO,
    MarkKind.CODA,
    MarkKind.FINE,
    MarkKind.DA_CAPO,
    MarkKind.DAL_SEGNO,
    MarkKind.TO_CODA,
)


SPLIT_DAL_SEGNO = (
    "<direction><direction-type><words>D.S.</words></direction-type>"
    "<direction-type><segno/></direction-type>"
    "<direction-type><words>al Coda</words></direction-type>"
    '<sound dalsegno="s"/></direction>'
)


def jumps(bar: str) -> list[tuple[str, object]]:
    return [(m.kind.value, m.value) for m in read_bar(note() + bar).marks if m.kind in JUMPS]


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (direction("<words>D.C. al Fine</words>"), [("da capo", "fine")]),
        (direction("<words>D.C.</words><words> al Coda</words>"), [("da capo", "coda")]),
        (direction("<words>Da Capo</words>"), [("da capo", "")]),
        (direction("<words>D. S. al Coda</words>"), [("dal segno", "coda")]),
        (direction("<words>Dal Segno al Fine</words>"), [("dal segno", "fine")]),
        (direction("<words>To Coda</words>"), [("to coda", None)]),
        (direction("<words>(Fine)</words>"), [("fine", None)]),
        (direction("<words>fine tone</words>"), []),
        (direction("<words>D.C. Hall, organ</words>"), []),
        (direction("<segno/>"), [("segno", None)]),
        (direction("<coda/>"), [("coda", None)]),
        ('<sound dacapo="yes"/>', [("da capo", "")]),
        ('<sound dalsegno="s1"/>', [("dal segno", "")]),
        ('<sound fine="yes"/>', [("fine", None)]),
        ('<sound dacapo="no"/>', []),
        # Said twice or three times, counted once.
        (direction("<words>D.C. al Fine</words>", '<sound dacapo="yes"/>'), [("da capo", "fine")]),
        (direction("<words>D.C. al Fine</words>") + '<sound dacapo="yes"/>', [("da capo", "fine")]),
        (direction("<segno/>", '<sound segno="s"/>'), [("segno", None)]),
        (direction("<coda/>", '<sound tocoda="c"/>'), [("to coda", None)]),
        (direction("<words>To Coda</words>") + direction("<coda/>"), [("to coda", None)]),
        (SPLIT_DAL_SEGNO, [("dal segno", "coda")]),
        ("<barline><segno/></barline>", [("segno", None)]),
    ],
)
def test_jumps_are_read_from_signs_words_and_playback_data(
    text: str, expected: list[tuple[str, object]]
) -> None:
    assert jumps(text) == expected


def test_words_of_a_jump_stay_words_as_well() -> None:
    bar = read_bar(note() + direction("<words>D.C. al Fine</words>"))
    assert values(bar, MarkKind.WORDS) == ["D.C. al Fine"]


def test_of_bare_coda_signs_only_the_last_is_the_coda() -> None:
    score = read(note() + direction("<coda/>"), note(), direction("<coda/>") + note())
    kinds = [[m.kind for m in bar.marks] for bar in score.parts[0].bars]
    assert kinds == [[MarkKind.TO_CODA], [], [MarkKind.CODA]]
    assert len(score.findings) == 1


def test_a_segno_at_the_end_of_a_bar_means_the_next_bar() -> None:
    part = read_part(note() + direction("<segno/>"), note())
    assert [[(m.kind, m.onset) for m in bar.marks] for bar in part.bars] == [
        [],
        [(MarkKind.SEGNO, 0)],
    ]


# --- bar lines ----------------------------------------------------------------------------


def barline(inner: str, location: str = "right") -> str:
    return f'<barline location="{location}">{inner}</barline>'


def test_repeats() -> None:
    part = read_part(
        barline('<repeat direction="forward"/>', "left") + note(),
        note() + barline('<repeat direction="backward"/>'),
        note() + barline('<repeat direction="backward" times="4"/>'),
    )
    assert [(b.repeat_start, b.repeat_end) for b in part.bars] == [
        (True, 0),
        (False, 2),
        (False, 4),
    ]


def test_repeats_on_the_wrong_side_belong_to_the_neighbour() -> None:
    part = read_part(
        note() + barline('<repeat direction="forward"/>'),
        note(),
        barline('<repeat direction="backward"/>', "left") + note(),
    )
    assert [(b.repeat_start, b.repeat_end) for b in part.bars] == [
        (False, 0),
        (True, 2),
        (False, 0),
    ]


@pytest.mark.parametrize("times", ["0", "-1", "1000000000000", "often", ""])
def test_a_senseless_number_of_times_is_two(times: str) -> None:
    score = read(note() + barline(f'<repeat direction="backward" times="{times}"/>'))
    assert score.parts[0].bars[0].repeat_end == 2


def test_a_repeat_inside_a_bar_is_named() -> None:
    score = read(note() + barline('<repeat direction="backward"/>', "middle") + note())
    assert score.parts[0].bars[0].repeat_end == 2
    assert score.findings[0].weight is Weight.DOUBT


@pytest.mark.parametrize(
    ("number", "passes"),
    [
        ("1", (1,)),
        ("1,2", (1, 2)),
        ("1, 2", (1, 2)),
        ("1.2.", (1, 2)),
        ("1-3", (1, 2, 3)),
        ("3", (3,)),
    ],
)
def test_endings_hold_their_passes(number: str, passes: tuple[int, ...]) -> None:
    part = read_part(
        barline(f'<ending number="{number}" type="start"/>', "left") + note(),
        note() + barline(f'<ending number="{number}" type="stop"/>'),
        note() + barline(f'<ending number="{number}" type="discontinue"/>'),
    )
    assert [bar.ending for bar in part.bars] == [passes, (), ()]
    assert [bar.ending_stop for bar in part.bars] == [False, True, True]


def test_an_ending_without_a_number_is_the_next() -> None:
    def ending(number: str, text: str = "") -> str:
        start = f'<ending number="{number}" type="start">{text}</ending>'
        return barline(start, "left") + note() + barline(f'<ending number="{number}" type="stop"/>')

    score = read(ending("1"), ending(" "), ending("", "3."))
    assert [bar.ending for bar in score.parts[0].bars] == [(1,), (2,), (3,)]
    assert len(score.findings) == 1


def test_fermatas_on_bar_lines() -> None:
    bar = read_bar(note() + barline("<fermata/>"))
    assert [(m.kind, m.onset) for m in bar.marks] == [(MarkKind.FERMATA, 1)]


def test_bars_keep_their_printed_numbers() -> None:
    text = note()
    part = read_part(text, text)
    assert [bar.number for bar in part.bars] == ["1", "2"]


# --- chord symbols ------------------------------------------------------------------------


def test_chord_symbols_are_marks_and_never_notes() -> None:
    """MusicXML 4.0, <harmony> with <offset>; <kind> values."""
    harmony = (
        "<harmony><root><root-step>F</root-step><root-alter>1</root-alter></root>"
        "<kind>half-diminished</kind><bass><bass-step>A</bass-step></bass>"
        "<offset>2</offset></harmony>"
    )
    bar = read_bar(harmony + note())
    symbol = WrittenChordSymbol(PitchClass("F", 1), "half-diminished", PitchClass("A"))
    assert [(m.onset, m.value) for m in marks(bar, MarkKind.CHORD_SYMBOL)] == [
        (Fraction(1, 2), symbol)
    ]
    assert len(bar.notes) == 1


def test_no_chord_is_no_chord_symbol_and_a_rootless_one_is_named() -> None:
    none = "<harmony><root><root-step>C</root-step></root><kind>none</kind></harmony>"
    assert not read_bar(none + note()).marks
    numeral = "<harmony><function>IV</function><kind>major</kind></harmony>"
    assert read(numeral + note()).findings[0].weight is Weight.LOSS


# --- what is passed over -------------------------------------------------------------------


def test_senza_misura_and_bar_repeats_are_named() -> None:
    score = read(attributes("<time><senza-misura/></time>") + note())
    assert score.findings[0].weight is Weight.NOTE
    style = '<measure-style><measure-repeat type="start">1</measure-repeat></measure-style>'
    score = read(note(), attributes(style) + rest(16), note())
    assert [str(f.where) for f in score.findings] == ["Alto, bar 2, beat 1"]
