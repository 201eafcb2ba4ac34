"""Notes, rests and time. Sources: MusicXML 4.0 (W3C), element references and musicxml.xsd."""

from __future__ import annotations

from fractions import Fraction

import pytest

from retune.adapters.xml import read_document
from retune.errors import LimitError, UnreadableError, Weight
from retune.limits import Limits
from retune.score.musicxml import noteheads, read_musicxml
from retune.written import WrittenBar
from tests.score.musicxml_text import (
    attributes,
    note,
    part_text,
    read,
    read_bar,
    read_part,
    rest,
    said,
    score_text,
)


def placed(bar: WrittenBar) -> list[tuple[Fraction, str, Fraction]]:
    return [(n.onset, n.pitch.name, n.duration) for n in bar.notes]


def test_notes_follow_each_other_and_chord_notes_share_an_onset() -> None:
    bar = read_bar(
        note("C4") + note("E4", 4, "").replace("<pitch>", "<chord/><pitch>") + note("G4")
    )
    assert placed(bar) == [(0, "C4", 1), (0, "E4", 1), (1, "G4", 1)]
    assert bar.length == 2


def test_backup_and_forward_place_a_second_voice() -> None:
    """MusicXML 4.0, <backup>: "general mechanism to coordinate multiple voices"."""
    bar = read_bar(
        note("C5", 8, "<voice>1</voice>")
        + "<backup><duration>8</duration></backup><forward><duration>4</duration></forward>"
        + note("A4", 2, "<voice>2</voice>")
    )
    assert placed(bar) == [(0, "C5", 2), (1, "A4", Fraction(1, 2))]
    assert [n.voice for n in bar.notes] == ["1", "2"]
    assert bar.length == 2


def test_a_forward_counts_to_the_length_of_a_bar() -> None:
    assert read_bar(note() + "<forward><duration>8</duration></forward>").length == 3


def test_tuplets_are_exact_by_their_durations() -> None:
    triplet = "<time-modification><actual-notes>3</actual-notes><normal-notes>2</normal-notes>"
    triplet += "</time-modification>"
    bar = read_bar(
        attributes("<divisions>3</divisions>")
        + note("C4", 1, f"<type>eighth</type>{triplet}") * 3
        + attributes("<divisions>1</divisions>")
        + note("D4", 1)
    )
    assert [n.onset for n in bar.notes] == [0, Fraction(1, 3), Fraction(2, 3), 1]
    assert bar.length == 2


def test_a_duration_may_be_a_decimal() -> None:
    """MusicXML 4.0, positive-divisions: xs:decimal above 0."""
    bar = read_bar(note().replace("<duration>4", "<duration>2.5") + note("D4"))
    assert bar.notes[1].onset == Fraction(5, 8)


def test_a_grace_note_takes_no_time_and_stands_before_its_note() -> None:
    grace = note("D4", None).replace("<pitch>", '<grace slash="yes"/><pitch>')
    bar = read_bar(note("C4") + grace + note("E4"))
    assert placed(bar) == [(0, "C4", 1), (1, "D4", 0), (1, "E4", 1)]
    assert [n.grace for n in bar.notes] == [False, True, False]


def test_cue_notes_are_silent_but_take_their_time() -> None:
    """MusicXML 4.0, <cue>: "the presence of a cue note... cue notes are silent"."""
    bar = read_bar(note("C4").replace("<pitch>", "<cue/><pitch>") + note("D4"))
    assert placed(bar) == [(1, "D4", 1)]


def test_unpitched_notes_are_counted_and_left_out() -> None:
    beat = "<note><unpitched/><duration>4</duration></note>"
    part = read_part(note("C4") + beat + beat)
    assert part.unpitched == 2
    assert len(part.bars[0].notes) == 1
    assert part.bars[0].length == 3


def test_a_percussion_staff_never_sounds() -> None:
    clef = attributes("<clef><sign>percussion</sign></clef>")
    score = read_musicxml(
        score_text(part_text(clef + note("E4")), part_text(note("C4"), id="P2")), Limits()
    )
    assert score.parts[0].unpitched == 1
    assert score.parts[0].bars[0].notes == ()


