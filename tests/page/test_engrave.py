"""Engraved scores: what is drawn, what is written at the notes and under them, and how safely."""

from __future__ import annotations

import dataclasses
import re
from functools import cache
from itertools import pairwise

import pytest
from lxml import etree

from retune.harmony import analyse
from retune.page.engrave import (
    Engraved,
    EngravingError,
    Wish,
    engraved,
    engravings,
    glyph_sheet,
    interval_name,
    notehead_ids,
)
from retune.page.engrave_chords import appearances, estimated_width
from retune.score.model import Transposition
from retune.score.options import ReadOptions
from retune.score.read import read_bytes
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.score.musicxml_text import note, part_text, score_text
from tests.tracks.pieces import FIXTURES, NAMES, tuned

S = "{http://www.w3.org/2000/svg}"


def source(name: str) -> bytes:
    return (FIXTURES / f"{name}.musicxml").read_bytes()


@cache
def picture(name: str, width: int = 1000, part: int | None = None) -> Engraved:
    return engraved(tuned(name), source(name), width, part)


def trees(shown: Engraved) -> list[etree._Element]:
    return [etree.fromstring(system) for system in shown.systems]


def drawn_notes(shown: Engraved) -> list[str]:
    return [n.get("data-note") for t in trees(shown) for n in t.iter(f"{S}g") if n.get("data-note")]


def labels(shown: Engraved) -> list[str]:
    return [t.text for tree in trees(shown) for t in tree.iter(f"{S}text") if is_label(t)]


def is_label(text: etree._Element) -> bool:
    return "cents" in text.get("class", "").split()


def own_score(document: bytes) -> TunedScore:
    score = read_bytes(document, "own.musicxml", ReadOptions())
    return tune(score, analyse(score), Policy())


def chorus(*voices: list[str], length: int = 16, tempo: int = 60) -> bytes:
    """Parts that sing whole notes (or other lengths in sixteenths), one bar each."""
    beat = f'<sound tempo="{tempo}"/>'
    metre = "<attributes><time><beats>4</beats><beat-type>4</beat-type></time></attributes>"
    parts, names = [], []
    for number, voice in enumerate(voices, 1):
        bars = ["".join(n if n.startswith("<") else note(n, length) for n in voice)]
        bars[0] = (beat if number == 1 else "") + metre + bars[0]
        parts.append(part_text(*bars, id=f"P{number}"))
        names.append(
            f'<score-part id="P{number}"><part-name>Voice {number}</part-name></score-part>'
        )
    return score_text(*parts, part_list="".join(names))


# --- what is drawn ---------------------------------------------------------------------------


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("width", [360, 1000])
def test_every_sounding_notehead_is_drawn_once(name: str, width: int) -> None:
    ids = notehead_ids(source(name))
    assert len(set(ids.values())) == len(ids)
    sounding = {ids[s] for n in tuned(name).notes for s in n.note.sources}
    shown = drawn_notes(picture(name, width))
    assert len(shown) == len(set(shown))
    assert sounding <= set(shown)


@pytest.mark.parametrize("name", NAMES)
def test_every_written_bar_is_drawn_once(name: str) -> None:
    bars = [
        int(bar.get("data-bar"))
        for tree in trees(picture(name))
        for bar in tree.iter(f"{S}g")
        if bar.get("data-bar")
    ]
    written = len(etree.fromstring(source(name)).find("part").findall("measure"))
    assert bars == list(range(written))


def test_parts_that_do_not_sound_are_not_drawn() -> None:
    left_out = [name for name in NAMES if tuned(name).score.left_out]
    assert left_out, "a bundled score has a reduction"
    for name in left_out:
        texts = {t.text for tree in trees(picture(name)) for t in tree.iter(f"{S}text")}
        assert not texts & set(tuned(name).score.left_out)


