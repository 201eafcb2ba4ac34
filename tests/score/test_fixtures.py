"""The bundled scores are what they claim: valid, complete, singable, made by their script."""

from __future__ import annotations

import importlib.util
import subprocess
import sys
import zipfile
from collections.abc import Iterator
from fractions import Fraction
from pathlib import Path

import music21
import pytest
from lxml import etree

FOLDER = Path(__file__).parents[2] / "fixtures"

# Parts, and bars with a pick-up counted. Written from the plan of each piece, not from the files.
SHAPES = {
    "harbour-hymn": (2, 26),
    "lantern-street": (4, 28),
    "tide-motet": (5, 36),
    "regatta-day": (4, 21),
    "lamp-night": (5, 26),
    "evening-tide": (5, 25),
    "gull-song": (4, 20),
}
PLAYED = {"Organ", "Piano", "Clarinet in B♭"}
FILES = sorted(FOLDER.glob("*.musicxml"))

# S. Kostka and D. Payne, Tonal Harmony (from memory), with the stretches a director allows:
# soprano C4-G5, alto G3-D5 (F3), tenor C3-G4 (A4), bass E2-C4 (D4).
RANGES = {
    "Soprano": (60, 79),
    "Soprano\nAlto": (55, 79),
    "Soprano I": (60, 79),
    "Soprano II": (60, 79),
    "Cantus": (60, 79),
    "Alto": (55, 74),
    "Altus": (53, 74),
    "Quintus": (48, 69),
    "Tenor": (48, 69),
    "Tenor\nBass": (40, 67),
    "Lead": (48, 69),
    "Baritone": (43, 65),
    "Bass": (40, 62),
    "Bassus": (40, 62),
}
SEMITONES = {"C": 0, "D": 2, "E": 4, "F": 5, "G": 7, "A": 9, "B": 11}

# The schema imports two others by address; only these attributes of theirs are referred to.
STUBS = {
    "xml": ("http://www.w3.org/XML/1998/namespace", ("lang", "space")),
    "xlink": (
        "http://www.w3.org/1999/xlink",
        ("href", "type", "role", "title", "show", "actuate"),
    ),
}


def name_of(path: Path) -> str:
    return path.stem


@pytest.fixture(scope="module")
def schema(tmp_path_factory: pytest.TempPathFactory) -> etree.XMLSchema:
    """The W3C schema of MusicXML 4.0, as the package musicxml ships it, without the network."""
    package = importlib.util.find_spec("musicxml")
    assert package is not None
    assert package.origin is not None
    shipped = Path(package.origin).parent / "generate_classes" / "musicxml_4_0.xsd"
    text = shipped.read_text(encoding="utf-8")
    folder = tmp_path_factory.mktemp("schema")
    for name, (namespace, attributes) in STUBS.items():
        lines = "".join(f'<xs:attribute name="{each}" type="xs:string"/>' for each in attributes)
        (folder / f"{name}.xsd").write_text(
            '<xs:schema xmlns:xs="http://www.w3.org/2001/XMLSchema"'
            f' targetNamespace="{namespace}">{lines}</xs:schema>',
            encoding="utf-8",
        )
        address = f"http://www.musicxml.org/xsd/{name}.xsd"
        assert address in text
        text = text.replace(address, f"{name}.xsd")
    (folder / "musicxml.xsd").write_text(text, encoding="utf-8")
    return etree.XMLSchema(etree.parse(str(folder / "musicxml.xsd")))


