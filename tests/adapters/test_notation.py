"""Humdrum, ABC and MEI as written scores, against music21 and texts of our own."""

from __future__ import annotations

import contextlib
from fractions import Fraction
from pathlib import Path

import music21
import pytest

from retune.adapters.notation import read_notation
from retune.errors import LimitError, RetuneError, UnreadableError
from retune.limits import Limits
from retune.score.read import read
from retune.written import MarkKind, WrittenScore

CORPUS = Path(music21.__file__).parent / "corpus"

HUMDRUM = """\
**kern\t**text\t**kern\t**text
*Itenor\t*\t*Isoprn\t*
*clefGv2\t*\t*clefG2\t*
*k[b-]\t*\t*k[b-]\t*
*M4/4\t*\t*M4/4\t*
=1\t=1\t=1\t=1
2A\tLan-\t4f\tLan-
.\t.\t4g\t.
2B-;\t-terns\t[2a\t-terns
=2\t=2\t=2\t=2
1A\tshine\t1a]\t.
==\t==\t==\t==
*-\t*-\t*-\t*-
"""

ABC = """\
X:1
T:Two Boats
M:3/4
L:1/4
Q:1/4=90
K:G
V:1
"G" G A B | c2 d | !fermata!e3 |]
w: Two boats go out at dawn
V:2
G,2 F, | E,2 D, | C,3 |]
"""

MEI = """\
<?xml version="1.0" encoding="UTF-8"?>
<mei xmlns="http://www.music-encoding.org/ns/mei" meiversion="4.0.0"><music><body><mdiv><score>
<scoreDef meter.count="4" meter.unit="4"><staffGrp><staffDef n="1" lines="5" clef.shape="G"
 clef.line="2"/></staffGrp></scoreDef><section><measure n="1"><staff n="1"><layer n="1">
<note pname="c" oct="5" dur="2"/><note pname="f" oct="4" dur="2" accid="s"/>
</layer></staff></measure></section></score></mdiv></body></music></mei>
"""


def notes_of(score: WrittenScore) -> list[list[tuple[Fraction, str, Fraction]]]:
    """For each part: onset from the start, pitch, duration of every notehead."""
    found = []
    for part in score.parts:
        start, row = Fraction(0), []
        for bar in part.bars:
            row += [(start + n.onset, n.pitch.name, n.duration) for n in bar.notes]
            start += bar.length
        found.append(row)
    return found


def test_humdrum_spines_become_parts_with_words() -> None:
    score = read_notation(HUMDRUM.encode(), "humdrum")
    assert [part.name for part in score.parts] == ["Soprano", "Tenor"]
    soprano, tenor = score.parts
    first = soprano.bars[0]
    assert [(n.onset, n.pitch.name) for n in first.notes] == [(0, "F4"), (1, "G4"), (2, "A4")]
    assert [n.tie_start for n in first.notes] == [False, False, True]
    assert [lyric.text for n in tenor.bars[0].notes for lyric in n.lyrics] == ["Lan", "terns"]
    assert [n.lyrics[0].syllabic for n in tenor.bars[0].notes] == ["begin", "end"]
    assert "fermata" in tenor.bars[0].notes[1].marks
    assert first.key is not None
    assert first.key[0] == -1
    assert first.metre == (4, 4)


def test_abc_voices_words_and_signs() -> None:
    score = read_notation(ABC.encode(), "abc")
    assert score.title == "Two Boats"
    upper, lower = notes_of(score)
    assert upper == [
        (0, "G4", 1), (1, "A4", 1), (2, "B4", 1), (3, "C5", 2), (5, "D5", 1), (6, "E5", 3),
    ]  # fmt: skip
    assert [pitch for _, pitch, _ in lower] == ["G3", "F#3", "E3", "D3", "C3"]
    words = [n.lyrics[0].text for bar in score.parts[0].bars for n in bar.notes if n.lyrics]
    assert words == ["Two", "boats", "go", "out", "at", "dawn"]
    last = score.parts[0].bars[-1].notes[-1]
    assert "fermata" in last.marks
    marks = [mark for part in score.parts for bar in part.bars for mark in bar.marks]
    assert [m.value for m in marks if m.kind is MarkKind.TEMPO] == [90]
    (symbol,) = [m.value for m in marks if m.kind is MarkKind.CHORD_SYMBOL]
    assert getattr(symbol, "root").name == "G"  # noqa: B009  # a union of mark values


def test_mei_notes() -> None:
    score = read_notation(MEI.encode(), "mei")
    assert notes_of(score) == [[(0, "C5", 2), (2, "F#4", 2)]]