def test_rests_keep_their_marks_and_whether_they_are_printed() -> None:
    fermata = "<notations><fermata/></notations>"
    bar = read_bar(note() + rest(4, fermata) + rest(4, "", 'print-object="no"'))
    assert [(r.onset, r.hidden, r.marks) for r in bar.rests] == [
        (1, False, frozenset({"fermata"})),
        (2, True, frozenset()),
    ]


def test_ties_are_read_from_tie() -> None:
    bar = read_bar(note(inner='<tie type="start"/>') + note(inner='<tie type="stop"/>'))
    assert [(n.tie_start, n.tie_stop) for n in bar.notes] == [(True, False), (False, True)]


def test_tied_counts_where_there_is_no_tie_and_slurs_never_do() -> None:
    """MusicXML 4.0: <tie> is sound, <tied> is notation."""
    tied = '<notations><tied type="stop"/><tied type="start"/></notations>'
    slur = '<notations><slur type="start"/></notations>'
    rung = '<notations><tied type="let-ring"/></notations>'
    tie_wins = '<tie type="stop"/>' + tied
    bar = read_bar(note(inner=tied) + note(inner=slur) + note(inner=rung) + note(inner=tie_wins))
    assert [(n.tie_start, n.tie_stop) for n in bar.notes] == [
        (True, True),
        (False, False),
        (False, False),
        (False, True),
    ]


def test_articulations_and_breaths_become_marks() -> None:
    signs = "<articulations><strong-accent/><detached-legato/><breath-mark/></articulations>"
    bar = read_bar(note(inner=f"<notations>{signs}<fermata>square</fermata></notations>"))
    assert bar.notes[0].marks == {"marcato", "tenuto", "staccato", "breath", "fermata"}


def test_a_note_may_have_a_dynamic_of_its_own() -> None:
    """MusicXML 4.0, <note dynamics>: percent of forte, which is velocity 90."""
    bar = read_bar(
        note(attributes='dynamics="100"')
        + note(attributes='dynamics="50.5"')
        + note(attributes='dynamics="900"')
        + note()
    )
    assert [n.dynamic for n in bar.notes] == [90, 45, 127, None]


def test_staff_and_voice_of_a_chord_come_from_its_first_note() -> None:
    chord = note("E4").replace("<pitch>", "<chord/><pitch>")
    bar = read_bar(note("C4", 4, "<voice>3</voice><staff>2</staff>") + chord)
    assert [(n.staff, n.voice) for n in bar.notes] == [(2, "3"), (2, "3")]
    assert read_part(note("C4", 4, "<staff>2</staff>")).staves == 2


# --- durations that are missing or do not fit ---------------------------------------------


def test_a_missing_duration_is_taken_from_the_printed_value() -> None:
    score = read(note("C4", None, "<type>half</type><dot/>") + note("D4"))
    assert score.parts[0].bars[0].notes[1].onset == 3
    assert said(score) == [
        "doubt: Alto, bar 1, beat 1: a note has no duration; its printed value is used"
    ]


def test_a_rest_of_no_length_is_nothing_and_one_without_is_a_whole_bar() -> None:
    time = attributes("<time><beats>3</beats><beat-type>4</beat-type></time>")
    nothing = read(rest(0) + note("D4"))
    assert nothing.parts[0].bars[0].rests == ()
    assert not nothing.findings
    whole = read(time + "<note><rest/></note>", note("D4"))
    assert whole.parts[0].bars[0].length == 3
    assert len(whole.findings) == 1


def test_a_duration_that_does_not_fit_its_value_is_used_and_named() -> None:
    score = read(note("C4", 4, "<type>half</type>") + note("D4", 4, "<type>quarter</type>"))
    assert score.parts[0].bars[0].notes[1].onset == 1
    assert [str(f.where) for f in score.findings] == ["Alto, bar 1, beat 1"]
    assert score.findings[0].weight is Weight.DOUBT


def test_rounding_by_less_than_a_division_is_no_misfit() -> None:
    triplet = "<type>eighth</type><time-modification><actual-notes>3</actual-notes>"
    triplet += "<normal-notes>2</normal-notes></time-modification>"
    assert not read(
        note("C4", 1, triplet) + note("D4", 1, triplet) + note("E4", 2, triplet)
    ).findings


