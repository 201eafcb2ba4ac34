"""The exporter `notation` against the schema, the user's own file and the note list."""

from __future__ import annotations

import json
import re
import zipfile
from collections import Counter
from dataclasses import replace
from fractions import Fraction
from functools import cache
from io import BytesIO
from pathlib import Path

import music21
import pytest
from lxml import etree

from retune.adapters.engraving import Sheet, drawn
from retune.errors import OutputError
from retune.export.notation import (
    Cents,
    Container,
    NotationExporter,
    NotationOptions,
    Parts,
)
from retune.export.notation_marks import without_additions
from retune.export.notes import NotesExporter, NotesOptions
from retune.harmony import analyse
from retune.limits import Limits
from retune.score.options import ReadOptions
from retune.score.read import read, read_bytes
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.export.musicxml_checks import (
    added,
    contents,
    events_of,
    fault_of,
    lost,
    tree_of,
)
from tests.score.musicxml_text import attributes, note, part_text, score_text
from tests.tracks.pieces import FIXTURES, NAMES

CORPUS = Path(music21.__file__).parent / "corpus"
ALL = NotationOptions(chords=True, accidentals=True, parts=Parts.YES)

# A chorale, Monteverdi, Trecento and a song in every run; more in the slow one.
FEW = (
    "bach/bwv66.6.mxl",
    "monteverdi/madrigal.3.8.mxl",
    "trecento/PMFC_12_22-Benedicamus PMFC12.22.xml",
    "liliuokalani/aloha_oe.mxl",
)


def of_file(path: Path, options: ReadOptions | None = None) -> TunedScore:
    score = read(path, options)
    return tune(score, analyse(score), Policy())


def of_bytes(data: bytes, name: str = "own.musicxml", **policy: object) -> TunedScore:
    score = read_bytes(data, name)
    return tune(score, analyse(score), Policy(**policy))  # type: ignore[arg-type]


@cache
def fixture(name: str) -> TunedScore:
    return of_file(FIXTURES / name)


def written(tuned: TunedScore, options: NotationOptions | None = None) -> dict[str, bytes]:
    takes = (Take(tuned),)
    return {f.name: f.data for f in NotationExporter().export(takes, options or NotationOptions())}


def full(tuned: TunedScore, options: NotationOptions | None = None) -> bytes:
    return next(iter(written(tuned, options).values()))


def told(tuned: TunedScore, options: NotationOptions | None = None) -> str:
    return next(NotationExporter().export((Take(tuned),), options or NotationOptions())).note


def labels(data: bytes) -> list[str]:
    return [w.text or "" for w in tree_of(contents(data)).iterfind(".//words[@font-size='7']")]


def in_full(tuned: TunedScore) -> None:
    """What must hold of every score, whole and part by part."""
    source = contents(tuned.score.source)
    files = {name: contents(data) for name, data in written(tuned, ALL).items()}
    data = next(iter(files.values()))
    assert lost(tree_of(source), tree_of(data)) == ""
    if not fault_of(source):
        assert {name: fault_of(each) for name, each in files.items() if fault_of(each)} == {}
    # Run once more over what it wrote, it gives the same bytes; nothing is doubled.
    once_more = replace(ALL, parts=Parts.NO)
    assert contents(full(replace_source(tuned, data), once_more)) == data


def replace_source(tuned: TunedScore, data: bytes) -> TunedScore:
    return replace(tuned, score=replace(tuned.score, source=data))


# --- the user's file stays -------------------------------------------------------------------


@pytest.mark.parametrize("name", [*(f"{name}.musicxml" for name in NAMES), "tide-motet.mxl"])
def test_a_bundled_score_keeps_all_it_has_and_is_valid(name: str) -> None:
    in_full(fixture(name))


@pytest.mark.parametrize("name", FEW)
def test_a_score_of_the_corpus_keeps_all_it_has_and_is_valid(name: str) -> None:
    in_full(of_file(CORPUS / name))


def test_only_lines_are_added_to_the_users_bytes() -> None:
    tuned = fixture("harbour-hymn.musicxml")
    before, after = tuned.score.source.split(b"\n"), iter(full(tuned).split(b"\n"))
    assert all(line in after for line in before)


