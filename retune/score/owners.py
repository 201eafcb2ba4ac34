"""Words over a staff that say who sings: "A.", "S. solo", "tutti"."""

from __future__ import annotations

import re
from collections.abc import Sequence
from fractions import Fraction

from retune.score.division import Owner
from retune.score.names import Label, singers_named
from retune.score.staves import StaffBar
from retune.written import MarkKind, WrittenPart

_ALL = re.compile(
    r"\b(tutti|all|alle|tous|unis|unisono|unison|coro|chor|choir|chorus|a\s?2)\b", re.I
)
_SOLO = re.compile(r"\bsol[oia]\b", re.I)


def owners_of(
    part: WrittenPart, staff: int, bars: Sequence[StaffBar], groups: Sequence[Label]
) -> list[tuple[Owner, ...]]:
    """For each bar who sings its single voice; empty where all the staff's singers do.

    What a word says holds until the next one, or until the staff shows several voices again.
    """
    result: list[tuple[Owner, ...]] = []
    current: Owner | None = None
    for index, bar in enumerate(bars):
        if sum(voice.sounding for voice in bar.voices) > 1:
            current = None
        said = list(_said(part, index, staff, groups))
        before = () if current is None else (Owner(Fraction(0), current.groups, current.solo),)
        result.append((*before, *said) if before or said else ())
        if said:
            last = said[-1]
            current = None if last.groups is None and not last.solo else last
    return result


def _said(part: WrittenPart, index: int, staff: int, groups: Sequence[Label]) -> Sequence[Owner]:
    if index >= len(part.bars):
        return ()
    marks = part.bars[index].marks
    words = (mark for mark in marks if mark.kind is MarkKind.WORDS and mark.staff in (0, staff))
    owners = (_owner(mark.onset, str(mark.value or ""), groups) for mark in words)
    return sorted((owner for owner in owners if owner), key=lambda owner: owner.onset)


def _owner(onset: Fraction, text: str, groups: Sequence[Label]) -> Owner | None:
    if _ALL.search(text):
        return Owner(onset, None)
    named = {(label.voice_type, label.ordinal) for label in singers_named(text)}
    types = {voice_type for voice_type, _ in named}
    chosen = frozenset(
        place
        for place, label in enumerate(groups)
        if label.voice_type in types
        and ({(label.voice_type, label.ordinal), (label.voice_type, None)} & named)
    )
    solo = _SOLO.search(text) is not None
    if chosen:
        return Owner(onset, chosen, solo)
    return Owner(onset, None, solo) if solo else None
