"""MusicXML written by hand for the tests of its reader: four divisions a quarter note."""

from __future__ import annotations

import re

from retune.limits import Limits
from retune.score.musicxml import read_musicxml
from retune.written import Mark, MarkKind, WrittenBar, WrittenPart, WrittenScore

_PITCH = re.compile(r"([A-G])(#|b|)(\d)")
_ALTER = {"#": "<alter>1</alter>", "b": "<alter>-1</alter>", "": ""}

DIVISIONS = "<attributes><divisions>4</divisions></attributes>"


def pitch(name: str) -> str:
    """A <pitch> element, such as for F#4."""
    match = _PITCH.fullmatch(name)
    assert match is not None, name
    return f"<pitch><step>{match[1]}</step>{_ALTER[match[2]]}<octave>{match[3]}</octave></pitch>"


def note(name: str = "C4", duration: int | None = 4, inner: str = "", attributes: str = "") -> str:
    """A note element; `inner` follows the duration."""
    length = "" if duration is None else f"<duration>{duration}</duration>"
    return f"<note {attributes}>{pitch(name)}{length}{inner}</note>"


def rest(duration: int = 4, inner: str = "", attributes: str = "") -> str:
    """A rest."""
    return f"<note {attributes}><rest/><duration>{duration}</duration>{inner}</note>"


def attributes(inner: str) -> str:
    """An attributes element."""
    return f"<attributes>{inner}</attributes>"


def direction(kind: str, inner: str = "") -> str:
    """A direction with one direction type; `inner` follows it."""
    return f"<direction><direction-type>{kind}</direction-type>{inner}</direction>"


def part_text(*bars: str, id: str = "P1") -> str:
    """A <part> with numbered bars; the first gets the divisions."""
    measures = "".join(
        f'<measure number="{number}">{DIVISIONS if number == 1 else ""}{bar}</measure>'
        for number, bar in enumerate(bars, 1)
    )
    return f'<part id="{id}">{measures}</part>'


def score_text(
    *parts: str,
    head: str = "",
    part_list: str = '<score-part id="P1"><part-name>Alto</part-name></score-part>',
) -> bytes:
    """A whole score."""
    text = f"<score-partwise>{head}<part-list>{part_list}</part-list>{''.join(parts)}"
    return f"{text}</score-partwise>".encode()


def read(*bars: str) -> WrittenScore:
    """A score of one part, read."""
    return read_musicxml(score_text(part_text(*bars)), Limits())


def read_part(*bars: str) -> WrittenPart:
    """The one part."""
    return read(*bars).parts[0]


def read_bar(bar: str) -> WrittenBar:
    """The one bar of the one part."""
    return read_part(bar).bars[0]


def said(score: WrittenScore) -> list[str]:
    """The findings in words."""
    return [str(finding) for finding in score.findings]


def marks(bar: WrittenBar, kind: MarkKind) -> list[Mark]:
    """The marks of a kind."""
    return [mark for mark in bar.marks if mark.kind is kind]


def values(bar: WrittenBar, kind: MarkKind) -> list[object]:
    """What the marks of a kind say."""
    return [mark.value for mark in marks(bar, kind)]
