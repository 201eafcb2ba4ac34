"""Score files told apart and read; what cannot be read says so in one line."""

from __future__ import annotations

import io
import os
import zipfile
from pathlib import Path

import mido
import music21
import pytest

from retune.errors import LimitError, UnreadableError, WishError
from retune.limits import Limits
from retune.score.options import ReadOptions
from retune.score.read import kind_of, read, read_bytes, stem_of

CORPUS = Path(music21.__file__).parent / "corpus"
CHORALE = CORPUS / "bach" / "bwv6.6.mxl"

XML = b"""<?xml version="1.0"?><score-partwise version="4.0"><part-list><score-part id="P1">
<part-name>Alto</part-name></score-part></part-list><part id="P1"><measure number="1"><attributes>
<divisions>1</divisions></attributes><note><pitch><step>C</step><octave>5</octave></pitch>
<duration>4</duration></note></measure></part></score-partwise>"""


def midi() -> bytes:
    file = mido.MidiFile(type=1)
    track = mido.MidiTrack()
    track.append(mido.Message("note_on", note=60, velocity=70, time=0))
    track.append(mido.Message("note_off", note=60, velocity=0, time=480))
    file.tracks.append(track)
    data = io.BytesIO()
    file.save(file=data)
    return data.getvalue()


ABC = b"X:1\nT:Round\nM:4/4\nL:1/4\nK:D\nDEFG|A4|]\n"
KERN = b"**kern\n*M4/4\n=1\n4c\n4d\n4e\n4f\n==\n*-\n"


@pytest.mark.parametrize(
    ("data", "kind"),
    [
        (b"PK\x03\x04rest", "musicxml"),
        (XML, "musicxml"),
        (b"\xef\xbb\xbf" + XML, "musicxml"),
        (XML.decode().encode("utf-16"), "musicxml"),
        (b'<?xml version="1.0"?>\n<mei xmlns="http://www.music-encoding.org/ns/mei">', "mei"),
        (b"MThd\0\0\0\6", "midi"),
        (ABC, "abc"),
        (b"% a comment\n" + ABC, "abc"),
        (KERN, "humdrum"),
        (b"!!!COM: Renn\n" + KERN, "humdrum"),
        (b"Dear choir,", None),
    ],
)
def test_content_tells_the_kind(data: bytes, kind: str | None) -> None:
    assert kind_of(data, "file.txt") == kind
    assert kind_of(data, "file.mid") == (kind or "midi")


@pytest.mark.parametrize(
    ("data", "format"), [(XML, "musicxml"), (midi(), "midi"), (ABC, "abc"), (KERN, "humdrum")]
)
def test_every_kind_is_read(data: bytes, format: str) -> None:
    score = read_bytes(data, "-")
    assert score.format == format
    assert score.notes
    assert (score.stem, score.file) == ("score", "standard input")


@pytest.mark.parametrize(
    ("name", "stem"),
    [
        ("bwv6.6.mxl", "bwv6.6"),
        ("bwv6.6", "bwv6.6"),
        ("a/b/Hymn No. 3.MusicXML", "Hymn No. 3"),
        ("song.mid", "song"),
        ("song.txt", "song.txt"),
        ("-", "score"),
    ],
)
def test_stem(name: str, stem: str) -> None:
    assert stem_of(name) == stem


def test_a_chorale_end_to_end() -> None:
    score = read(CHORALE)
    assert (score.stem, score.file) == ("bwv6.6", "bwv6.6.mxl")
    assert [part.name for part in score.parts] == ["Soprano", "Alto", "Tenor", "Bass"]
    assert [str(note.pitch) for note in score.notes if note.onset == 0] == [
        "G4", "D4", "Bb3", "G2"
    ]  # fmt: skip
    assert score.bars[0].begins == 3


def test_missing_folder_and_locked(tmp_path: Path) -> None:
    with pytest.raises(UnreadableError, match="no such file"):
        read(tmp_path / "none.xml")
    with pytest.raises(UnreadableError, match="this is a folder"):
        read(tmp_path)
    with pytest.raises(UnreadableError):
        read("bad\0name.xml")
    if os.geteuid() != 0:
        locked = tmp_path / "locked.xml"
        locked.write_bytes(XML)
        locked.chmod(0)
        with pytest.raises(UnreadableError, match="may not be read"):
            read(locked)


@pytest.mark.parametrize(
    ("data", "what"),
    [
        (b"", "the file is empty"),
        (b"  \n\0", "the file is empty"),
        (b"Dear choir,", "no kind of score"),
        (XML[:200], "\\w"),
        (b"PK\x03\x04", "\\w"),
        (b"MThd", "\\w"),
        (b"<html></html>", "\\w"),
    ],
)
def test_what_cannot_be_read(tmp_path: Path, data: bytes, what: str) -> None:
    path = tmp_path / "song.data"
    path.write_bytes(data)
    with pytest.raises(UnreadableError, match=what) as caught:
        read(path)
    assert caught.value.where.file == "song.data"
    assert caught.value.hint


def test_limits(tmp_path: Path) -> None:
    path = tmp_path / "song.xml"
    path.write_bytes(XML)
    with pytest.raises(LimitError, match="larger than 100 bytes"):
        read(path, ReadOptions(limits=Limits(max_bytes=100)))
    bomb = io.BytesIO()
    with zipfile.ZipFile(bomb, "w", zipfile.ZIP_DEFLATED) as file:
        file.writestr("song.xml", XML + b" " * 1_000_000)
    with pytest.raises(LimitError):
        read_bytes(bomb.getvalue(), "b.mxl", ReadOptions(limits=Limits(max_bytes=100_000)))


def test_only_one_piece() -> None:
    assert read_bytes(XML, "song.xml", ReadOptions(piece=1)).notes
    with pytest.raises(WishError, match=r"song\.xml: there is no piece 2"):
        read_bytes(XML, "song.xml", ReadOptions(piece=2))