def test_what_is_added_are_directions_play_and_one_field() -> None:
    tuned = fixture("lamp-night.musicxml")
    new = list(added(tree_of(tuned.score.source), tree_of(full(tuned))))
    assert {one.tag for one in new} == {"direction", "play", "miscellaneous"}
    assert all(
        (one.get("id") or "").startswith("retune-") for one in new if one.tag != "miscellaneous"
    )


ODD = score_text(
    part_text(
        attributes("<key><fifths>0</fifths></key>")
        + note("C4", 16, "<voice>1</voice>")
        + "<backup><duration>16</duration></backup>"
        + note("E4", 16, "<voice>2</voice>")
        + "<backup><duration>16</duration></backup>"
        + note("G4", 16, "<voice>3</voice><lyric><text>&#233;t&#233;</text></lyric>")
    ),
    head="<!-- ours & theirs --><?seq keep this?><work><work-title>Œuvre</work-title></work>",
)
HEADS = {
    "plain": "",
    "doctype": '<!DOCTYPE score-partwise PUBLIC "-//Recordare//DTD MusicXML 2.0 Partwise//EN"'
    ' "http://www.musicxml.org/dtds/partwise.dtd">',
}


@pytest.mark.parametrize("head", HEADS)
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "iso-8859-15", "shift_jis"])
@pytest.mark.parametrize("newline", ["\n", "\r\n"])
def test_encodings_line_ends_and_odd_markup_stay(head: str, encoding: str, newline: str) -> None:
    name = "utf-8" if encoding == "utf-8-sig" else encoding
    text = ODD.decode()
    if encoding == "shift_jis":
        text = text.replace("Œuvre", "歌")
    lines = [f'<?xml version="1.0" encoding="{name}" standalone="no"?>', HEADS[head]]
    lines += re.sub("(<(?:measure|note|part|work|duration)\\b)", "\n  \\1", text).split("\n")
    source = newline.join(lines).encode(encoding)
    made = full(of_bytes(source))
    assert source.decode(encoding).split(newline)[0] in made.decode(encoding)
    assert without_additions(made, Limits()) == (source, False)
    assert labels(made) == ["0", "−14", "+2"]
    assert lost(tree_of(source), tree_of(made)) == ""


def test_a_document_in_a_namespace_of_its_own_is_edited_in_it() -> None:
    text = ODD.decode()
    spaced = re.sub(r"<(/?)([a-z])", r"<\1m:\2", text.replace("<!--", "<!- -").replace("<?", "< ?"))
    spaced = spaced.replace("<!- -", "<!--").replace("< ?", "<?")
    source = spaced.replace("<m:score-partwise", '<m:score-partwise xmlns:m="urn:x"', 1)
    made = full(of_bytes(source.encode()))
    tree = etree.fromstring(made)
    assert [w.text for w in tree.iter("{urn:x}words")] == ["0", "−14", "+2"]
    files = written(of_bytes(source.encode()), NotationOptions(parts=Parts.YES))
    assert all(etree.fromstring(data) is not None for data in files.values())


def test_a_score_ordered_by_time_is_edited_as_it_is() -> None:
    bar = "<measure number='1'>{}</measure>"
    parts = [
        f"<part id='P{n}'>{attributes('<divisions>4</divisions>')}{note(pitch, 16)}</part>"
        for n, pitch in enumerate(("G4", "E4", "C4"), 1)
    ]
    listed = "".join(
        f"<score-part id='P{n}'><part-name>{name}</part-name></score-part>"
        for n, name in enumerate(("Soprano", "Alto", "Bass"), 1)
    )
    source = (
        f"<score-timewise><part-list>{listed}</part-list>"
        f"{bar.format(''.join(parts))}</score-timewise>"
    ).encode()
    files = written(of_bytes(source), ALL)
    whole, _, alto, _ = (tree_of(data) for data in files.values())
    assert lost(tree_of(source), whole) == ""
    assert [w.text for w in whole.iterfind(".//words[@font-size='7']")] == ["+2", "−14", "0"]
    assert [p.get("id") for p in alto.iter("part")] == ["P2"]
    assert [w.text for w in alto.iterfind(".//words[@font-size='7']")] == ["−14"]
    assert all(fault_of(data) == "" for data in files.values())


# --- containers ------------------------------------------------------------------------------


