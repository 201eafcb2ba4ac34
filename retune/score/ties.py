"""Ties: noteheads joined into the notes that are sung.

Conventions
-----------
* Times are whole ticks of one `Grid`.
* A tie joins two noteheads of one part that abut as played and have one key number, however
  they are spelled and whichever voice they stand in; the own voice comes first.
* One flag is enough, at the first notehead or at the second, where the two stand next to each
  other in the score; across a repeat or a jump both must be flagged.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field
from itertools import groupby

from retune.score.grid import Grid
from retune.score.model import Note
from retune.written import WrittenNote


@dataclass(frozen=True, slots=True)
class Notehead:
    """A written note at its place in the piece as played, from tick `onset` to tick `end`.

    `step` is the bar as played, `bar` the bar as written.
    """

    line: int
    onset: int
    end: int
    written: WrittenNote
    step: int = 0
    bar: int = 0
    velocity: int = 80
    lyric: str = ""


@dataclass(slots=True)
class Chain:
    """Noteheads joined into one note; grows while ties are followed."""

    heads: list[Notehead]
    end: int
    line: int = field(init=False)
    onset: int = field(init=False)
    key: int = field(init=False)

    def __post_init__(self) -> None:
        first = self.heads[0]
        self.line, self.onset, self.key = first.line, first.onset, first.written.pitch.key

    def note(self, grid: Grid) -> Note:
        """The chain as one note."""
        first = self.heads[0]
        marks = first.written.marks
        if len(self.heads) > 1:
            marks = marks.union(*(head.written.marks for head in self.heads[1:]))
        return Note(
            part=self.line,
            onset=grid.quarters(self.onset),
            duration=grid.quarters(self.end - self.onset),
            pitch=first.written.pitch,
            velocity=first.velocity,
            lyric=first.lyric,
            marks=marks,
            sources=tuple(head.written.source for head in self.heads if head.written.source),
        )


@dataclass(frozen=True, slots=True)
class Joined:
    """Notes of a part by onset, and noteheads whose tie leads or comes from nowhere."""

    chains: tuple[Chain, ...]
    loose_starts: tuple[Notehead, ...] = ()
    loose_stops: tuple[Notehead, ...] = ()


def join_ties(heads: Sequence[Notehead], in_a_row: Callable[[int, int], bool]) -> Joined:
    """Join the tied noteheads of one written part.

    Parameters
    ----------
    heads : sequence of Notehead
        Of all lines of the part, sorted by onset; no grace notes.
    in_a_row : callable
        Whether two steps follow each other in the score as they do when played.
    """
    joiner = _Joiner(in_a_row)
    for _, together in groupby(heads, key=lambda head: head.onset):
        joiner.add(together)
    return joiner.result()


class _Joiner:
    def __init__(self, in_a_row: Callable[[int, int], bool]) -> None:
        self._in_a_row = in_a_row
        self._chains: list[Chain] = []
        self._latest: dict[tuple[int, int], Chain] = {}
        self._open: dict[int, list[Chain]] = {}
        self._joins: set[tuple[int, int]] = set()

    def add(self, together: Iterable[Notehead]) -> None:
        """Add the noteheads of one onset: first ties in their own line, then across lines."""
        waiting = []
        for head in together:
            chain = self._latest.get((head.line, head.written.pitch.key))
            if chain is not None and chain.end == head.onset and self._tied(chain, head):
                self._extend(chain, head)
            else:
                waiting.append(head)
        for head in waiting:
            chain = self._crossing(head) if head.written.tie_stop else None
            if chain is not None:
                self._extend(chain, head)
            else:
                self._begin(head)

    def _tied(self, chain: Chain, head: Notehead) -> bool:
        before = chain.heads[-1]
        start, stop = before.written.tie_start, head.written.tie_stop
        if start and stop:
            return True
        return (start or stop) and self._in_a_row(before.step, head.step)

    def _crossing(self, head: Notehead) -> Chain | None:
        """An open tie of another line that ends here."""
        return next(
            (
                chain
                for chain in self._open.get(head.written.pitch.key, ())
                if chain.end == head.onset and chain.line != head.line
            ),
            None,
        )

    def _begin(self, head: Notehead) -> None:
        chain = Chain([head], head.end)
        self._chains.append(chain)
        self._latest[(chain.line, chain.key)] = chain
        if head.written.tie_start:
            self._open.setdefault(chain.key, []).append(chain)

    def _extend(self, chain: Chain, head: Notehead) -> None:
        self._joins.add((chain.key, head.onset))
        chain.heads.append(head)
        chain.end = head.end
        still_open = [other for other in self._open.get(chain.key, ()) if other is not chain]
        self._open[chain.key] = [*still_open, chain] if head.written.tie_start else still_open

    def result(self) -> Joined:
        """All chains, and the ends that no tie took up."""
        loose_starts, loose_stops = [], []
        for chain in self._chains:
            first, last = chain.heads[0], chain.heads[-1]
            if last.written.tie_start and (chain.key, chain.end) not in self._joins:
                loose_starts.append(last)
            if first.written.tie_stop and (chain.key, chain.onset) not in self._joins:
                loose_stops.append(first)
        return Joined(tuple(self._chains), tuple(loose_starts), tuple(loose_stops))


def without_overlaps(chains: Iterable[Chain]) -> list[Chain]:
    """A line's chains, by onset, without two of one key that sound at once.

    Where a key is struck again while it sounds, the first note ends there and the second one
    lasts as long as either; two that begin together become one.
    """
    result: list[Chain] = []
    latest: dict[int, Chain] = {}
    for chain in chains:
        before = latest.get(chain.key)
        if before is not None and before.end > chain.onset:
            end = max(before.end, chain.end)
            if before.onset == chain.onset:
                before.end = end
                before.heads += chain.heads
                continue
            before.end, chain.end = chain.onset, end
        latest[chain.key] = chain
        result.append(chain)
    return result