@pytest.mark.parametrize(
    "name", ["palestrina/Kyrie_02.krn", "palestrina/Agnus_02.krn", "bach/bwv366.krn"]
)
def test_humdrum_agrees_with_music21(name: str) -> None:
    path = CORPUS / name
    plain = music21.converter.parse(path, format="humdrum", forceSource=True, storePickle=False)
    expected = [
        sorted(
            (Fraction(n.getOffsetInHierarchy(part)), p.midi, Fraction(n.quarterLength))
            for n in part.recurse().notes
            for p in n.pitches
        )
        for part in plain.toSoundingPitch().parts
    ]
    score = read_notation(path.read_bytes(), "humdrum")
    ours = [
        sorted((onset, pitch.key, length) for onset, pitch, length in part)
        for part in (
            [
                (start + n.onset, n.pitch, n.duration)
                for start, bar in _placed(written)
                for n in bar.notes
            ]
            for written in score.parts
        )
    ]
    assert ours == expected


def _placed(part: object) -> list[tuple[Fraction, object]]:
    start, found = Fraction(0), []
    for bar in part.bars:  # type: ignore[attr-defined]  # a written part
        found.append((start, bar))
        start += bar.length
    return found


@pytest.mark.parametrize("path", sorted((CORPUS / "josquin").glob("*.abc")), ids=lambda p: p.stem)
def test_one_voice_tunes_of_a_piece_are_joined(path: Path) -> None:
    score = read(path)
    assert 2 <= len(score.parts) <= 5
    ends = [max(n.end for n in score.notes if n.part == part.index) for part in score.parts]
    assert max(ends) - min(ends) <= 16


def test_several_pieces_ask_for_a_choice() -> None:
    two = ABC + "\nX:2\nT:Other Tune\nM:4/4\nL:1/4\nK:C\nC D E F|\n"
    with pytest.raises(RetuneError, match="2 pieces: 1 Two Boats; 2 Other Tune") as error:
        read_notation(two.encode(), "abc")
    assert "--piece" in error.value.hint
    assert read_notation(two.encode(), "abc", piece=2).title == "Other Tune"
    with pytest.raises(RetuneError, match="not 3"):
        read_notation(two.encode(), "abc", piece=3)


@pytest.mark.parametrize("format", ["humdrum", "abc", "mei"])
@pytest.mark.parametrize("data", [b"", b"\x00\xff\x01", b"X:1\n", b"**kern\n", b"<mei>"])
def test_what_is_no_score_is_refused(format: str, data: bytes) -> None:
    with pytest.raises(UnreadableError):
        read_notation(data, format)


@pytest.mark.parametrize("cut", range(10, len(HUMDRUM), 37))
def test_cut_humdrum_never_crashes(cut: int) -> None:
    with contextlib.suppress(RetuneError):
        read_notation(HUMDRUM[:cut].encode(), "humdrum")


def test_limits_hold() -> None:
    with pytest.raises(LimitError):
        read_notation(ABC.encode(), "abc", limits=Limits(max_notes=3))
    with pytest.raises(LimitError):
        read_notation(ABC.encode(), "abc", limits=Limits(max_bytes=10))


def test_mei_signs_that_music21_leaves_out() -> None:
    text = MEI.replace('meter.unit="4">', 'meter.unit="4" midi.bpm="66">').replace(
        '<note pname="c"', '<note xml:id="a" fermata="above" pname="c"'
    )
    text = text.replace('pname="f"', 'xml:id="b" pname="f"').replace(
        "</staff></measure>",
        '</staff><tempo tstamp="3" midi.bpm="80"/><fermata startid="#b"/></measure>',
    )
    (bar,) = read_notation(text.encode(), "mei").parts[0].bars
    assert [note.marks for note in bar.notes] == [{"fermata"}, {"fermata"}]
    tempi = [(m.onset, m.value) for m in bar.marks if m.kind is MarkKind.TEMPO]
    assert tempi == [(0, 66), (2, 80)]


def test_a_divided_bar_of_humdrum_keeps_its_number() -> None:
    score = read_notation((CORPUS / "bach/bwv277.krn").read_bytes(), "humdrum")
    bars = score.parts[0].bars
    assert [(bar.number, bar.implicit, bar.length) for bar in bars[:1] + bars[4:6]] == [
        ("0", True, 1),
        ("4", False, 3),
        ("4", True, 1),
    ]
    assert (bars[4].repeat_end, bars[-1].number) == (2, "12")


@pytest.mark.slow
def test_every_humdrum_file_of_the_corpus_reads() -> None:
    files = sorted((CORPUS / "palestrina").glob("*.krn"))
    assert len(files) > 1300
    for path in files:
        score = read_notation(path.read_bytes(), "humdrum")
        assert len({sum(bar.length for bar in part.bars) for part in score.parts}) == 1, path.name