def test_a_compressed_score_keeps_what_else_is_in_its_archive() -> None:
    archive = BytesIO()
    with zipfile.ZipFile(archive, "w", zipfile.ZIP_DEFLATED) as made:
        container = (
            '<container><rootfiles><rootfile full-path="music/a.xml"/>'
            '<rootfile full-path="a.pdf" media-type="application/pdf"/></rootfiles></container>'
        )
        made.writestr("META-INF/container.xml", container)
        made.writestr("a.pdf", b"%PDF-1.7 not really")
        made.writestr("music/a.xml", ODD)
    result = full(of_bytes(archive.getvalue(), "a.mxl"))
    assert full(of_bytes(archive.getvalue(), "a.mxl")) == result
    # MusicXML 4.0, "Compressed .mxl files": the media type first, stored, without extra field.
    assert result[30:38] == b"mimetype"
    assert result[38:72] == b"application/vnd.recordare.musicxml"
    with zipfile.ZipFile(BytesIO(result)) as found:
        assert found.testzip() is None
        names = ["mimetype", "META-INF/container.xml", "a.pdf", "music/a.xml"]
        assert found.namelist() == names
        assert found.read("META-INF/container.xml") == container.encode()
        assert found.read("a.pdf") == b"%PDF-1.7 not really"
    assert lost(tree_of(ODD), tree_of(contents(result))) == ""


@pytest.mark.parametrize(
    ("name", "wish", "ending"),
    [
        ("tide-motet.musicxml", Container.AUTO, ".musicxml"),
        ("tide-motet.mxl", Container.AUTO, ".mxl"),
        ("tide-motet.musicxml", Container.MXL, ".mxl"),
        ("tide-motet.mxl", Container.MUSICXML, ".musicxml"),
    ],
)
def test_the_container_is_the_scores_own_or_the_wished(
    name: str, wish: Container, ending: str
) -> None:
    files = written(fixture(name), NotationOptions(container=wish, parts=Parts.YES))
    assert {Path(each).suffix for each in files} == {ending}
    for data in files.values():
        assert data.startswith(b"PK") == (ending == ".mxl")
        assert read_bytes(data, "back").notes


# --- what the cents say ------------------------------------------------------------------------


@pytest.mark.parametrize("name", NAMES)
def test_cents_read_back_are_those_of_the_note_list(name: str) -> None:
    tuned = of_file(FIXTURES / f"{name}.musicxml", ReadOptions(repeats=False))
    events = events_of(tree_of(full(tuned)), [bar.onset for bar in tuned.score.bars])
    files = NotesExporter().export((Take(tuned),), NotesOptions())
    listed = json.loads(next(f.data for f in files if f.name.endswith(".json")))
    checked = 0
    # Where two parts sing from one notehead, it says the first one's cents.
    heads = Counter(source for each in tuned.notes for source in set(each.note.sources))
    for one, heard in zip(listed["notes"], tuned.notes, strict=True):
        if heard.note.grace:
            continue
        near = 1e-9 if all(heads[s] == 1 for s in heard.note.sources) else 0.2
        source = tuned.score.parts[one["part"]].source
        for segment in one["segments"]:
            onset = Fraction(segment["onset"])
            begun = sorted(entry for entry in events[source, one["key"]] if entry[0] <= onset)
            said = {voice: cents for _, cents, voice in begun}.values()
            assert min(abs(cents - segment["cents"]) for cents in said) <= near
            checked += 1
    assert checked >= len(listed["notes"]) - 10


def chorale(*bars: tuple[str, str, str], extra: str = "") -> bytes:
    """Three parts in whole notes, a bar each; `extra` ends the first part's last bar."""
    listed = "".join(
        f'<score-part id="P{n}"><part-name>{name}</part-name></score-part>'
        for n, name in enumerate(("Soprano", "Alto", "Bass"), 1)
    )
    parts = [
        part_text(
            *(
                note(bar[n], 16) + (extra if n == 0 and index == len(bars) - 1 else "")
                for index, bar in enumerate(bars)
            ),
            id=f"P{n + 1}",
        )
        for n in range(3)
    ]
    return score_text(*parts, part_list=listed)


def test_labels_are_whole_cents_from_the_root_or_from_equal_temperament() -> None:
    # 5/4 is 386.314 cents and 3/2 701.955 (Helmholtz); a chord of C major alone.
    tuned = of_bytes(chorale(("G4", "E4", "C3")))
    assert labels(full(tuned)) == ["+2", "−14", "0"]
    (root,) = tuned.root_cents
    assert root is not None
    shown = labels(full(tuned, NotationOptions(cents=Cents.EQUAL)))
    assert [int(each.replace("−", "-")) for each in shown] == [
        round(cents + root) for cents in (1.955, -13.686, 0)
    ]
    assert labels(full(tuned, NotationOptions(cents=Cents.NONE))) == []
    assert labels(full(tuned, NotationOptions(least=10))) == ["−14"]