@pytest.mark.parametrize("hostile", ["1e999999999", "1/0", "9" * 5000, "NaN", "", "-4", "0x10"])
def test_hostile_numbers_are_harmless(hostile: str) -> None:
    bar = note("C4", 4, "<type>quarter</type>").replace("<duration>4", f"<duration>{hostile}")
    score = read(bar + note("D4"))
    assert score.parts[0].bars[0].notes[1].onset == 1
    divisions = read(attributes(f"<divisions>{hostile}</divisions>") + note("D4"))
    assert divisions.parts[0].bars[0].length == 1


def test_endlessly_fine_durations_are_rounded() -> None:
    primes = (9_999_991, 9_999_973, 9_999_971, 9_999_943, 9_999_937, 9_999_931, 9_999_929)
    bars = "".join(attributes(f"<divisions>{p}</divisions>") + note("C4", 3) for p in primes)
    score = read(bars)
    assert score.parts[0].bars[0].length.denominator < 10**40
    assert any("too fine" in finding.what for finding in score.findings)


def test_no_divisions_means_quarter_notes_and_is_named_once() -> None:
    text = score_text(f'<part id="P1"><measure number="1">{note() * 2}</measure></part>')
    score = read_musicxml(text, Limits())
    assert score.parts[0].bars[0].length == 8
    assert [f.what for f in score.findings] == [
        "no divisions are given; durations are read as quarter notes"
    ]


def test_a_step_back_stops_at_the_start_of_the_bar() -> None:
    score = read(note("C4") + "<backup><duration>384</duration></backup>" + note("E4"))
    assert [n.onset for n in score.parts[0].bars[0].notes] == [0, 0]
    assert len(score.findings) == 1


def test_a_chord_note_with_nothing_before_it_stands_alone() -> None:
    score = read(note("C4").replace("<pitch>", "<chord/><pitch>") + note("D4"))
    assert [n.onset for n in score.parts[0].bars[0].notes] == [0, 1]
    assert len(score.findings) == 1


# --- notes that are not printed -----------------------------------------------------------


def test_a_hidden_twin_of_a_printed_note_is_left_out() -> None:
    hidden = note("C4", 2, "<voice>2</voice>", 'print-object="no"')
    bar = read_bar(note("C4", 4) + "<backup><duration>4</duration></backup>" + hidden)
    assert [n.source for n in bar.notes] == ["P1/0/0"]


def test_an_ornament_played_out_in_hidden_notes_is_left_out() -> None:
    trill = "".join(
        note(name, 2, "<voice>2</voice>", 'print-object="no"') for name in ("C4", "D4", "C4", "D4")
    )
    score = read(note("C4", 8) + "<backup><duration>8</duration></backup>" + trill)
    assert placed(score.parts[0].bars[0]) == [(0, "C4", 2)]
    assert score.findings[0].weight is Weight.NOTE


def test_hidden_notes_by_the_thousand_are_left_out() -> None:
    hidden = note("C4", 1, "<voice>2</voice>", 'print-object="no"') * 8000
    bar = read_bar(note("C4", 1) * 8000 + "<backup><duration>8000</duration></backup>" + hidden)
    assert len(bar.notes) == 8000


def test_other_hidden_notes_sound_and_are_named() -> None:
    score = read(note("C4", 4) + note("D4", 4, "", 'print-object="no"'))
    assert placed(score.parts[0].bars[0]) == [(0, "C4", 1), (1, "D4", 1)]
    assert said(score) == ["doubt: Alto, bar 1, beat 2: a note that is not printed sounds"]


# --- identities ---------------------------------------------------------------------------


def test_noteheads_have_steady_and_unique_identities() -> None:
    text = score_text(
        part_text(
            note("C4", attributes='id="n1"') + rest() + note("D4"),
            note("E4", attributes='id="n1"'),
        )
    )
    score = read_musicxml(text, Limits())
    sources = [n.source for bar in score.parts[0].bars for n in bar.notes]
    assert sources == ["n1", "P1/0/2", "P1/1/0"]


