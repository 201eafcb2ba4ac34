"""The outlines and widths that Verovio's own font files give, read without Verovio itself."""

from __future__ import annotations

from functools import cache
from importlib.util import find_spec
from pathlib import Path

from lxml import etree

MUSIC_FONT = "Leipzig"
_EM = 2048


@cache
def glyph_outline(code: str) -> str:
    """The path of a music glyph by its code point in hex, y upwards, 1000 units an em.

    Empty where the font has none.
    """
    root = _parsed(f"{MUSIC_FONT}/{code}.xml")
    path = root.find(".//path") if root is not None else None
    return "" if path is None else (path.get("d") or "")


@cache
def glyph_width(code: str) -> float:
    """How far a music glyph advances, in ems; 0 where the font has none."""
    return _advances(f"{MUSIC_FONT}.xml").get(code, 0.0) / 1000


def text_width(text: str, size: float, *, bold: bool = False, italic: bool = False) -> float:
    """Width of a text in Times, in the units of `size`."""
    style = ("-bold" if bold else "") + ("-italic" if italic else "")
    styled, plain = _advances(f"text/Times{style}.xml"), _advances("text/Times.xml")
    # Some styles lack letters, or give them no width; the plain ones are near enough.
    codes = (f"{ord(c):02X}" for c in text)
    return size * sum(styled.get(c) or plain.get(c) or _EM / 2 for c in codes) / _EM


@cache
def _advances(name: str) -> dict[str, float]:
    root = _parsed(name)
    glyphs = () if root is None else root.iter("g")
    return {g.get("c", "").upper(): float(g.get("h-a-x") or 0) for g in glyphs}


def _parsed(name: str) -> etree._Element | None:
    spec = find_spec("verovio")
    if spec is None or not spec.submodule_search_locations:
        return None
    file = Path(spec.submodule_search_locations[0]) / "data" / name
    try:
        return etree.fromstring(file.read_bytes())
    except (OSError, etree.XMLSyntaxError):
        return None
