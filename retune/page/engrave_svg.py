"""One engraved system made small and plain: what the page needs of it, in few bytes.

Kept are groups for bars (`data-bar`, the written bar's index), staves and notes (`data-note`);
everything else of the engraver's grouping goes. Straight lines become filled shapes, glyphs are
shared by the whole page, no element has an id, a style or a script.

Conventions
-----------
* Lengths are the engraver's: 180 to a staff space, y downwards.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from html import escape

from retune.adapters.engraving_font import glyph_outline
from retune.adapters.engraving_markup import SVG, Node, svg_tree
from retune.page.annotate import CENTS_VERSE
from retune.page.engrave_labels import is_small
from retune.page.engrave_text import Style, drawn_text, runs_of, style_of, use

CENTS_SIZE = 320
HEAD_WIDTH = 226

_DROPPED = re.compile(
    r"placeholder|bounding-box|pageMilestone|MilestoneEnd|(?<!ending )systemMilestone", re.I
)
_LINE = re.compile(r"M(-?\d+) (-?\d+) L(-?\d+) (-?\d+)$")
_USE = re.compile(r"translate\((-?\d+), (-?\d+)\) scale\((-?[\d.]+), (-?[\d.]+)\)")
_NUMBER = re.compile(r"-?\d+(?:\.\d+)?")
_GLYPH_SCALE = 0.72
_KEPT = ("transform", "stroke-dasharray", "stroke-linecap", "stroke-linejoin", "opacity")


@dataclass(slots=True)
class SystemDrawing:
    """A system as it is being drawn: its markup, and where things are in it.

    `noteheads` maps names to the left edge and height of their heads, `bars` the index of a
    written bar to its left and right edge.
    """

    width: int
    top: float = 0
    bottom: float = 0
    markup: list[str] = field(default_factory=list)
    glyphs: dict[str, str] = field(default_factory=dict)
    noteheads: dict[str, tuple[int, int]] = field(default_factory=dict)
    bars: dict[int, tuple[int, int]] = field(default_factory=dict)

    def reach(self, *heights: float) -> None:
        """Make the picture as high as what is drawn."""
        self.top = min(self.top, *heights)
        self.bottom = max(self.bottom, *heights)


def system_drawing(svg: str) -> SystemDrawing:
    """A system of the engraver, drawn again."""
    root = svg_tree(svg)
    page = root.find(f"{SVG}svg")
    assert page is not None, "the engraver draws inside one inner picture"
    _, _, width, _ = (int(float(n)) for n in page.get("viewBox", "").split())
    drawing = SystemDrawing(width)
    for glyph in root.iterchildren(f"{SVG}defs"):
        for one in glyph:
            path = one.find(f"{SVG}path")
            if path is not None:
                drawing.glyphs[one.get("id", "").partition("-")[0]] = path.get("d", "")
    _Drawer(drawing).children(page, "")
    return drawing


class _Drawer:
    """Walks the engraver's tree and writes the small one."""

    def __init__(self, drawing: SystemDrawing) -> None:
        self._drawing = drawing
        self._out = drawing.markup
        self._bar: int | None = None

    def children(self, element: Node, kind: str) -> None:
        """Draw all that is in an element of a class."""
        for child in element:
            self.draw(child, kind)

    def draw(self, element: Node, kind: str) -> None:
        tag = element.tag.removeprefix(SVG)
        if tag == "g":
            self._group(element, kind)
        elif tag in _SHAPES:
            self._out.extend(_SHAPES[tag](self, element, kind))

    # --- groups ---

    def _group(self, element: Node, kind: str) -> None:
        name = element.get("class", "")
        if _DROPPED.search(name):
            return
        kind = name.partition(" ")[0] or kind
        if kind == "measure":
            self._measure(element)
        elif kind == "staff":
            self._within('<g class="staff">', element, kind)
        elif kind in ("note", "chord"):
            self._note(element, kind)
        elif kind == "verse" and int(element.get("data-n", "1") or 1) >= CENTS_VERSE:
            self._out.extend(self._cents(element))
        elif kind == "verse":
            self._within('<g class="verse">', element, kind)
        elif element.get("transform", "") not in ("", "translate(0, 0)"):
            self._within(f'<g transform="{escape(element.get("transform", ""))}">', element, kind)
        else:
            self.children(element, kind)

    def _within(self, opening: str, element: Node, kind: str) -> None:
        """Draw a group, unless nothing is in it."""
        start = len(self._out)
        self._out.append(opening)
        self.children(element, kind)
        if len(self._out) == start + 1:
            self._out.pop()
        else:
            self._out.append("</g>")

    def _measure(self, element: Node) -> None:
        name = element.get("id", "")
        self._bar = int(name[1:]) if re.fullmatch(r"b\d+", name) else None
        data = "" if self._bar is None else f' data-bar="{self._bar}"'
        self._within(f'<g class="measure"{data}>', element, "measure")

    def _note(self, element: Node, kind: str) -> None:
        """A note; its words stand beside it, so that its box is that of its sign."""
        verses = [child for child in element if child.get("class", "").startswith("verse")]
        for verse in verses:
            element.remove(verse)
        name = element.get("id", "")
        known = kind == "note" and re.fullmatch(r"n\d+", name)
        if known:
            self._find_head(element, name)
        opening = f'<g class="note" data-note="{name}">' if known else f'<g class="{kind}">'
        if known:
            self._within(opening, element, kind)
        else:
            self.children(element, kind)
        # The labels of a chord need its heads, which are found by now.
        names = [name] if known else [n.get("id", "") for n in element.iter() if _is_note(n)]
        for verse in verses:
            verse.set("heads", " ".join(names))
            self._group(verse, kind)

    def _find_head(self, element: Node, name: str) -> None:
        for used in element.iter(f"{SVG}use"):
            parent = used.getparent()
            placed = _USE.match(used.get("transform", ""))
            if placed and parent is not None and parent.get("class", "") == "notehead":
                self._drawing.noteheads[name] = (int(placed[1]), int(placed[2]))
                return

    # --- cents ---

    def _cents(self, verse: Node) -> Iterator[str]:
        """A label under or over its notehead: centred if it is one value, else from its left."""
        text = verse.find(f".//{SVG}text")
        names = verse.get("heads", "").split()
        if text is None or not names:
            return
        said = "".join(run.text for run in runs_of(text, Style()))
        x = min(
            (self._drawing.noteheads[n][0] for n in names if n in self._drawing.noteheads),
            default=int(text.get("x", "")),
        )
        y = int(text.get("y", ""))
        single = "›" not in said
        anchor = ' text-anchor="middle"' if single else ""
        self._drawing.reach(y - CENTS_SIZE, y + CENTS_SIZE / 4)
        small = " small" if is_small(said) else ""
        yield (
            f'<text class="cents{small}" x="{x + HEAD_WIDTH // 2 if single else x - 60}" y="{y}"'
            f' font-size="{CENTS_SIZE}"{anchor}>{escape(said, quote=False)}</text>'
        )

    # --- shapes ---

    def _use(self, element: Node, kind: str) -> Iterator[str]:
        placed = _USE.match(element.get("transform", ""))
        if placed is None:
            return
        x, y, scale = int(placed[1]), int(placed[2]), float(placed[3])
        high = 650 if kind == "clef" else 320
        self._drawing.reach(y - high, y + high / 1.5)
        yield use(element.get("href", "").lstrip("#").partition("-")[0], x, y, scale / _GLYPH_SCALE)

    def _text(self, element: Node, kind: str) -> Iterator[str]:
        runs = list(runs_of(element, style_of(kind)))
        for run in runs:
            if run.place:
                self._drawing.reach(
                    run.place[1] - run.style.size, run.place[1] + run.style.size / 3
                )
        if runs:
            used: set[str] = set()
            yield from drawn_text(runs, element.get("text-anchor", ""), used)
            for code in used:
                self._drawing.glyphs.setdefault(code, glyph_outline(code))

    def _path(self, element: Node, kind: str) -> Iterator[str]:
        d = element.get("d", "")
        self._drawing.reach(*_heights(d))
        line = _LINE.match(d)
        if line is None or element.get("stroke-dasharray", ""):
            yield f'<path d="{_short(d)}"{_drawn(element, closed=line is None)}/>'
            return
        x1, y1, x2, y2 = (int(n) for n in line.groups())
        width = round(float(element.get("stroke-width", "1")))
        if kind == "staff" and y1 == y2 and self._bar is not None:
            left, right = self._drawing.bars.get(self._bar, (x1, x2))
            self._drawing.bars[self._bar] = (min(left, x1), max(right, x2))
        if x1 != x2 and y1 != y2:
            yield f'<path d="M{x1} {y1}L{x2} {y2}"{_stroke(element)}/>'
            return
        half = width // 2
        shape = (
            f"M{min(x1, x2)} {y1 - half}h{abs(x2 - x1)}v{width}h{-abs(x2 - x1)}z"
            if y1 == y2
            else f"M{x1 - half} {min(y1, y2)}h{width}v{abs(y2 - y1)}h{-width}z"
        )
        last = self._out[-1] if self._out else ""
        if (
            kind in ("staff", "ledgerLines", "barLine")
            and last.startswith('<path d="M')
            and _straight(last)
        ):
            self._out[-1] = f'{last[:-3]}{shape}"/>'
        else:
            yield f'<path d="{shape}"/>'

    def _rect(self, element: Node, kind: str) -> Iterator[str]:
        x, y, width, height = (element.get(n, "") for n in ("x", "y", "width", "height"))
        self._drawing.reach(float(y), float(y) + float(height))
        hollow = element.get("fill-opacity", "") == "0" or element.get("fill", "") == "none"
        look = _stroke(element) if hollow else ""
        if float(width) > 0 and float(height) > 0:
            yield f'<rect x="{x}" y="{y}" width="{width}" height="{height}"{look}/>'

    def _points(self, element: Node, kind: str) -> Iterator[str]:
        points = element.get("points", "").strip()
        self._drawing.reach(*(float(n) for n in _NUMBER.findall(points)[1::2]))
        if element.tag == f"{SVG}polygon":
            yield f'<path d="M{points.replace(",", " ")}z"/>'
        else:
            yield f'<polyline points="{points}"{_drawn(element, closed=False)}/>'

    def _ellipse(self, element: Node, kind: str) -> Iterator[str]:
        x, y, r, other = (element.get(n, "") for n in ("cx", "cy", "rx", "ry"))
        if r == other:
            yield f'<circle cx="{x}" cy="{y}" r="{r}"/>'
        else:
            yield f'<ellipse cx="{x}" cy="{y}" rx="{r}" ry="{other}"/>'


