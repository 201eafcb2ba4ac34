"""The line of chords under a system: symbols, and under them the roots.

Conventions
-----------
* Lengths are the engraver's: 180 to a staff space, y downwards.
* A written bar shows the chords of its first pass. Symbols and roots that have no room are left
  out, the symbol first; a mark stays. Nothing is drawn over anything else.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from html import escape

from retune.harmony.symbols import doubtable_symbol, printed
from retune.page.engrave_labels import Head
from retune.page.engrave_svg import SystemDrawing
from retune.tuning.model import TunedScore

SYMBOL_SIZE = 430
ROOT_SIZE = 330
_GAP = 120
_NARROW, _WIDE = frozenset("ijl1()/,.'?I"), frozenset("mwMW")


@dataclass(frozen=True, slots=True)
class Appearance:
    """A chord in a written bar: where it first sounds there."""

    chord: int
    bar: int
    onset: Fraction


def appearances(tuned: TunedScore) -> tuple[Appearance, ...]:
    """The chords of the first pass of every written bar, in order of time.

    A chord that goes on into a bar stands there again only where the bar before it, as played,
    is a repetition and so shows other chords.
    """
    chords = [chord for chord in tuned.harmony.chords if chord.root is not None]
    onsets = [chord.onset for chord in chords]
    seen: set[int] = set()
    shown: list[Appearance] = []
    fresh = True
    for bar in tuned.score.bars:
        if bar.written in seen:
            fresh = False
            continue
        seen.add(bar.written)
        first = max(bisect_right(onsets, bar.onset) - 1, 0)
        for chord in chords[first:]:
            if chord.onset >= bar.end:
                break
            if chord.onset >= bar.onset or (not fresh and chord.end > bar.onset):
                shown.append(Appearance(chord.index, bar.written, max(chord.onset, bar.onset)))
        fresh = True
    return tuple(shown)


def chord_line(
    tuned: TunedScore,
    shown: Sequence[Appearance],
    drawing: SystemDrawing,
    heads: Mapping[str, Head],
    top: float,
) -> tuple[list[str], float]:
    """The line of one system, with its upper edge at `top`; also its lower edge."""
    here = [one for one in shown if one.bar in drawing.bars]
    if not here:
        return [], top
    places = _places(tuned, drawing, heads)
    edges = [_x(one.onset, places) for one in here]
    right = float(drawing.width)
    markup: list[str] = []
    for one, x, following in zip(here, edges, [*edges[1:], right + _GAP], strict=True):
        markup.extend(_chord(tuned, one.chord, x, following - x - _GAP, top))
    return markup, top + SYMBOL_SIZE + ROOT_SIZE * 1.5


def _chord(tuned: TunedScore, index: int, x: float, room: float, top: float) -> Iterator[str]:
    chord = tuned.harmony.chords[index]
    assert chord.root is not None, "silent chords have no appearance"
    symbol, root = printed(doubtable_symbol(chord)), printed(chord.root.name)
    left, baseline = round(x), round(top + SYMBOL_SIZE)
    width = estimated_width(symbol, SYMBOL_SIZE)
    doubt = " doubtful" if chord.doubtful else ""
    yield f'<g class="chord{doubt}" data-chord="{index}">'
    lower = round(baseline + ROOT_SIZE * 1.2)
    if width <= room:
        yield (
            f'<text class="symbol" x="{left}" y="{baseline}" font-size="{SYMBOL_SIZE}"'
            f' font-weight="bold">{escape(symbol, quote=False)}</text>'
        )
        if chord.doubtful:
            yield (
                f'<path class="doubt" d="M{left} {baseline + 70}h{round(width)}" fill="none"'
                ' stroke="currentColor" stroke-width="30" stroke-dasharray="30 60"/>'
            )
    if estimated_width(root, ROOT_SIZE) <= room:
        yield f'<text class="root" x="{left}" y="{lower}" font-size="{ROOT_SIZE}">{root}</text>'
    elif width > room:
        yield f'<circle class="mark" cx="{left + 60}" cy="{baseline - 120}" r="45"/>'
    yield "</g>"


def estimated_width(text: str, size: float) -> float:
    """A width that bold sans-serif type of any system stays within, or nearly.

    Ems by kind of letter, a little over those of common sans-serif fonts (our measurement).
    """
    ems = sum(0.4 if c in _NARROW else 0.92 if c in _WIDE else 0.68 for c in text)
    return size * ems


def _places(
    tuned: TunedScore, drawing: SystemDrawing, heads: Mapping[str, Head]
) -> list[tuple[Fraction, float]]:
    """Times and the left edges of what sounds then, in order; bar lines where nothing does."""
    found: dict[Fraction, float] = {}
    for name, (x, _) in drawing.noteheads.items():
        head = heads.get(name)
        if head is not None:
            found[head.onset] = min(x, found.get(head.onset, x))
    seen: set[int] = set()
    for bar in tuned.score.bars:
        if bar.written in drawing.bars and bar.written not in seen:
            left, right = drawing.bars[bar.written]
            found.setdefault(bar.onset, left + _GAP)
            found.setdefault(bar.end, right)
        seen.add(bar.written)
    return sorted(found.items())


def _x(onset: Fraction, places: Sequence[tuple[Fraction, float]]) -> float:
    """Where a time is in a system: at what begins then, else between its neighbours."""
    at = bisect_right(places, (onset, float("inf")))
    if at and places[at - 1][0] == onset:
        return places[at - 1][1]
    if at == 0 or at == len(places):
        return places[min(at, len(places) - 1)][1]
    (before, left), (after, right) = places[at - 1], places[at]
    return left + (right - left) * float((onset - before) / (after - before))
