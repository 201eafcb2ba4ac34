"""Bars laid over music that has none: bar lines from metres, notes cut where they cross one.

Conventions
-----------
* Onsets are `Fraction` quarter notes from the start, `BarLine.length` quarter notes.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import groupby

from retune.errors import LimitError, Place

DEFAULT_METRE = (4, 4)


@dataclass(frozen=True, slots=True)
class BarSpan:
    """One bar of the grid: its metre, whether that begins here, and whether the next cuts it."""

    onset: Fraction
    length: Fraction
    metre: tuple[int, int]
    changes: bool = False
    cut: bool = False

    @property
    def end(self) -> Fraction:
        """Onset of the next bar."""
        return self.onset + self.length


@dataclass(frozen=True, slots=True)
class Piece:
    """A note's stretch inside one bar; `onset` counts from the start of the bar."""

    bar: int
    onset: Fraction
    duration: Fraction
    first: bool
    last: bool


class BarGrid:
    """The bars of a piece, from its metres.

    Parameters
    ----------
    metres : mapping of onset to (beats, beat unit)
        Without one at 0 the piece starts in 4/4. A metre inside a bar cuts the bar short,
        unless it changes nothing.
    end : Fraction
        End of the music; the last bar is completed.
    most : int
        So many bars are accepted.

    Raises
    ------
    LimitError
        More than `most` bars.
    """

    def __init__(
        self, metres: Mapping[Fraction, tuple[int, int]], end: Fraction, most: int
    ) -> None:
        self.spans: list[BarSpan] = []
        for span in _spans(metres, end):
            if len(self.spans) >= most:
                raise LimitError(f"the MIDI file makes more than {most} bars")
            self.spans.append(span)
        self._rough_onsets = [float(span.onset) for span in self.spans]

    def index_at(self, onset: Fraction) -> int:
        """The bar at an onset; the last one for anything later."""
        # Comparing floats is ten times as fast, and rounding never changes their order.
        index = max(bisect_right(self._rough_onsets, float(onset)) - 1, 0)
        while self.spans[index].onset > onset:
            index -= 1
        return index

    def place(self, onset: Fraction, part: str | None = None) -> Place:
        """Bar and beat of an onset, for findings."""
        index = self.index_at(onset)
        span = self.spans[index]
        beat = 1 + (onset - span.onset) * span.metre[1] / 4
        return Place(part=part, bar=str(index + 1), beat=str(beat))

    def bars_of(self, onset: Fraction, end: Fraction) -> range:
        """The bars that a note sounds in."""
        last = self.index_at(end)
        return range(self.index_at(onset), last + (self.spans[last].onset < end))

    def cut(self, onset: Fraction, end: Fraction) -> Iterator[Piece]:
        """The pieces of a note, one in each bar it sounds in."""
        for index in self.bars_of(onset, end):
            span = self.spans[index]
            start, stop = max(onset, span.onset), min(end, span.end)
            yield Piece(index, start - span.onset, stop - start, start == onset, stop == end)


def _spans(metres: Mapping[Fraction, tuple[int, int]], end: Fraction) -> Iterator[BarSpan]:
    starts = list(_changes(metres))
    stops = [*(onset for onset, _ in starts[1:]), None]
    for (onset, metre), stop in zip(starts, stops, strict=True):
        length = Fraction(4 * metre[0], metre[1])
        changes = True
        while onset < (end if stop is None else min(stop, end)):
            room = length if stop is None else stop - onset
            yield BarSpan(onset, min(length, room), metre, changes, room < length)
            onset, changes = onset + length, False


def _changes(
    metres: Mapping[Fraction, tuple[int, int]],
) -> Iterator[tuple[Fraction, tuple[int, int]]]:
    """Metres in order of onset, each differing from the one before; the first at 0."""
    with_start = {Fraction(0): DEFAULT_METRE, **metres}
    for metre, same in groupby(sorted(with_start.items()), key=lambda item: item[1]):
        yield next(same)[0], metre


def rests_between(
    pieces: Sequence[Piece], grid: BarGrid
) -> dict[int, list[tuple[Fraction, Fraction]]]:
    """Onset and duration of every gap in one voice, by bar; `pieces` ascend in each bar."""
    reached: dict[int, Fraction] = {}
    gaps: dict[int, list[tuple[Fraction, Fraction]]] = {}

    def fill(bar: int, until: Fraction) -> None:
        start = reached.get(bar, Fraction(0))
        if start < until:
            gaps.setdefault(bar, []).append((start, until - start))

    for piece in pieces:
        fill(piece.bar, piece.onset)
        reached[piece.bar] = piece.onset + piece.duration
    for bar, span in enumerate(grid.spans):
        fill(bar, span.length)
    return gaps