@pytest.fixture(scope="module")
def remade(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the scores as the script writes them now."""
    folder = tmp_path_factory.mktemp("remade")
    subprocess.run(
        [sys.executable, "-B", str(FOLDER / "make_fixtures.py"), "--into", str(folder)],
        check=True,
        capture_output=True,
        timeout=60,
    )
    return folder


def parts_of(path: Path) -> Iterator[tuple[str, etree._Element]]:
    root = etree.parse(str(path)).getroot()
    names = {each.get("id"): each.findtext("part-name") for each in root.iter("score-part")}
    for part in root.iter("part"):
        yield names[part.get("id")], part


def test_every_piece_is_there() -> None:
    assert {path.stem for path in FILES} == set(SHAPES)


@pytest.mark.parametrize("path", FILES, ids=name_of)
def test_the_script_writes_the_same_bytes(path: Path, remade: Path) -> None:
    assert (remade / path.name).read_bytes() == path.read_bytes()


def test_the_compressed_score_holds_the_plain_one(remade: Path) -> None:
    # MusicXML 4.0, "Compressed .mxl files": media type first and stored, then a container file
    # whose first rootfile is the score. Deflated bytes may differ between zlib builds.
    for folder in (FOLDER, remade):
        with zipfile.ZipFile(folder / "tide-motet.mxl") as archive:
            first = archive.infolist()[0]
            assert first.filename == "mimetype"
            assert first.compress_type == zipfile.ZIP_STORED
            assert archive.read(first) == b"application/vnd.recordare.musicxml"
            container = etree.fromstring(archive.read("META-INF/container.xml"))
            score = container.find(".//rootfile").get("full-path")
            assert archive.read(score) == (FOLDER / "tide-motet.musicxml").read_bytes()


@pytest.mark.parametrize("path", FILES, ids=name_of)
def test_valid_musicxml_4(path: Path, schema: etree.XMLSchema) -> None:
    document = etree.parse(str(path))
    assert document.getroot().get("version") == "4.0"
    assert schema.validate(document), schema.error_log.last_error


@pytest.mark.parametrize("path", FILES, ids=name_of)
def test_each_voice_fills_its_bars(path: Path) -> None:
    for name, part in parts_of(path):
        metre = Fraction(0)
        for bar in part.iter("measure"):
            divisions = int(part.findtext(".//divisions"))
            for time in bar.iter("time"):
                metre = Fraction(4 * int(time.findtext("beats")), int(time.findtext("beat-type")))
            assert metre > 0
            expected = Fraction(1) if bar.get("implicit") == "yes" else metre
            lengths: dict[str, Fraction] = {}
            for note in bar.iter("note"):
                if note.find("chord") is None and note.find("grace") is None:
                    voice = note.findtext("voice")
                    ticks = int(note.findtext("duration"))
                    lengths[voice] = lengths.get(voice, Fraction(0)) + Fraction(ticks, divisions)
            assert lengths, (name, bar.get("number"))
            assert set(lengths.values()) == {expected}, (name, bar.get("number"), lengths)


@pytest.mark.parametrize("path", FILES, ids=name_of)
def test_singers_stay_in_their_range(path: Path) -> None:
    for name, part in parts_of(path):
        if name in PLAYED:
            continue
        low, high = RANGES[name]
        for pitch in part.iter("pitch"):
            semitones = SEMITONES[pitch.findtext("step")] + int(pitch.findtext("alter") or 0)
            key = 12 * (int(pitch.findtext("octave")) + 1) + semitones
            assert low <= key <= high, (name, pitch.getparent().getparent().get("number"))


@pytest.mark.parametrize("path", FILES, ids=name_of)
def test_music21_reads_parts_bars_and_words(path: Path) -> None:
    score = music21.converter.parse(
        str(path), format="musicxml", forceSource=True, storePickle=False
    )
    parts, bars = SHAPES[path.stem]
    assert len({part.partName + part.id.split("-Staff")[0] for part in score.parts}) == parts
    for part in score.parts:
        assert len(part.getElementsByClass("Measure")) == bars
        sung = [note for note in part.recurse().notes if note.lyrics]
        assert bool(sung) is (part.partName not in PLAYED)
    assert bars - 1 >= 16
    assert list(score.recurse().getElementsByClass("MetronomeMark"))
    assert list(score.recurse().getElementsByClass("Dynamic"))


@pytest.mark.parametrize("path", FILES, ids=name_of)
def test_the_signs_a_singer_needs_are_there(path: Path) -> None:
    root = etree.parse(str(path)).getroot()
    for tag in ("fermata", "breath-mark", "wedge", "rehearsal", "measure-numbering", "sound"):
        assert root.find(f".//{tag}") is not None, tag
    assert "MIT" in root.findtext("identification/rights")


@pytest.mark.parametrize("path", FILES, ids=name_of)
def test_every_sung_note_has_its_syllable(path: Path) -> None:
    """Only a note inside a slur or after a tie goes on with the syllable before it."""
    for name, part in parts_of(path):
        if name in PLAYED:
            continue
        slurred: dict[str, bool] = {}
        for note in part.iter("note"):
            outside = ("rest", "chord", "grace", "cue")
            if any(note.find(tag) is not None for tag in outside):
                continue
            voice = note.findtext("voice")
            tied = note.find("tie[@type='stop']") is not None
            goes_on = slurred.get(voice, False) or tied
            assert (note.find("lyric") is None) is goes_on, (name, note.getparent().get("number"))
            if note.find("notations/slur[@type='stop']") is not None:
                slurred[voice] = False
            if note.find("notations/slur[@type='start']") is not None:
                slurred[voice] = True


def test_the_rehearsal_piano_doubles_the_voices_exactly() -> None:
    def heads(part: etree._Element, voice: str | None) -> list[tuple[str | None, ...]]:
        tags = ("pitch/step", "pitch/alter", "pitch/octave", "duration")
        notes = [n for n in part.iter("note") if voice in (None, n.findtext("voice"))]
        return [tuple(note.findtext(tag) for tag in tags) for note in notes]

    parts = dict(parts_of(FOLDER / "evening-tide.musicxml"))
    for name, voice in (("Soprano", "1"), ("Alto", "2"), ("Tenor", "5"), ("Bass", "6")):
        assert heads(parts["Piano"], voice) == heads(parts[name], None)