def test_a_part_by_itself_has_its_own_notes_only() -> None:
    # Two voices on each staff: the alto shares its staff with the soprano.
    piece, name = tuned("harbour-hymn"), "harbour-hymn"
    ids = notehead_ids(source(name))
    alto = next(p.index for p in piece.score.parts if p.name == "Alto")
    own = {ids[s] for n in piece.notes if n.note.part == alto for s in n.note.sources}
    assert set(drawn_notes(picture(name, 1000, alto))) == own
    words = {t.text for tree in trees(picture(name, 1000, alto)) for t in tree.iter(f"{S}text")}
    assert {"Alto", "Bless"} <= words
    assert "Soprano" not in words


def test_widths_and_parts_can_be_drawn_together() -> None:
    wishes = [Wish(360), Wish(1000), Wish(1000, 0)]
    piece = tuned("gull-song")
    together = engravings(piece, source("gull-song"), wishes)
    assert together == tuple(engraved(piece, source("gull-song"), w.width, w.part) for w in wishes)
    assert len(together[0].systems) > len(together[1].systems)


def test_a_score_ordered_by_time_is_drawn_too() -> None:
    by_part = chorus(["C4"], ["E4"])
    root = etree.fromstring(by_part)
    by_time = etree.Element("score-timewise")
    by_time.append(root.find("part-list"))
    bar = etree.SubElement(by_time, "measure", number="1")
    for part in root.findall("part"):
        moved = etree.SubElement(bar, "part", id=part.get("id"))
        moved.extend(list(part.find("measure")))
    document = etree.tostring(by_time)
    assert len(drawn_notes(engraved(own_score(document), document, 1000))) == 2


# --- cents -----------------------------------------------------------------------------------


def test_a_major_triad_bears_the_cents_of_its_pure_intervals() -> None:
    # 5/4 is 386.31 and 3/2 is 701.96 cents (Helmholtz, On the Sensations of Tone, App. XX).
    document = chorus(["G4"], ["E4"], ["C4"])
    shown = engraved(own_score(document), document, 1000)
    assert labels(shown) == ["+2", "−14", "0"]
    kinds = [t.get("class") for tree in trees(shown) for t in tree.iter(f"{S}text") if is_label(t)]
    assert kinds == ["cents small", "cents", "cents small"]


def test_a_note_held_over_two_chords_bears_both_and_a_tie_bears_them_apart() -> None:
    # E is the third of C major (-14) and the fifth of A minor (+2).
    low, middle = [note("C4", 8), note("A3", 8)], [note("G4", 8), note("A4", 8)]
    held = chorus([note("E5", 16)], middle, low)
    assert labels(engraved(own_score(held), held, 1000))[0] == "−14›+2"
    tie = '<tie type="{0}"/><notations><tied type="{0}"/></notations>'
    tied = [note("E5", 8, tie.format("start")), note("E5", 8, tie.format("stop"))]
    apart = chorus(tied, middle, low)
    assert labels(engraved(own_score(apart), apart, 1000))[:2] == ["−14", "+2"]


def test_chords_shorter_than_half_a_second_bear_no_cents() -> None:
    # At 120 a quarter note lasts half a second, at 240 a quarter of one.
    voices = [[note(n, 4) for n in line] for line in (("G4", "C5"), ("E4", "A4"), ("C4", "F4"))]
    slow, fast = chorus(*voices, tempo=120), chorus(*voices, tempo=240)
    assert len(labels(engraved(own_score(slow), slow, 1000))) == 6
    assert labels(engraved(own_score(fast), fast, 1000)) == []


def test_noteheads_of_one_stem_have_labels_under_each_other_as_they_stand() -> None:
    stack = [note("C4", 16), note("E4", 16, "", "").replace("<pitch>", "<chord/><pitch>")]
    document = chorus([note("G4", 16)], stack)
    shown = engraved(own_score(document), document, 1000)
    texts = [t for tree in trees(shown) for t in tree.iter(f"{S}text") if is_label(t)]
    by_height = sorted(texts, key=lambda t: int(t.get("y")))
    assert [t.text for t in by_height] == ["+2", "−14", "0"]
    assert len({t.get("y") for t in by_height}) == 3


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("width", [360, 1000, 1700])
def test_no_label_stands_on_another(name: str, width: int) -> None:
    for tree in trees(picture(name, width)):
        rows: dict[str, list[tuple[float, float]]] = {}
        for text in tree.iter(f"{S}text"):
            if is_label(text):
                # Digits and signs of common sans-serif fonts are .56 to .58 of an em.
                wide = 0.57 * int(text.get("font-size")) * len(text.text)
                x = float(text.get("x")) - (wide / 2 if text.get("text-anchor") else 0)
                rows.setdefault(text.get("y"), []).append((x, x + wide))
        for row in rows.values():
            for (_, right), (left, _) in pairwise(sorted(row)):
                assert right <= left + 30


