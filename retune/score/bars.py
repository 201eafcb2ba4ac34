"""Bars of the whole score: the bars of the parts, aligned by their order.

Conventions
-----------
* Times are `Fraction` quarter notes.
* A bar is as long as the shortest part that fills it at all, and at least as long as the last
  note in it reaches. Rests longer than the bar, common in open repertoire, are cut.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Hashable, Iterable, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import zip_longest
from typing import TypeVar

from retune.errors import Weight
from retune.score.ledger import Ledger
from retune.written import Mark, MarkKind, WrittenBar, WrittenPart, WrittenScore

T = TypeVar("T", bound=Hashable)

DEFAULT_METRE = (4, 4)

JUMP_KINDS = frozenset(
    {
        MarkKind.SEGNO,
        MarkKind.CODA,
        MarkKind.FINE,
        MarkKind.DA_CAPO,
        MarkKind.DAL_SEGNO,
        MarkKind.TO_CODA,
    }
)


@dataclass(frozen=True, slots=True)
class Frame:
    """One bar of the score as written, all parts together.

    `begins` is where in its metre the bar starts, in quarter notes; `jumps` holds segno, coda,
    Fine, D.C. and the like of all parts.
    """

    index: int
    number: str
    length: Fraction
    metre: tuple[int, int] = DEFAULT_METRE
    key: tuple[int, str | None] = (0, None)
    begins: Fraction = Fraction(0)
    rehearsal: str = ""
    implicit: bool = False
    repeat_start: bool = False
    repeat_end: int = 0
    ending: tuple[int, ...] = ()
    ending_stop: bool = False
    jumps: tuple[Mark, ...] = ()

    @property
    def full(self) -> Fraction:
        """How long the time signature says the bar is."""
        return Fraction(4 * self.metre[0], self.metre[1])

    def beat(self, onset: Fraction) -> Fraction:
        """The beat at an onset of this bar, from 1."""
        return 1 + (onset + self.begins) * self.metre[1] / 4


def align(written: WrittenScore, ledger: Ledger) -> tuple[Frame, ...]:
    """The bars of a score, from the bars of its parts; odd lengths go to the ledger."""
    count = max((len(part.bars) for part in written.parts), default=0)
    frames: list[Frame] = []
    metre = DEFAULT_METRE
    key: tuple[int, str | None] = (0, None)
    for index in range(count):
        bars = [part.bars[index] for part in written.parts if index < len(part.bars)]
        metre = _agreed((bar.metre for bar in bars if _plausible(bar.metre)), metre)
        key = _agreed((bar.key for bar in bars if bar.key is not None), key)
        frames.append(_frame(index, bars, metre, key))
    measured = any(bar.metre for part in written.parts for bar in part.bars)
    placed = tuple(_with_beginnings(frames)) if measured else tuple(frames)
    if measured:
        _report_filling(placed, ledger)
    for part in written.parts:
        _report_part(part, placed, ledger)
    return placed


def _plausible(metre: tuple[int, int] | None) -> bool:
    return metre is not None and metre[0] > 0 and metre[1] > 0


def _agreed(values: Iterable[T | None], before: T) -> T:
    """What most parts say; the first of equals; what held before where none says anything."""
    found = Counter(value for value in values if value is not None).most_common(1)
    return found[0][0] if found else before


def _frame(
    index: int, bars: Sequence[WrittenBar], metre: tuple[int, int], key: tuple[int, str | None]
) -> Frame:
    rehearsals = (
        str(mark.value) for bar in bars for mark in bar.marks if mark.kind is MarkKind.REHEARSAL
    )
    return Frame(
        index=index,
        number=next((bar.number for bar in bars if bar.number), str(index + 1)),
        length=_length(bars) or Fraction(4 * metre[0], metre[1]),
        metre=metre,
        key=key,
        rehearsal=next(rehearsals, ""),
        implicit=any(bar.implicit for bar in bars),
        repeat_start=any(bar.repeat_start for bar in bars),
        repeat_end=max(bar.repeat_end for bar in bars),
        ending=next((bar.ending for bar in bars if bar.ending), ()),
        ending_stop=any(bar.ending_stop for bar in bars),
        jumps=_jumps(bars),
    )


def _length(bars: Sequence[WrittenBar]) -> Fraction:
    lengths = {bar.length for bar in bars if bar.length > 0}
    if len(lengths) == 1:
        return lengths.pop()
    return max([min(lengths, default=Fraction(0)), *map(last_note_end, bars)])


def last_note_end(bar: WrittenBar) -> Fraction:
    """Where the last note of a bar stops, 0 for a bar without notes."""
    return max((note.onset + note.duration for note in bar.notes), default=Fraction(0))


def _jumps(bars: Sequence[WrittenBar]) -> tuple[Mark, ...]:
    """Jump signs of all parts, each kind once; the one that says how it ends wins."""
    signs: dict[MarkKind, Mark] = {}
    for sign in (mark for bar in bars for mark in bar.marks if mark.kind in JUMP_KINDS):
        known = signs.get(sign.kind)
        if known is None or (sign.value and not known.value):
            signs[sign.kind] = sign
    return tuple(signs.values())


def _with_beginnings(frames: Sequence[Frame]) -> Iterable[Frame]:
    """Frames with `begins` set for pick-ups and for the second half of split bars."""
    done: list[Frame] = []
    leading: Frame | None = None
    for frame in frames:
        before = done[-1] if done else None
        if frame.ending and before is not None:
            # Every ending follows the bar that stands before the first of them.
            if leading is None or not (before.ending or before.ending_stop or before.repeat_end):
                leading = before
            before = leading
        done.append(replace(frame, begins=_begins(frame, before)))
    return done


def _begins(frame: Frame, before: Frame | None) -> Fraction:
    missing = frame.full - frame.length
    if missing <= 0:
        return Fraction(0)
    if before is None:
        return missing
    if before.metre == frame.metre and before.length < before.full:
        reached = (before.begins + before.length) % frame.full
        if 0 < reached <= missing:
            return reached
    if frame.implicit or frame.repeat_start or before.repeat_end:
        return missing
    return Fraction(0)


def _report_filling(frames: Sequence[Frame], ledger: Ledger) -> None:
    for frame, after in zip_longest(frames, frames[1:]):
        if frame.length > frame.full:
            ledger.add(
                Weight.DOUBT, "bar longer than its time signature; kept as long", bar=frame.index
            )
        elif frame.length < frame.full and not _explained(frame, after):
            ledger.add(
                Weight.DOUBT, "bar shorter than its time signature; kept short", bar=frame.index
            )


def _explained(frame: Frame, after: Frame | None) -> bool:
    """Whether a short bar is a pick-up, one half of a split bar, or the end of a section."""
    if frame.begins or frame.implicit or after is None or after.implicit:
        return True
    if frame.repeat_end or after.repeat_start or frame.ending_stop:
        return True
    return after.begins == frame.begins + frame.length


def _report_part(part: WrittenPart, frames: Sequence[Frame], ledger: Ledger) -> None:
    name = part.name or part.id
    if len(part.bars) < len(frames):
        what = "has fewer bars than the score; silent from here on"
        ledger.add(Weight.DOUBT, what, name, len(part.bars))
    for bar, frame in zip(part.bars, frames, strict=False):
        if bar.length > frame.length >= frame.full:
            ledger.add(Weight.NOTE, "rests longer than the bar were cut", name, frame.index)
        elif 0 < bar.length < frame.length:
            ledger.add(
                Weight.DOUBT, "bar too short in this part; filled with silence", name, frame.index
            )