def test_the_exact_pitch_can_be_left_out() -> None:
    tuned = fixture("tide-motet.musicxml")
    assert b"<other-play" in full(tuned)
    assert b"<play" not in full(tuned, NotationOptions(play=False))


def test_a_direction_stands_before_its_note_in_its_voice() -> None:
    # MusicXML 4.0, <direction>: it is associated with the note that follows, in the same voice.
    tree = tree_of(full(fixture("harbour-hymn.musicxml")))
    shown = [d for d in tree.iter("direction") if (d.get("id") or "").startswith("retune")]
    assert len(shown) > 200
    for one in shown:
        follower = one.getnext()
        while follower.tag == "direction":
            follower = follower.getnext()
        assert follower.tag == "note"
        assert one.findtext("voice") == follower.findtext("voice")
        assert follower.find("chord") is None


def test_lower_voices_of_a_staff_have_their_labels_below() -> None:
    tree = tree_of(full(fixture("harbour-hymn.musicxml")))
    sides = {
        (one.findtext("voice"), one.get("placement"))
        for one in tree.iter("direction")
        if (one.get("id") or "").startswith("retune")
    }
    assert {side for _, side in sides} == {"above", "below"}
    assert len(sides) == len({voice for voice, _ in sides})


def test_both_notes_of_a_divided_stem_are_labelled_upper_above_and_lower_below() -> None:
    bar = note("C3", 16, "<voice>1</voice>")
    stem = note("E4", 16).replace("<note >", "<note><chord/>")
    upper = note("G4", 16)
    source = score_text(
        part_text(upper + stem),
        part_text(bar, id="P2"),
        part_list='<score-part id="P1"><part-name>Soprano</part-name></score-part>'
        '<score-part id="P2"><part-name>Bass</part-name></score-part>',
    )
    tree = tree_of(full(of_bytes(source)))
    first = tree.find("part/measure")
    said = [
        (d.get("placement"), d.findtext("direction-type/words")) for d in first.findall("direction")
    ]
    assert said == [("above", "+2"), ("below", "−14")]


def test_a_held_note_says_both_pitches_and_when_it_moves() -> None:
    half = f"{note('G4', 8)}{note('A4', 8)}"
    source = score_text(
        part_text(half),
        part_text(note("E4", 16), id="P2"),
        part_text(note("C3", 8) + note("A2", 8), id="P3"),
        part_list="".join(
            f'<score-part id="P{n}"><part-name>{name}</part-name></score-part>'
            for n, name in enumerate(("Soprano", "Alto", "Bass"), 1)
        ),
    )
    tree = tree_of(full(of_bytes(source, held_shift=30.0)))
    alto = tree.findall("part")[1].find("measure")
    assert alto.findtext("direction/direction-type/words") == "−14›+2"
    kinds = [play.get("type") for play in alto.iterfind("note/play/other-play")]
    assert kinds[0] == "cents"
    assert kinds[1:] in ([], ["cents after 2"])


def test_a_later_pass_that_differs_stands_in_brackets() -> None:
    """A repeated bar, tuned higher by hand the second time."""
    repeat = '<barline location="right"><repeat direction="backward"/></barline>'
    tuned = of_bytes(chorale(("G4", "E4", "C3"), extra=repeat))
    assert len(tuned.notes) == 6
    notes = list(tuned.notes)
    for index, by in ((3, 3.0), (4, 20.0)):
        one = notes[index]
        moved = tuple(replace(s, cents=s.cents + by) for s in one.segments)
        notes[index] = replace(one, segments=moved)
    tree = tree_of(full(replace(tuned, notes=tuple(notes))))
    said = [w.text for w in tree.iter("words")]
    assert len([text for text in said if "(" in text]) == 1
    changed = [p for p in tree.iter("other-play") if p.get("type") == "cents pass 2"]
    assert len(changed) == 2


# --- more signs --------------------------------------------------------------------------------