_SHAPES = {
    "use": _Drawer._use,
    "text": _Drawer._text,
    "path": _Drawer._path,
    "rect": _Drawer._rect,
    "polygon": _Drawer._points,
    "polyline": _Drawer._points,
    "ellipse": _Drawer._ellipse,
}


def _is_note(element: Node) -> bool:
    return element.get("class", "").partition(" ")[0] == "note"


def _straight(path: str) -> bool:
    return not re.search(r"[CcQqLl]| [a-z-]+=", path[6:])


def _heights(d: str) -> list[float]:
    """The y of every point of an absolute path."""
    return [float(n) for n in _NUMBER.findall(d)[1::2]]


def _short(d: str) -> str:
    return d.replace(",", " ").replace(" C", "C").replace(" L", "L")


def _drawn(element: Node, closed: bool) -> str:
    """Attributes of a shape that is not a plain filled one."""
    kept = "".join(f' {n}="{escape(element.get(n, ""))}"' for n in _KEPT if element.get(n, ""))
    if closed and element.get("fill", "") != "none" and not element.get("stroke-dasharray", ""):
        return kept.partition(" stroke")[0]
    return _stroke(element) + kept


def _stroke(element: Node) -> str:
    width = element.get("stroke-width", "20")
    return f' fill="none" stroke="currentColor" stroke-width="{escape(width)}"'
