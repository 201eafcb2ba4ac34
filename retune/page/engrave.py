"""The score as pictures: one SVG a system, with cents at the notes and chords underneath.

Conventions
-----------
* Widths are CSS pixels of the screen that a picture is made for; its own unit is the
  engraver's, 180 to a staff space, and it scales to any size.
* Elements the page looks for: `g.note[data-note]` (names of `notehead_ids`),
  `g.measure[data-bar]` (index of the written bar), `g.chord[data-chord]` (index of the chord),
  `text.cents`, of class `small` where no value is over 5, `text.symbol`, `text.root`.
* No element has an id but the music glyphs, which `glyph_sheet` gives once for a page.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from html import escape

from retune.adapters.engraving import EngravingError, Sheet, drawn
from retune.errors import RetuneError
from retune.page.annotate import Annotated, annotated, notehead_ids
from retune.page.engrave_chords import appearances, chord_line
from retune.page.engrave_svg import SystemDrawing, system_drawing
from retune.page.engrave_text import GLYPH_SIZE
from retune.score.model import Transposition
from retune.tuning.model import TunedScore

__all__ = [
    "Engraved",
    "EngravingError",
    "Wish",
    "engraved",
    "engravings",
    "glyph_sheet",
    "notehead_ids",
]

NARROW = 600
"""Widths below this are phones: part names are abbreviated."""

_STAFF_SPACES = ((360, 5.9), (1000, 6.6), (1700, 10.4))
"""Height of a staff space in pixels at some widths, by looking at them."""

_ALONE = 1.25
"""How much larger a part by itself is."""

TEXT_FONT = "Times, 'Times New Roman', 'Liberation Serif', 'Nimbus Roman', serif"
CHORD_FONT = "Arial, Helvetica, 'Liberation Sans', sans-serif"
_MARGIN = 60
_CHORDS_BELOW = 150


@dataclass(frozen=True, slots=True)
class Wish:
    """A picture wanted: for a screen of `width` CSS pixels, of all parts or of one.

    `space` is the height of a staff space in pixels; 0 for one that suits the width.
    """

    width: int
    part: int | None = None
    space: float = 0


@dataclass(frozen=True, slots=True)
class Engraved:
    """A score for one width: a picture a system, and outlines of the music glyphs they use."""

    width: int
    systems: tuple[str, ...]
    part: int | None = None
    glyphs: dict[str, str] = field(default_factory=dict, repr=False)


def engraved(tuned: TunedScore, document: bytes, width: int, part: int | None = None) -> Engraved:
    """The score for one width; see `engravings`."""
    return engravings(tuned, document, (Wish(width, part),))[0]


def engravings(tuned: TunedScore, document: bytes, wishes: Sequence[Wish]) -> tuple[Engraved, ...]:
    """Pictures of a score, all drawn in one go.

    Parameters
    ----------
    document : bytes
        The MusicXML that the score was read from, plain or compressed.

    Raises
    ------
    EngravingError
        The document is no MusicXML, or the engraver cannot take it; `what` says why.
    """
    if tuned.score.format != "musicxml":
        raise EngravingError("only MusicXML can be engraved as it was written")
    move = interval_name(tuned.score.transposition)
    copies: dict[tuple[int | None, bool], Annotated] = {}
    sheets: list[Sheet] = []
    try:
        for wish in wishes:
            key = (wish.part, wish.width < NARROW)
            if key not in copies:
                copies[key] = annotated(tuned, document, *key)
            sheets.append(Sheet(copies[key].document, _units(wish), move))
    except EngravingError:
        raise
    except RetuneError as error:
        raise EngravingError(error.what, error.where, error.hint) from error
    drawings_by_wish = drawn(sheets)
    shown = appearances(tuned)
    found: list[Engraved] = []
    for wish, pages in zip(wishes, drawings_by_wish, strict=True):
        heads = copies[wish.part, wish.width < NARROW].heads
        drawings = [system_drawing(page) for page in pages]
        glyphs = {code: d for drawing in drawings for code, d in drawing.glyphs.items()}
        systems: list[str] = []
        for drawing in drawings:
            line, bottom = chord_line(tuned, shown, drawing, heads, drawing.bottom + _CHORDS_BELOW)
            systems.append(_picture(tuned, drawing, line, bottom))
        found.append(Engraved(wish.width, tuple(systems), wish.part, glyphs))
    return tuple(found)


def glyph_sheet(pictures: Iterable[Engraved]) -> str:
    """A hidden SVG with the outlines that pictures share.

    A page needs it once, outside what it replaces when it shows another engraving.
    """
    outlines = {code: d for picture in pictures for code, d in picture.glyphs.items()}
    scale = GLYPH_SIZE / 1000
    paths = "".join(
        f'<path id="m{code}" transform="scale({scale:g} -{scale:g})" d="{escape(outline)}"/>'
        for code, outline in sorted(outlines.items())
    )
    return (
        '<svg xmlns="http://www.w3.org/2000/svg" class="glyphs" width="0" height="0"'
        f' aria-hidden="true"><defs>{paths}</defs></svg>'
    )


def interval_name(move: Transposition) -> str:
    """An interval as the engraver takes it; empty for none.

    Its number follows from semitones and fifths together: seven fifths less seven octaves of
    four steps make the chromatic semitone.

    >>> [interval_name(Transposition(*m)) for m in ((0, 0), (2, 2), (-3, 3), (1, 7), (-12, 0))]
    ['', '+M2', '-m3', '+A1', '-P8']
    """
    if not move.semitones and not move.fifths:
        return ""
    # A fifth is 7 semitones and 4 steps, an octave 12 and 7.
    octaves = (move.semitones - 7 * move.fifths) // 12
    steps = 4 * move.fifths + 7 * octaves
    down = steps < 0 or (steps == 0 and move.semitones < 0)
    fifths = -move.fifths if down else move.fifths
    if -1 <= fifths <= 1:
        quality = "P"
    elif fifths > 0:
        quality = "M" if fifths <= 5 else "A"
    else:
        quality = "m" if fifths >= -5 else "d"
    return f"{'-' if down else '+'}{quality}{abs(steps) + 1}"


def _units(wish: Wish) -> int:
    """Width of a system in the engraver's page units, 18 to a staff space."""
    return round(18 * wish.width / staff_space(wish))


