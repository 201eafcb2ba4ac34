"""Engraved systems as pictures that stand by themselves, for print."""

from __future__ import annotations

import re
from dataclasses import dataclass
from html import escape

from retune.page.engrave import CHORD_FONT, TEXT_FONT, Engraved
from retune.page.engrave_text import GLYPH_SIZE

_USED = re.compile(r'href="#m([0-9A-F]+)"')
_BOX = re.compile(r'viewBox="(-?\d+) (-?\d+) (\d+) (\d+)"')
_BARS = re.compile(r'data-bar="(\d+)"')
_LABEL = re.compile(r'aria-label="([^"]*)"')
_PER_SPACE = 180
"""Units of a picture in a staff space."""


@dataclass(frozen=True, slots=True)
class PrintedSystem:
    """One system as an SVG document: its size in staff spaces, its bars in words."""

    svg: bytes
    width: float
    height: float
    label: str
    bars: frozenset[int]
    """Indices of the written bars in it."""


def printed_systems(picture: Engraved, fonts: tuple[str, str]) -> tuple[PrintedSystem, ...]:
    """The systems of an engraving, black and with their glyphs in them.

    `fonts` are those of the words and of the chord names.
    """
    return tuple(_printed(system, picture, fonts) for system in picture.systems)


def _printed(system: str, picture: Engraved, fonts: tuple[str, str]) -> PrintedSystem:
    box, label = _BOX.search(system), _LABEL.search(system)
    assert box is not None, "every picture states its box"
    assert label is not None, "every picture says its bars"
    width, height = int(box[3]), int(box[4])
    used = sorted(set(_USED.findall(system)) & set(picture.glyphs))
    scale = GLYPH_SIZE / 1000
    paths = "".join(
        f'<path id="m{code}" transform="scale({scale:g} -{scale:g})"'
        f' d="{escape(picture.glyphs[code])}"/>'
        for code in used
    )
    opening, rest = system.split(">", 1)
    opening = opening.replace('fill="currentColor"', 'fill="#000" color="#000"')
    opening += f' width="{width}" height="{height}"'
    text = f"{opening}><defs>{paths}</defs>{rest}"
    for font, wanted in ((TEXT_FONT, fonts[0]), (CHORD_FONT, fonts[1])):
        text = text.replace(f'font-family="{font}"', f'font-family="{escape(wanted)}"')
    return PrintedSystem(
        text.encode(),
        width / _PER_SPACE,
        height / _PER_SPACE,
        label[1],
        frozenset(map(int, _BARS.findall(system))),
    )
