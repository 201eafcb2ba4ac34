"""Texts of an engraving: the runs of one text, made flat, with music glyphs drawn as glyphs.

Conventions
-----------
* Lengths are the engraver's: 180 to a staff space, y downwards.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from html import escape
from itertools import groupby

from retune.adapters.engraving_font import MUSIC_FONT, glyph_width, text_width
from retune.adapters.engraving_markup import Node

GLYPH_SIZE = 720
"""Font size at which the music glyphs of the picture are defined."""

_BLANK = " \u00a0"
_BOLD = frozenset({"ending", "fing", "reh", "tempo"})
_ITALIC = frozenset({"dir", "dynam", "mNum"})


@dataclass(frozen=True, slots=True)
class Style:
    """How a run looks."""

    size: int = 405
    bold: bool = False
    italic: bool = False
    music: bool = False

    @property
    def attributes(self) -> str:
        """As SVG attributes."""
        weight = ' font-weight="bold"' if self.bold else ""
        slope = ' font-style="italic"' if self.italic else ""
        return f' font-size="{self.size}"{weight}{slope}'


@dataclass(frozen=True, slots=True)
class Run:
    """A run of one style; `place` where it starts a line of its own."""

    text: str
    style: Style
    place: tuple[int, int] | None = None


def style_of(kind: str) -> Style:
    """How texts of an element of this class look unless they say otherwise."""
    return Style(bold=kind in _BOLD, italic=kind in _ITALIC)


def runs_of(element: Node, style: Style) -> Iterator[Run]:
    """The runs of a text element in order; blank space between elements is none of theirs."""
    size = _size(element)
    style = replace(
        style,
        size=size or style.size,
        bold=_says(element, "font-weight", "bold", style.bold),
        italic=_says(element, "font-style", "italic", style.italic),
        music=element.get("font-family", "") == MUSIC_FONT,
    )
    place = (int(element.get("x", "")), int(element.get("y", ""))) if element.get("x", "") else None
    if len(element) == 0 and element.text:
        yield Run(element.text, style, place)
    for child in element:
        for run in runs_of(child, style):
            yield replace(run, place=run.place or place)
            place = None


def _says(element: Node, name: str, value: str, otherwise: bool) -> bool:
    said = element.get(name, "")
    return said == value if said else otherwise


def _size(element: Node) -> int:
    text = element.get("font-size", "").removesuffix("px")
    return round(float(text)) if text else 0


def drawn_text(runs: list[Run], anchor: str, glyphs: set[str]) -> Iterator[str]:
    """Runs as SVG text and glyph uses; adds the codes of glyphs used to `glyphs`.

    Texts before a glyph bear their length, so that the glyph is clear of them in any font.
    """
    lines: list[list[Run]] = []
    for run in runs:
        if run.place is not None or not lines:
            lines.append([])
        lines[-1].append(run)
    for line in lines:
        yield from _line(line, anchor, glyphs)


def _line(runs: list[Run], anchor: str, glyphs: set[str]) -> Iterator[str]:
    x, y = runs[0].place or (0, 0)
    if not any(run.style.music for run in runs):
        yield _text(x, y, runs, anchor)
        return
    widths = [_width(run) for run in runs]
    left = x - {"middle": sum(widths) / 2, "end": sum(widths)}.get(anchor, 0)
    for music, group in groupby(zip(runs, widths, strict=True), key=lambda e: e[0].style.music):
        entries = list(group)
        if music:
            for run, _ in entries:
                for character in run.text:
                    code = f"{ord(character):04X}"
                    advance = glyph_width(code) * run.style.size
                    if advance and not character.isspace():
                        glyphs.add(code)
                        yield use(code, round(left), y, run.style.size / GLYPH_SIZE)
                    left += advance or run.style.size / 8
        else:
            length = sum(width for _, width in entries)
            words = [run for run, _ in entries]
            indent = _width(replace(words[0], text=_indent(words[0].text)))
            words[0] = replace(words[0], text=words[0].text.lstrip(_BLANK))
            words[-1] = replace(words[-1], text=words[-1].text.rstrip(_BLANK))
            inked = sum(_width(run) for run in words)
            if inked:
                yield _text(round(left + indent), y, words, "", round(inked))
            left += length + (words[-1].style.size / 8 if length - indent - inked < 1 else 0)


def _indent(text: str) -> str:
    return text[: len(text) - len(text.lstrip(_BLANK))]


def _width(run: Run) -> float:
    style = run.style
    if style.music:
        codes = (f"{ord(c):04X}" for c in run.text)
        return sum(glyph_width(code) * style.size or style.size / 8 for code in codes)
    return text_width(run.text, style.size, bold=style.bold, italic=style.italic)


def use(code: str, x: int, y: int, scale: float = 1) -> str:
    """A glyph with its origin at a point; scale 1 is the staff's own size."""
    if abs(scale - 1) < 0.005:
        return f'<use href="#m{code}" x="{x}" y="{y}"/>'
    return f'<use href="#m{code}" transform="translate({x} {y}) scale({scale:.3g})"/>'


def _text(x: int, y: int, runs: list[Run], anchor: str, length: int = 0) -> str:
    first = runs[0].style
    end = f' text-anchor="{anchor}"' if anchor else ""
    fit = f' textLength="{length}"' if length else ""
    inner = "".join(
        escape(run.text, quote=False)
        if run.style == first
        else f"<tspan{_difference(first, run.style)}>{escape(run.text, quote=False)}</tspan>"
        for run in runs
    )
    return f'<text x="{x}" y="{y}"{first.attributes}{end}{fit}>{inner}</text>'


def _difference(first: Style, other: Style) -> str:
    size = "" if first.size == other.size else f' font-size="{other.size}"'
    weight = "" if first.bold == other.bold else f' font-weight="{_word(other.bold, "bold")}"'
    slope = "" if first.italic == other.italic else f' font-style="{_word(other.italic, "italic")}"'
    return size + weight + slope


def _word(is_so: bool, word: str) -> str:
    return word if is_so else "normal"