def staff_space(wish: Wish) -> float:
    """Height of a staff space in CSS pixels, in proportion between the widths looked at."""
    if wish.space:
        return wish.space
    points = list(_STAFF_SPACES)
    (x0, y0), (x1, y1) = points[:2] if wish.width <= points[1][0] else points[1:]
    width = min(max(wish.width, points[0][0]), points[-1][0])
    space = y0 + (y1 - y0) * (width - x0) / (x1 - x0)
    return space * (_ALONE if wish.part is not None else 1)


def _picture(tuned: TunedScore, drawing: SystemDrawing, line: list[str], bottom: float) -> str:
    top = round(drawing.top) - _MARGIN
    height = round(bottom) + _MARGIN - top
    numbers = {bar.written: bar.number for bar in reversed(tuned.score.bars)}
    shown = [numbers[bar] for bar in sorted(drawing.bars) if bar in numbers]
    label = f"Bars {shown[0]} to {shown[-1]}" if shown else "Score"
    chords = f'<g class="chords" font-family="{CHORD_FONT}">{"".join(line)}</g>' if line else ""
    return (
        '<svg xmlns="http://www.w3.org/2000/svg" class="engraving"'
        f' viewBox="-{_MARGIN} {top} {drawing.width + 2 * _MARGIN} {height}" role="group"'
        f' aria-label="{escape(label)}" fill="currentColor" font-family="{TEXT_FONT}">'
        f"{''.join(drawing.markup)}{chords}</svg>"
    )
