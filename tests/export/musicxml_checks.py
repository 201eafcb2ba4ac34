"""What the tests of written notation hold it against: the schema, the input, other readers.

Nothing here uses the exporter's own code: XML is compared as lxml parses it, pitches are read
from the file's own `other-play` elements.
"""

from __future__ import annotations

import importlib.util
import json
import re
import zipfile
from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cache
from io import BytesIO
from pathlib import Path
from typing import Any

from lxml import etree

_STUBS = {
    "xml": ("http://www.w3.org/XML/1998/namespace", ("lang", "space")),
    "xlink": (
        "http://www.w3.org/1999/xlink",
        ("href", "type", "role", "title", "show", "actuate"),
    ),
}
_TYPE = re.compile(r"cents(?: pass (\d+))?(?: after (\S+))?")


class _Stubs(etree.Resolver):
    """The two schemas that MusicXML imports, as far as it uses them; nothing is fetched."""

    def resolve(self, url: str, public_id: str, context: object) -> object:
        if Path(url).stem not in _STUBS:
            return None
        namespace, names = _STUBS[Path(url).stem]
        lines = "".join(f'<xs:attribute name="{each}" type="xs:string"/>' for each in names)
        text = (
            '<xs:schema xmlns:xs="http://www.w3.org/2001/XMLSchema"'
            f' targetNamespace="{namespace}">{lines}</xs:schema>'
        )
        return self.resolve_string(text, context)


@cache
def schema() -> etree.XMLSchema:
    """The W3C schema of MusicXML 4.0, as the package musicxml ships it."""
    package = importlib.util.find_spec("musicxml")
    assert package is not None
    assert package.origin is not None
    parser = etree.XMLParser()
    parser.resolvers.add(_Stubs())
    shipped = Path(package.origin).parent / "generate_classes" / "musicxml_4_0.xsd"
    return etree.XMLSchema(etree.parse(str(shipped), parser))


def fault_of(data: bytes) -> str:
    """The first thing the schema finds wrong; empty where a score is valid."""
    valid = schema().validate(etree.parse(BytesIO(data)))
    return "" if valid else str(schema().error_log[0])


def contents(data: bytes) -> bytes:
    """The score in a file, compressed or not."""
    if not data.startswith(b"PK"):
        return data
    with zipfile.ZipFile(BytesIO(data)) as archive:
        container = etree.fromstring(archive.read("META-INF/container.xml"))
        first = container.find(".//{*}rootfile")
        return archive.read(first.get("full-path"))


def tree_of(data: bytes) -> etree._Element:
    """The tree of a document with comments and processing instructions, without blanks."""
    parser = etree.XMLParser(remove_blank_text=True, load_dtd=False, no_network=True)
    return etree.fromstring(data.lstrip(), parser)


def lost(before: etree._Element, after: etree._Element, path: str = "") -> str:
    """What of one tree is not in another in order, additions aside; empty for nothing."""
    here = f"{path}/{before.tag}"
    if before.tag != after.tag:
        return f"{here}: is {after.tag}"
    if (before.text or "").strip() != (after.text or "").strip():
        return f"{here}: text {before.text!r} is {after.text!r}"
    for name, value in before.attrib.items():
        if after.get(name) != value:
            return f"{here}@{name}: {value!r} is {after.get(name)!r}"
    rest = iter(after)
    for child in before:
        fault = "it has gone"
        for other in rest:
            fault = lost(child, other, here)
            if not fault:
                break
        else:
            return fault if "gone" not in fault else f"{here}/{child.tag}: {fault}"
    return ""


def added(before: etree._Element, after: etree._Element) -> Iterator[etree._Element]:
    """The elements of a tree that another, all of which is in it, does not have."""
    rest = list(after)
    for child in before:
        while lost(child, rest[0]):
            yield rest.pop(0)
        yield from added(child, rest.pop(0))
    yield from rest


Pitches = dict[int, list[tuple[Fraction, float]]]


def cents_of(note: etree._Element) -> Pitches:
    """By pass, from 1: when after the notehead, in quarter notes, which cents begin."""
    found: Pitches = defaultdict(list)
    for play in note.findall("play/other-play"):
        match = _TYPE.fullmatch(play.get("type", ""))
        if match is not None:
            start = Fraction(match[2] or 0)
            found[int(match[1] or 1)].append((start, float(play.text or "")))
    return found


def notelist(data: bytes) -> dict[str, Any]:
    """A note list as JSON gives it."""
    found: dict[str, Any] = json.loads(data)
    return found


def by_part(root: etree._Element) -> Iterator[tuple[str, list[etree._Element]]]:
    """The bars of each part of a score by parts or by time."""
    if root.tag == "score-partwise":
        for part in root.findall("part"):
            yield part.get("id", ""), part.findall("measure")
        return
    names = dict.fromkeys(p.get("id", "") for p in root.iterfind("measure/part"))
    for name in names:
        yield (
            name,
            [p for p in root.iterfind("measure/part") if p.get("id", "") == name],
        )


_SEMITONES = {"C": 0, "D": 2, "E": 4, "F": 5, "G": 7, "A": 9, "B": 11}
Events = dict[tuple[str, int], list[tuple[Fraction, float, str]]]


def events_of(root: etree._Element, starts: Sequence[Fraction]) -> Events:
    """By part id and sounding MIDI key: from when, in quarter notes, which cents, in which voice.

    Durations, voices and transposition are read as the MusicXML 4.0 reference describes them;
    `starts` are the onsets of the bars.
    """
    found: Events = defaultdict(list)
    for name, bars in by_part(root):
        for start, bar in zip(starts, _with_state(bars), strict=True):
            for onset, key, note in _walked(bar):
                for after, cents in cents_of(note).get(1, ()):
                    voice = note.findtext("voice") or "1"
                    found[name, key].append((start + onset + after, cents, voice))
    return found


@dataclass
class _Bar:
    element: etree._Element
    divisions: Fraction
    shift: int


def _with_state(bars: list[etree._Element]) -> Iterator[_Bar]:
    divisions, shift = Fraction(1), 0
    for bar in bars:
        for attributes in bar.findall("attributes"):
            divisions = Fraction(attributes.findtext("divisions") or divisions)
            transpose = attributes.find("transpose")
            if transpose is not None:
                octaves = int(transpose.findtext("octave-change") or 0)
                shift = int(transpose.findtext("chromatic")) + 12 * octaves
        yield _Bar(bar, divisions, shift)


def _walked(bar: _Bar) -> Iterator[tuple[Fraction, int, etree._Element]]:
    """Onset, key and element of each note of a bar."""
    now = onset = Fraction(0)
    for child in bar.element:
        length = Fraction(child.findtext("duration") or 0) / bar.divisions
        if child.tag == "backup":
            now -= length
        elif child.tag == "forward":
            now += length
        elif child.tag == "note":
            if child.find("chord") is None:
                onset, now = now, now + length
            pitch = child.find("pitch")
            if pitch is not None:
                key = _SEMITONES[pitch.findtext("step")] + int(pitch.findtext("alter") or 0)
                key += 12 * (int(pitch.findtext("octave")) + 1) + bar.shift
                yield onset, key, child