def test_noteheads_finds_the_elements_again() -> None:
    text = score_text(
        part_text(note("C4") + rest(), id="P2"),
        part_text(note("D4"), id="P1"),
        part_list='<score-part id="P1"/><score-part id="P2"/>',
    )
    written = read_musicxml(text, Limits())
    elements = dict(noteheads(read_document(text, Limits()).root))
    for part in written.parts:
        for n in part.bars[0].notes:
            assert elements[n.source].findtext("pitch/step") == n.pitch.step


# --- the whole document -------------------------------------------------------------------


def test_a_score_ordered_by_time_reads_the_same() -> None:
    lines = [["C4", "D4", "E4"], ["A3", "B3", "G3"]]
    heads = '<score-part id="P1"/><score-part id="P2"/>'
    by_part = score_text(
        *(part_text(*(note(n) for n in line), id=f"P{i}") for i, line in enumerate(lines, 1)),
        part_list=heads,
    )
    by_time = f"<score-timewise><part-list>{heads}</part-list>" + "".join(
        f'<measure number="{k + 1}">'
        + "".join(
            f'<part id="P{i}">'
            + (attributes("<divisions>4</divisions>") if k == 0 else "")
            + note(line[k])
            + "</part>"
            for i, line in enumerate(lines, 1)
        )
        + "</measure>"
        for k in range(3)
    )
    read_by_time = read_musicxml(f"{by_time}</score-timewise>".encode(), Limits())
    assert read_by_time == read_musicxml(by_part, Limits())


def test_a_part_missing_from_a_bar_ordered_by_time_has_an_empty_bar_there() -> None:
    text = (
        "<score-timewise><part-list/>"
        f'<measure><part id="A">{note()}</part></measure>'
        f'<measure><part id="A">{note()}</part><part id="B">{note("E4")}</part></measure>'
        "</score-timewise>"
    )
    second = read_musicxml(text.encode(), Limits()).parts[1]
    assert [len(bar.notes) for bar in second.bars] == [0, 1]


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (b"", "empty"),
        (b"  \n", "empty"),
        (b"Hello", "not well-formed"),
        (b"<html><body/></html>", "starts with <html>"),
        (b"<opus/>", "collection of scores"),
        (b"<score-partwise/>", "no parts"),
        (b"<score-partwise><part-list/><part/></score-partwise>", "no bars"),
        (score_text(part_text(rest())), "no notes that sound"),
        (score_text(part_text(note()))[:-40], "not well-formed"),
        (b"MThd\0\0\0\6", "MIDI file"),
    ],
)
def test_what_is_no_score_is_refused_with_a_hint(data: bytes, words: str) -> None:
    with pytest.raises(UnreadableError, match=words) as caught:
        read_musicxml(data, Limits())
    assert caught.value.hint


def test_limits_hold() -> None:
    text = score_text(part_text(note() * 11))
    with pytest.raises(LimitError, match="more than 10 notes"):
        read_musicxml(text, Limits(max_notes=10))
    with pytest.raises(LimitError, match="more than 100 bytes"):
        read_musicxml(text, Limits(max_bytes=100))
    assert read_musicxml(text, Limits(max_notes=11))


def test_bars_are_limited_even_where_they_are_empty() -> None:
    text = score_text(part_text(note()).replace("</part>", "<measure/>" * 500_000 + "</part>"))
    with pytest.raises(LimitError, match="500000 bars"):
        read_musicxml(text, Limits())
    parts = "".join(f'<measure><part id="P{n}"/></measure>' for n in range(800))
    with pytest.raises(LimitError, match="500000 bars"):
        read_musicxml(f"<score-timewise>{parts}</score-timewise>".encode(), Limits())


def test_findings_met_too_often_are_counted() -> None:
    score = read(note("C4", 4, "<type>half</type>") * 30)
    assert len(score.findings) == 9
    assert score.findings[-1].what.startswith("22 more in this part: ")


def test_the_beat_of_a_finding_in_a_pick_up_counts_from_the_full_bar() -> None:
    time = attributes("<time><beats>4</beats><beat-type>4</beat-type></time>")
    score = read(time + note("C4", 4, "<type>half</type>"), note("D4", 16))
    assert str(score.findings[0].where) == "Alto, bar 1, beat 4"