def test_chord_names_stand_above_once_a_chord() -> None:
    tuned = of_bytes(chorale(("G4", "E4", "C3"), ("G4", "E4", "C3"), ("A4", "F4", "F3")))
    tree = tree_of(full(tuned, NotationOptions(chords=True)))
    names = [d for d in tree.iter("direction") if (d.get("id") or "").startswith("retune-chord")]
    assert [d.findtext("direction-type/words") for d in names] == ["C", "F"]
    assert {d.get("placement") for d in names} == {"above"}


def test_a_chord_that_changes_inside_a_note_is_named_by_an_offset() -> None:
    source = score_text(
        part_text(note("G4", 16)),
        part_text(note("E4", 16), id="P2"),
        part_text(note("C3", 8) + note("E3", 4) + note("C3", 4), id="P3"),
        part_text(note("C4", 8) + note("B3", 8), id="P4"),
        part_list="".join(
            f'<score-part id="P{n}"><part-name>{name}</part-name></score-part>'
            for n, name in enumerate(("Soprano", "Alto", "Bass", "Tenor"), 1)
        ),
    )
    tuned = of_bytes(source)
    tree = tree_of(full(tuned, NotationOptions(chords=True)))
    offsets = [
        float(d.findtext("offset") or 0) / 4
        for d in tree.iter("direction")
        if (d.get("id") or "").startswith("retune-chord")
    ]
    assert offsets == [float(c.onset) for c in tuned.harmony.chords][: len(offsets)]
    assert len(offsets) > 1


def test_chord_symbols_of_the_scores_own_are_left_alone() -> None:
    tuned = fixture("gull-song.musicxml")
    options = NotationOptions(chords=True)
    assert "chord symbols of its own" in told(tuned, options)
    assert b"retune-chord" not in full(tuned, options)


def glyph_names() -> frozenset[str]:
    """The names that SMuFL publishes for its tuning glyphs (metadata, glyphnames.json)."""
    import verovio

    file = Path(verovio.__file__).parent / "data" / "tuning-glyphnames.json"
    return frozenset(json.loads(file.read_text(encoding="utf-8")))


def test_comma_accidentals_have_published_names_and_the_right_arrows() -> None:
    # SMuFL 1.4, "Extended Helmholtz-Ellis accidentals": an arrow is a syntonic comma, 81/80.
    # 5/4 is a comma under four fifths, 6/5 a comma above three fourths.
    tuned = of_bytes(chorale(("G4", "E4", "C3"), ("A4", "C4", "F#3")))
    signs = tree_of(full(tuned, NotationOptions(accidentals=True))).findall(".//accidental")
    found = {(one.getparent().findtext("pitch/step"), one.get("smufl"), one.text) for one in signs}
    assert ("E", "accidentalNaturalOneArrowDown", "natural") in found
    assert ("A", "accidentalNaturalOneArrowUp", "natural") in found
    assert not [one for one in found if one[0] == "G"]
    assert {name for _, name, _ in found} <= glyph_names()


@pytest.mark.parametrize("name", ["lantern-street", "regatta-day"])
def test_all_signs_are_published_ones(name: str) -> None:
    score = read(FIXTURES / f"{name}.musicxml")
    tuned = tune(score, analyse(score), Policy(prime_limit=7))
    data = full(tuned, NotationOptions(accidentals=True))
    tree = tree_of(data)
    names = {e.get("smufl") for e in tree.iter("accidental", "accidental-mark")} - {None}
    assert names <= glyph_names()
    if name == "lantern-street":
        # 7/4 is a septimal comma, 64/63, under the seventh of the chain of fifths.
        assert "accidentalLowerOneSeptimalComma" in names
    assert fault_of(data) == ""
    assert contents(full(replace_source(tuned, data), NotationOptions())) == full(tuned)


def test_an_accidental_that_is_printed_gets_its_glyph_and_keeps_its_text() -> None:
    tuned = fixture("lamp-night.musicxml")
    before, after = tree_of(tuned.score.source), tree_of(full(tuned, ALL))
    printed = [s for s in after.iter("accidental") if s.get("cautionary") != "no"]
    assert [s.text for s in printed] == [s.text for s in before.iter("accidental")]
    assert any(s.get("smufl") for s in printed)


# --- once more ----------------------------------------------------------------------------------


@pytest.mark.parametrize("name", NAMES)
def test_a_labelled_score_is_read_as_the_same_score_and_gives_back_the_plain_one(
    name: str,
) -> None:
    tuned = fixture(f"{name}.musicxml")
    data = full(tuned, ALL)
    again = read_bytes(data, f"{name}.musicxml")
    assert replace(again, file=None) == replace(tuned.score, file=None)
    assert without_additions(data, Limits()) == (tuned.score.source, False)