# --- chords ----------------------------------------------------------------------------------


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("width", [360, 1000])
def test_each_chord_of_a_first_pass_has_its_place_and_none_is_overprinted(
    name: str, width: int
) -> None:
    shown = [one.chord for one in appearances(tuned(name))]
    found: list[int] = []
    for tree in trees(picture(name, width)):
        frame = [float(n) for n in tree.get("viewBox").split()]
        rows: dict[str, list[tuple[float, float]]] = {}
        for group in tree.iter(f"{S}g"):
            if group.get("data-chord"):
                found.append(int(group.get("data-chord")))
                assert len(group), "a chord has at least a mark"
                for text in group.iter(f"{S}text"):
                    x, size = float(text.get("x")), float(text.get("font-size"))
                    right = x + estimated_width(text.text, size)
                    rows.setdefault(text.get("y"), []).append((x, right))
                    assert right <= frame[0] + frame[2] + 1
        for row in rows.values():
            assert all(right < left for (_, right), (left, _) in pairwise(row))
    assert found == shown


def test_repeats_show_each_bar_once_and_the_second_ending_has_its_chords() -> None:
    piece = tuned("regatta-day")
    bars = [one.bar for one in appearances(piece)]
    assert bars == sorted(bars)
    sounding = {piece.score.bar_at(n.note.onset).written for n in piece.notes if not n.note.grace}
    assert sounding <= set(bars) | {b + 1 for b in bars}
    assert len({bar.written for bar in piece.score.bars}) < len(piece.score.bars)


def test_doubt_is_told_by_a_sign_and_a_line_as_well_as_by_the_class() -> None:
    piece = tuned("tide-motet")
    doubtful = {c.index for c in piece.harmony.chords if c.doubtful}
    assert doubtful
    for tree in trees(picture("tide-motet")):
        for group in tree.iter(f"{S}g"):
            symbol = group.find(f"{S}text[@class='symbol']")
            if group.get("data-chord") and symbol is not None:
                doubt = int(group.get("data-chord")) in doubtful
                assert symbol.text.endswith("?") is doubt
                assert ("doubtful" in group.get("class").split()) is doubt
                assert (group.find(f"{S}path[@class='doubt']") is not None) is doubt


# --- safety ----------------------------------------------------------------------------------

_ELEMENTS = {"svg", "g", "path", "use", "text", "tspan", "rect", "circle", "ellipse", "polyline"}


@pytest.mark.parametrize("name", NAMES)
def test_pictures_hold_shapes_and_text_alone(name: str) -> None:
    for tree in trees(picture(name)):
        for element in tree.iter():
            assert etree.QName(element).localname in _ELEMENTS
            for key in element.attrib:
                assert key not in ("style", "id", "width" if element is tree else "style")
                assert not key.startswith("on")
                assert "href" not in key or re.fullmatch("#m[0-9A-F]{4,5}", element.get(key))


@pytest.mark.parametrize("name", NAMES)
def test_every_glyph_used_is_in_the_sheet(name: str) -> None:
    shown = picture(name)
    sheet = etree.fromstring(glyph_sheet([shown, picture(name, 360)]))
    defined = [p.get("id") for p in sheet.iter(f"{S}path")]
    assert len(defined) == len(set(defined))
    assert all(p.get("d") for p in sheet.iter(f"{S}path"))
    used = {u.get("href")[1:] for tree in trees(shown) for u in tree.iter(f"{S}use")}
    assert used <= set(defined)


