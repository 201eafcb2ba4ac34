"""The piece chord by chord as lines of text for a given width.

A row is one chord: bar, beat, chord symbol, then for each part its pitch and cents (absolute,
against equal temperament at the reference pitch; + is sharp), and the ratio where there is
room. The cents of non-chord tones stand in brackets.
"""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction

import click

from retune.harmony.model import Role
from retune.harmony.symbols import doubtable_symbol
from retune.score.model import Part
from retune.tuning.model import Segment, TunedNote, TunedScore
from retune.tuning.sounding import sung_by_chord

_BAR, _BEAT, _CHORD = 5, 6, 8
_NUMBER = 3
"""Longest last word taken for a number: 2, II, III."""

_MARGIN = 1 + _BAR + _BEAT + _CHORD


@dataclass(frozen=True, slots=True)
class Cell:
    """What one part sings in one chord."""

    pitch: str
    cents: str
    ratio: str
    chord_tone: bool


@dataclass(frozen=True, slots=True)
class Layout:
    """How wide a part's cell is, what it shows, and how many fit side by side."""

    cell: int
    pitch: bool
    ratio: bool
    across: int


def cents_text(cents: float) -> str:
    """Whole cents with a sign; 0 without.

    >>> [cents_text(c) for c in (-13.7, -0.2, 1.955)]
    ['-14', '0', '+2']
    """
    whole = round(cents)
    return f"{whole:+d}" if whole else "0"


def layout_for(parts: int, columns: int) -> Layout:
    """The fullest layout that fits: pitch, cents and ratio; pitch and cents; cents alone."""
    room = columns - _MARGIN
    for cell, pitch, ratio in ((16, True, True), (10, True, False), (6, False, False)):
        if parts * cell <= room:
            return Layout(cell, pitch, ratio, max(parts, 1))
    return Layout(10, True, False, max(room // 10, 1))


def _cell(note: TunedNote, segment: Segment) -> Cell:
    ratio = segment.ratio
    return Cell(
        note.note.pitch.name,
        cents_text(segment.cents),
        f"{ratio.numerator}/{ratio.denominator}" if ratio else "",
        segment.role is Role.CHORD_TONE,
    )


def _cell_text(cell: Cell | None, layout: Layout) -> str:
    if cell is None:
        return f"{'-':>{7 if layout.pitch else 4}}"
    cents = f"{cell.cents} " if cell.chord_tone else f"({cell.cents})"
    text = f"{cell.pitch:<4}{cents:>5}" if layout.pitch else f"{cents:>5}"
    return f"{text}{cell.ratio}" if layout.ratio else text


def _cells(row: dict[int, tuple[TunedNote, Segment]], parts: Sequence[int], layout: Layout) -> str:
    cells = (_cell(*row[part]) if part in row else None for part in parts)
    return "".join(f"{_cell_text(cell, layout):<{layout.cell}}" for cell in cells).rstrip()


def _short(part: Part, room: int) -> str:
    """A part's name in a room; its number stays, so that Tenor 2 becomes Ten 2."""
    if len(part.name) <= room:
        return part.name
    if 0 < len(part.abbreviation) <= room:
        return part.abbreviation
    *words, last = part.name.split() or [""]
    if words and len(last) <= _NUMBER:
        return f"{' '.join(words)[: room - len(last) - 1].rstrip()} {last}"
    return part.name[:room]


def _heading(tuned: TunedScore, parts: Sequence[int], layout: Layout, first: bool) -> str:
    left = f" {'bar':<{_BAR}}{'beat':<{_BEAT}}{'chord':<{_CHORD}}" if first else " " * _MARGIN
    names = (f"{_short(tuned.score.parts[p], layout.cell - 1):<{layout.cell}}" for p in parts)
    return click.style((left + "".join(names)).rstrip(), bold=True)


def table(tuned: TunedScore, columns: int, wanted: range | None = None) -> Iterator[str]:
    """The chord table in lines no wider than `columns`.

    `wanted` limits it to chords that begin in these bars, counted as played from 0.
    """
    score, parts = tuned.score, range(len(tuned.score.parts))
    layout = layout_for(len(parts), columns)
    groups = [parts[i : i + layout.across] for i in range(0, len(parts), layout.across)]
    for index, group in enumerate(groups):
        yield _heading(tuned, group, layout, index == 0)
    shown_run, doubts, others = 1, False, False
    for chord, row in zip(tuned.harmony.chords, sung_by_chord(tuned), strict=True):
        bar = score.bar_at(chord.onset)
        if chord.root is None or (wanted is not None and bar.index not in wanted):
            continue
        if bar.run != shown_run:
            shown_run = bar.run
            yield click.style(f" time {bar.run} through", dim=True)
        doubts |= chord.doubtful
        others |= any(segment.role is not Role.CHORD_TONE for _, segment in row.values())
        beat = score.beat_at(chord.onset)
        left = f" {bar.number:<{_BAR}}{beat_text(beat):<{_BEAT}}"
        symbol = click.style(f"{doubtable_symbol(chord):<{_CHORD}}", bold=True)
        for index, group in enumerate(groups):
            yield (left + symbol if index == 0 else " " * _MARGIN) + _cells(row, group, layout)
    yield from _legend(doubts, others, columns)


def _legend(doubts: bool, others: bool, columns: int) -> list[str]:
    words = ["Cents are against equal temperament at the reference pitch, + is higher."]
    if others:
        words.append("In brackets: not a tone of the chord.")
    if doubts:
        words.append("A question mark: the root is in doubt.")
    return ["", *(f" {line}" for line in textwrap.wrap(" ".join(words), columns - 1))]


def beat_text(beat: Fraction) -> str:
    """A beat as a musician writes it, to two places where its fraction is long.

    >>> [beat_text(Fraction(n, 192)) for n in (192, 288, 319)]
    ['1', '1 1/2', '1.66']
    """
    whole, rest = divmod(beat, 1)
    text = f"{whole} {rest}" if rest else str(whole)
    return text if len(text) < _BEAT else f"{float(beat):.2f}"