def test_labels_that_lost_their_marks_are_told_of_and_stay() -> None:
    tuned = fixture("tide-motet.musicxml")
    saved = re.sub(rb' id="retune-[a-z]+-\d+"', b"", full(tuned))
    options = NotationOptions()
    assert "have lost their marks" in told(replace_source(tuned, saved), options)
    again = tree_of(full(replace_source(tuned, saved), options))
    # The exact pitch is known by the field and its type, and is not doubled.
    for one in again.iter("note"):
        kinds = [p.get("type") for p in one.iterfind("play/other-play")]
        assert len(kinds) == len(set(kinds))


# --- parts, excerpts, keys ----------------------------------------------------------------------


def test_each_singer_gets_their_own_line_with_its_words_and_marks() -> None:
    files = written(fixture("regatta-day.musicxml"), NotationOptions(parts=Parts.YES))
    assert list(files) == [
        "notation/Full score - regatta-day.musicxml",
        *(
            f"notation/{p}/{p} - regatta-day.musicxml"
            for p in ("Soprano 1", "Soprano 2", "Alto", "Tenor", "Bass")
        ),
    ]
    bass = tree_of(files["notation/Bass/Bass - regatta-day.musicxml"])
    assert [e.findtext("part-name") for e in bass.iter("score-part")] == ["Bass"]
    assert len(bass.findall("part")) == 1
    # Tempo and rehearsal letter stand at the sopranos' staff in the score.
    assert "A" in [r.text for r in bass.iter("rehearsal")]
    assert len(list(bass.iter("metronome"))) == 2
    lower = tree_of(files["notation/Soprano 2/Soprano 2 - regatta-day.musicxml"])
    assert not [n for n in lower.iter("note") if n.find("chord") is not None]


def test_a_part_sings_in_its_own_file_what_it_sings_in_the_score() -> None:
    tuned = fixture("harbour-hymn.musicxml")
    files = written(tuned, NotationOptions(parts=Parts.YES))
    for part in tuned.score.parts:
        data = files[f"notation/{part.name}/{part.name} - harbour-hymn.musicxml"]
        alone = read_bytes(data, "alone.musicxml")
        own = [n for n in tuned.score.notes if n.part == part.index]
        assert [p.name for p in alone.parts] == [part.name]
        assert [(n.onset, n.duration, n.pitch, n.lyric) for n in alone.notes] == [
            (n.onset, n.duration, n.pitch, n.lyric) for n in own
        ]


def test_parts_come_with_learning_tracks_and_not_without() -> None:
    from retune.pipeline import learning_tracks
    from retune.tracks.options import TrackOptions

    tuned = fixture("gull-song.musicxml")
    assert len(written(tuned)) == 1
    takes = learning_tracks(tuned, TrackOptions(parts=("Alto",)))
    names = [f.name for f in NotationExporter().export(takes, NotationOptions())]
    assert names[1:] == ["notation/Alto/Alto - gull-song.musicxml"]


def test_an_excerpt_is_labelled_in_its_bars_and_the_rest_stays() -> None:
    from retune.pipeline import cut

    tuned = cut(fixture("lamp-night.musicxml"), "9-10")
    tree = tree_of(full(tuned))
    bars = {
        one.getparent().get("number")
        for one in tree.iter("direction")
        if (one.get("id") or "").startswith("retune")
    }
    assert bars <= {"9", "10"}
    assert bars
    assert lost(tree_of(tuned.score.source), tree) == ""
    assert "only in the bars that are played" in told(tuned)


def test_an_excerpts_part_goes_by_its_voice_in_the_bars_around_it() -> None:
    from retune.pipeline import cut

    whole = fixture("harbour-hymn.musicxml")
    data = written(cut(whole, "9-12"), NotationOptions(parts=Parts.YES))
    alone = read_bytes(data["notation/Alto/Alto - harbour-hymn.musicxml"], "alone.musicxml")
    index = [part.name for part in whole.score.parts].index("Alto")
    assert [(n.onset, n.pitch) for n in alone.notes] == [
        (n.onset, n.pitch) for n in whole.score.notes if n.part == index
    ]