def test_markup_in_the_words_of_a_score_stays_text() -> None:
    evil = "&lt;script>alert(1)&lt;/script>\"'&amp;"
    lyric = f"<lyric><syllabic>single</syllabic><text>{evil}</text></lyric>"
    words = f"<direction><direction-type><words>{evil}</words></direction-type></direction>"
    bars = words + note("C4", 16, lyric)
    name = f'<score-part id="P1"><part-name>{evil}</part-name></score-part>'
    document = score_text(part_text(bars), part_list=name)
    shown = engraved(own_score(document), document, 1000)
    assert "<script" not in "".join(shown.systems)
    said = ["".join(t.itertext()) for tree in trees(shown) for t in tree.iter(f"{S}text")]
    assert sum("<script>alert(1)</script>\"'&" in text for text in said) >= 2


def test_odd_and_doubled_names_in_the_file_do_no_harm() -> None:
    twice = note("C4", 8, "", 'id="a b&quot;&lt;"') + note("D4", 8, "", 'id="a b&quot;&lt;"')
    document = score_text(part_text(twice))
    shown = engraved(own_score(document), document, 1000)
    assert drawn_notes(shown) == list(notehead_ids(document).values())


# --- what cannot be drawn --------------------------------------------------------------------


def test_other_formats_have_no_engraving() -> None:
    piece = tuned("gull-song")
    other = dataclasses.replace(piece, score=dataclasses.replace(piece.score, format="midi"))
    with pytest.raises(EngravingError, match="only MusicXML"):
        engraved(other, b"MThd", 1000)


def test_a_document_that_is_no_score_is_an_engraving_error() -> None:
    with pytest.raises(EngravingError, match="not well-formed"):
        engraved(tuned("gull-song"), b"<score-partwise>", 1000)


# --- transposition ---------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("semitones", "fifths", "name"),
    # Interval names and sizes: common practice, no source.
    [(5, -1, "+P4"), (-5, 1, "-P4"), (6, 6, "+A4"), (-1, -7, "-A1"), (-2, 10, "-d3"),
     (14, 2, "+M9"), (-10, 2, "-m7"), (12, 0, "+P8")],
)  # fmt: skip
def test_intervals_have_their_names(semitones: int, fifths: int, name: str) -> None:
    assert interval_name(Transposition(semitones, fifths)) == name


def test_a_transposed_score_is_drawn_at_its_new_pitch() -> None:
    document = chorus(["C4"])
    score = read_bytes(document, "own.musicxml", ReadOptions(transpose=-2))
    shown = engraved(tune(score, analyse(score), Policy()), document, 1000)
    plain = engraved(own_score(document), document, 1000)
    (moved,), (still,) = (_heights(one) for one in (shown, plain))
    # A whole tone down is one step: half a staff space of 180.
    assert moved - still == 90
    assert score.notes[0].pitch.name == "Bb3"
    assert score.transposition.semitones == -2


def _heights(shown: Engraved) -> list[int]:
    """Heads over the top line of their staff."""
    found = []
    for tree in trees(shown):
        for group in tree.iter(f"{S}g"):
            if group.get("data-note"):
                staff = next(s for s in group.iterancestors(f"{S}g") if s.get("class") == "staff")
                top = int(re.match(r"M-?\d+ (-?\d+)", staff.find(f"{S}path").get("d"))[1])
                # SMuFL 1.4: noteheads lie from U+E0A0.
                uses = [u for u in group.iter(f"{S}use") if u.get("href").startswith("#mE0A")]
                found += [int(u.get("y")) - top for u in uses]
    return found


def test_endings_are_drawn_with_their_numbers() -> None:
    words = "".join(picture("regatta-day").systems)
    assert re.search(r">1\.?<", words)
    assert re.search(r">2\.?<", words)


def test_a_part_by_itself_has_tempo_and_rehearsal_marks_of_the_highest_staff() -> None:
    names = [part.name for part in tuned("regatta-day").score.parts]
    for part in (names.index("Soprano 1"), names.index("Bass")):
        words = "".join(picture("regatta-day", 1000, part).systems)
        assert words.count("Bright, with a swing of the oar") == 1
        assert words.count("A little slower") == 1
        assert re.search(r">A<", words)
        assert words.count("D.S. al Fine") == 1
