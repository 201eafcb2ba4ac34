"""What music21 leaves out of a Humdrum file: lyrics and the names of parts.

Conventions
-----------
* Lines count from 1, as music21's `priority` of a note does.
* A spine is known by the column it starts in; what it splits into keeps that number.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from itertools import groupby
from typing import Any

_LYRIC_SPINES = frozenset(("text", "silbe", "lyrics"))
_NOT_SUNG = frozenset((".", "|", "_", ""))
_NAMES = {
    "printed": re.compile(r'\*I"(.+)'),
    "short": re.compile(r"\*I'(.+)"),
    "group": re.compile(r"\*I:\[?(.+?)\]?"),
    "comment": re.compile(r"!([^\W\d_][\w .'-]{0,40})"),
}
_DIAERESIS = re.compile(r"\\([A-Za-z])3")


@dataclass
class Spine:
    """One spine: its exclusive interpretation, and its tokens by line."""

    kind: str
    tokens: list[tuple[int, str]] = field(default_factory=list)


def spines_of(text: str) -> list[Spine]:
    """The spines of a file, from left to right."""
    spines: list[Spine] = []
    columns: list[int] = []
    for number, line in enumerate(text.splitlines(), start=1):
        if not line or line.startswith("!!"):
            continue
        cells = line.split("\t")
        if not spines:
            spines = [Spine(cell.removeprefix("**")) for cell in cells]
            columns = list(range(len(cells)))
        elif len(cells) == len(columns):
            for column, cell in zip(columns, cells, strict=True):
                spines[column].tokens.append((number, cell))
            if line.startswith("*"):
                columns = list(_next_columns(columns, cells))
    return spines


def _next_columns(columns: Sequence[int], cells: Sequence[str]) -> Iterator[int]:
    """The spine of each column after a line of interpretations that split, join or end some."""
    for joins, run in groupby(zip(columns, cells, strict=True), key=lambda pair: pair[1] == "*v"):
        pairs = list(run)
        if joins:
            yield pairs[0][0]
            continue
        for column, cell in pairs:
            yield from [column] * {"*^": 2, "*-": 0}.get(cell, 1)


def add_names_and_lyrics(text: str, score: Any) -> None:
    """Give the parts of a parsed score their names, and its notes their syllables.

    Parts come in music21 from the right-most spine; a spine of words belongs to the nearest
    `**kern` spine on its left. Nothing is done where the parts are not the spines.
    """
    about = score.metadata
    if about is not None and about.title:
        about.title = _plain(about.title)
    spines = spines_of(text)
    places = [place for place, spine in enumerate(spines) if spine.kind == "kern"]
    if len(places) != len(score.parts):
        return
    for part, start, end in zip(
        reversed(score.parts), places, [*places[1:], len(spines)], strict=True
    ):
        _add_name(part, spines[start])
        notes = {note.priority: note for note in part.recurse().notes}
        verses = [spine for spine in spines[start:end] if spine.kind in _LYRIC_SPINES]
        for number, spine in enumerate(verses, start=1):
            _add_verse(notes, spine, number)


def _add_name(part: Any, spine: Spine) -> None:
    """The printed name (`*I"`), else a group's name (`*I:[]`), else a comment before the music."""
    named: dict[str, str] = {}
    for _, token in spine.tokens:
        if not token.startswith(("*", "!", "=")):
            break
        for kind, pattern in _NAMES.items():
            match = pattern.fullmatch(token)
            if match:
                named.setdefault(kind, match[1].strip())
    name = named.get("printed") or named.get("group") or named.get("comment")
    if name:
        part.partName = name
    if "short" in named:
        part.partAbbreviation = named["short"]


def _add_verse(notes: dict[int, Any], spine: Spine, number: int) -> None:
    from music21.note import Lyric

    inside = False
    for line, token in spine.tokens:
        syllable = token.strip()
        if syllable in _NOT_SUNG or syllable[0] in "*!=" or line not in notes:
            continue
        inside = inside or syllable.startswith("-")
        goes_on = syllable.endswith("-")
        syllabic = (("single", "begin"), ("end", "middle"))[inside][goes_on]
        text = _plain(syllable.strip("-"))
        if text:
            lyric: Any = Lyric(number=number, text=text)
            lyric.syllabic = syllabic
            notes[line].lyrics.append(lyric)
        inside = goes_on


def _plain(text: str) -> str:
    """Text with MuseData's code for a diaeresis (backslash, letter, 3) resolved."""
    return unicodedata.normalize("NFC", _DIAERESIS.sub(r"\1" + "\u0308", text))