def test_a_transposed_score_stays_in_its_own_key_and_says_so() -> None:
    plain = fixture("tide-motet.musicxml")
    moved = of_file(FIXTURES / "tide-motet.musicxml", ReadOptions(transpose=2))
    options = NotationOptions(chords=True)
    assert [w.text for w in tree_of(full(moved, options)).iter("words")] == [
        w.text for w in tree_of(full(plain, options)).iter("words")
    ]
    assert "in the key it was written in" in told(moved)


# --- other readers -------------------------------------------------------------------------------


def test_music21_reads_what_was_written() -> None:
    for name in ("harbour-hymn", "lantern-street"):
        tuned = fixture(f"{name}.musicxml")
        before = music21.converter.parseData(tuned.score.source, format="musicxml")
        after = music21.converter.parseData(full(tuned, ALL), format="musicxml")

        def sounding(score: object) -> list[tuple[float, str]]:
            return [(float(n.offset), str(n.pitches)) for n in score.flatten().notes]  # type: ignore[attr-defined]

        assert sounding(before) == sounding(after)
        shown = [t.content for t in after[music21.expressions.TextExpression]]
        assert set(labels(full(tuned, ALL))) <= set(shown)


def test_the_engraver_draws_every_label() -> None:
    sheets, wanted = [], []
    for name in ("harbour-hymn", "tide-motet", "regatta-day"):
        data = full(fixture(f"{name}.musicxml"))
        root = etree.fromstring(data)
        sheets.append(Sheet(etree.tostring(root, encoding="unicode"), 4000))
        wanted.append(len(labels(data)))
    for pages, count in zip(drawn(sheets), wanted, strict=True):
        text = "".join(pages)
        assert len(re.findall(r">[+−]?\d+(?:›[+−]?\d+)*(?: \([^)]*\))?<", text)) >= count


# --- damage ---------------------------------------------------------------------------------------


def test_damaged_but_readable_scores_are_edited_all_the_same() -> None:
    odd = [
        ODD.replace(b"<part-list>", b"<part-list><!-- -->"),
        ODD.replace(b"<duration>16</duration>", b"<duration> 16 </duration><!-- x -->", 1),
        re.sub(rb"<part-list>.*</part-list>", b"", ODD),
        ODD.replace(b"</part>", b"<?x y?></part>"),
        ODD.replace(b"<duration>16<", b"<duration><!-- x -->16<"),
        ODD.replace(b'<score-part id="P1">', b"<score-part>"),
        ODD.replace(b"<voice>2</voice>", b"<voice> 2 &amp; \xc3\xa9</voice>"),
    ]
    for source in odd:
        files = written(of_bytes(source), ALL)
        for data in files.values():
            assert read_bytes(data, "back").notes
        assert lost(tree_of(source), tree_of(next(iter(files.values())))) == ""


def test_a_wrong_claim_of_encoding_does_no_harm() -> None:
    source = b'<?xml version="1.0" encoding="utf-8"?>' + ODD.decode().replace("Œ", "é").encode(
        "latin-1"
    )
    made = full(of_bytes(source))
    assert read_bytes(made, "back").title == "éuvre"


def test_an_archive_with_a_broken_file_in_it_is_an_error_that_names_it() -> None:
    archive = BytesIO()
    with zipfile.ZipFile(archive, "w", zipfile.ZIP_STORED) as made:
        made.writestr("a.musicxml", ODD)
        made.writestr("picture.png", b"0123456789")
    broken = archive.getvalue().replace(b"0123456789", b"0123456780")
    with pytest.raises(OutputError, match=r"picture\.png"):
        full(of_bytes(broken, "a.mxl"))


@pytest.mark.slow
def test_forty_scores_of_the_corpus_keep_all_they_have() -> None:
    wanted = [
        *sorted((CORPUS / "bach").glob("*.mxl"))[::28],
        *sorted((CORPUS / "monteverdi").glob("*.mxl"))[::4],
        *sorted((CORPUS / "trecento").glob("*.[mx]*l"))[::8],
        *(CORPUS / name for name in ("luca/gloria.xml", "ciconia/quod_jactatur.xml")),
        *(CORPUS / name for name in ("beach/prayer_of_a_tired_child.musicxml",)),
        *(CORPUS / name for name in ("johnson_j_r/lift_every_voice.mxl",)),
        *(CORPUS / name for name in ("lusitano/allor_che_ignuda.mxl",)),
    ]
    assert len(wanted) >= 40
    for path in wanted:
        in_full(of_file(path))
