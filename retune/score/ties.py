"""Ties: noteheads joined into the notes that are sung.

Conventions
-----------
* A tie joins two noteheads of one part that abut as played and have one key number, however
  they are spelled and whichever voice they stand in; the own voice comes first.
* One flag is enough, at the first notehead or at the second, where the two stand next to each
  other in the score; across a repeat or a jump both must be flagged.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from itertools import groupby

from retune.score.model import Note
from retune.written import WrittenNote


@dataclass(frozen=True, slots=True)
class Notehead:
    """A written note at its place in the piece as played.

    `step` is the bar as played, `bar` the bar as written.
    """

    line: int
    onset: Fraction
    written: WrittenNote
    step: int
    bar: int
    velocity: int = 80
    lyric: str = ""

    @property
    def end(self) -> Fraction:
        """Where the notehead stops."""
        return self.onset + self.written.duration


@dataclass(slots=True)
class _Chain:
    """Noteheads joined so far."""

    heads: list[Notehead]
    end: Fraction
    line: int = field(init=False)

    def __post_init__(self) -> None:
        self.line = self.heads[0].line

    def note(self) -> Note:
        first = self.heads[0]
        marks = first.written.marks
        if len(self.heads) > 1:
            marks = marks.union(*(head.written.marks for head in self.heads[1:]))
        return Note(
            part=first.line,
            onset=first.onset,
            duration=self.end - first.onset,
            pitch=first.written.pitch,
            velocity=first.velocity,
            lyric=first.lyric,
            marks=marks,
            sources=tuple(head.written.source for head in self.heads if head.written.source),
        )


@dataclass(frozen=True, slots=True)
class Joined:
    """Notes of a part, and the noteheads whose tie leads nowhere or comes from nowhere."""

    notes: tuple[Note, ...]
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
        joiner.add(list(together))
    return joiner.result()


class _Joiner:
    def __init__(self, in_a_row: Callable[[int, int], bool]) -> None:
        self._in_a_row = in_a_row
        self._chains: list[_Chain] = []
        self._latest: dict[tuple[int, int], _Chain] = {}
        self._open: dict[int, list[_Chain]] = {}
        self._joins: set[tuple[int, Fraction]] = set()

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

    def _tied(self, chain: _Chain, head: Notehead) -> bool:
        before = chain.heads[-1]
        start, stop = before.written.tie_start, head.written.tie_stop
        if start and stop:
            return True
        return (start or stop) and self._in_a_row(before.step, head.step)

    def _crossing(self, head: Notehead) -> _Chain | None:
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
        chain = _Chain([head], head.end)
        self._chains.append(chain)
        self._latest[(head.line, head.written.pitch.key)] = chain
        if head.written.tie_start:
            self._open.setdefault(head.written.pitch.key, []).append(chain)

    def _extend(self, chain: _Chain, head: Notehead) -> None:
        key = head.written.pitch.key
        self._joins.add((key, head.onset))
        chain.heads.append(head)
        chain.end = head.end
        still_open = [other for other in self._open.get(key, ()) if other is not chain]
        self._open[key] = [*still_open, chain] if head.written.tie_start else still_open

    def result(self) -> Joined:
        loose_starts, loose_stops = [], []
        for chain in self._chains:
            first, last = chain.heads[0].written, chain.heads[-1].written
            if last.tie_start and (last.pitch.key, chain.end) not in self._joins:
                loose_starts.append(chain.heads[-1])
            if first.tie_stop and (first.pitch.key, chain.heads[0].onset) not in self._joins:
                loose_stops.append(chain.heads[0])
        notes = tuple(chain.note() for chain in self._chains)
        return Joined(notes, tuple(loose_starts), tuple(loose_stops))
