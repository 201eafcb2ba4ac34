"""One part: its bars read in order, then what only the whole part can settle."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import pairwise
from typing import TypeVar

from retune.adapters.xml import Element
from retune.errors import Weight
from retune.score.musicxml.attributes import read_attributes
from retune.score.musicxml.barlines import read_barline
from retune.score.musicxml.directions import read_direction, read_sound, settle_tempi
from retune.score.musicxml.draft import ZERO, BarDraft, PartState
from retune.score.musicxml.durations import read_length
from retune.score.musicxml.harmony import read_harmony
from retune.score.musicxml.hidden import settle_hidden
from retune.score.musicxml.identity import Identities
from retune.score.musicxml.jumps import settle_coda_signs, settle_jumps
from retune.score.musicxml.layout import BarSource, PartSource
from retune.score.musicxml.log import Log
from retune.score.musicxml.notes import read_note
from retune.written import MarkKind, WrittenBar, WrittenPart

_Value = TypeVar("_Value")


@dataclass(frozen=True, slots=True)
class PartReading:
    """A part, and its staves that both clef and transposition put an octave down."""

    part: WrittenPart
    doubly_lowered: frozenset[int]


def read_part(source: PartSource, identities: Identities, log: Log) -> PartReading:
    """Read one part of a score; parts must come in order, so that identities are steady."""
    part = PartState(source.heading, log, identities)
    bars: list[BarDraft] = []
    for index, bar_source in enumerate(source.bars):
        bars.append(_read_bar(bar_source, index, part))
    for left, right in pairwise(bars):
        _hand_over(left, right)
    settle_coda_signs(bars)
    return PartReading(_written(part, bars), frozenset(part.doubly_lowered))


def _read_bar(source: BarSource, index: int, part: PartState) -> BarDraft:
    number = (source.frame.get("number") or "").strip()[:32] or str(index + 1)
    bar = BarDraft(part, index, number, source.frame.get("implicit") == "yes")
    for child in source.body:
        read = _READERS.get(child.tag)
        if read is not None:
            read(child, bar)
    settle_hidden(bar)
    settle_jumps(bar)
    settle_tempi(bar)
    if part.in_measure_repeat and not bar.notes:
        bar.remark(Weight.LOSS, "a bar-repeat sign is not played out; the bar is empty", ZERO)
    return bar


def _backup(element: Element, bar: BarDraft) -> None:
    length = read_length(element.find("duration"), bar)
    if length is None:
        bar.remark(Weight.DOUBT, "a step back has no length and is passed over")
    elif length > bar.now:
        bar.remark(Weight.DOUBT, "a step back leads before the bar; it stops at its start")
        bar.now = ZERO
    else:
        bar.now -= length
    bar.chord = None


def _forward(element: Element, bar: BarDraft) -> None:
    length = read_length(element.find("duration"), bar)
    if length is None:
        bar.remark(Weight.DOUBT, "a step forward has no length and is passed over")
    else:
        bar.advance(length)
    bar.chord = None


_READERS: dict[str, Callable[[Element, BarDraft], None]] = {
    "note": read_note,
    "backup": _backup,
    "forward": _forward,
    "attributes": read_attributes,
    "direction": read_direction,
    "sound": read_sound,
    "harmony": read_harmony,
    "barline": read_barline,
}


def _hand_over(left: BarDraft, right: BarDraft) -> None:
    """Move what stands on the wrong side of the bar line between two bars to its own bar."""
    right.repeat_start |= left.repeat_starts_after
    right.ending = right.ending or left.ending_after
    left.repeat_end = left.repeat_end or right.repeat_ended_before
    left.ending_stop |= right.ending_stopped_before
    if left.reach > ZERO:
        # A segno after the last note of a bar is the sign on the line: the next bar is meant.
        right.jumps += [
            replace(jump, onset=ZERO)
            for jump in left.jumps
            if jump.kind is MarkKind.SEGNO and jump.onset >= left.reach
        ]
        left.jumps = [
            jump
            for jump in left.jumps
            if jump.kind is not MarkKind.SEGNO or jump.onset < left.reach
        ]
    _hand_over_signature(left.metres, right.metres, left.reach)
    _hand_over_signature(left.keys, right.keys, left.reach)


def _hand_over_signature(
    ours: list[tuple[Fraction, _Value]], theirs: list[tuple[Fraction, _Value]], reach: Fraction
) -> None:
    """A signature after the last note of a bar holds from the next bar on."""
    if ours and ZERO < reach <= ours[-1][0]:
        _, value = ours.pop()
        if not any(start == ZERO for start, _ in theirs):
            theirs.insert(0, (ZERO, value))


def _written(part: PartState, bars: list[BarDraft]) -> WrittenPart:
    heading = part.heading
    staves = max([part.staves, *(note.staff for bar in bars for note in bar.notes)])
    return WrittenPart(
        id=heading.id,
        name=heading.name,
        bars=tuple(_written_bar(bar) for bar in bars),
        abbreviation=heading.abbreviation,
        instrument=heading.instrument,
        program=heading.program,
        staves=staves,
        clefs=tuple(part.first_clefs.get(staff, "") for staff in range(1, staves + 1)),
        group=heading.group,
        unpitched=part.unpitched,
    )


def _written_bar(bar: BarDraft) -> WrittenBar:
    for jump in bar.jumps:
        bar.mark(jump.kind, jump.onset, jump.value)
    bar.report()
    return WrittenBar(
        number=bar.number,
        length=bar.reach,
        notes=tuple(bar.notes),
        rests=tuple(bar.rests),
        marks=tuple(bar.marks),
        implicit=bar.implicit,
        metre=bar.metres[-1][1] if bar.metres else None,
        key=bar.keys[-1][1] if bar.keys else None,
        repeat_start=bar.repeat_start,
        repeat_end=bar.repeat_end,
        ending=bar.ending,
        ending_stop=bar.ending_stop,
    )
