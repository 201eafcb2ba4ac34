"""Bar lines: repeats, endings, fermatas and signs on them.

Conventions
-----------
* A bar opens repeats and endings at its left line and closes them at its right one; what a
  file writes the other way about is kept apart here and handed to the neighbour bar.
"""

from __future__ import annotations

import re

from retune.adapters.xml import Element
from retune.errors import Weight
from retune.score.musicxml.draft import ZERO, BarDraft, Jump
from retune.score.musicxml.jumps import BY_SIGN
from retune.score.musicxml.values import MAX_LABEL, whole, words
from retune.written import MarkKind

_MOST_TIMES = 999
_PASSES = re.compile(r"([0-9]{1,3})(?:\s*[-–]\s*([0-9]{1,3}))?")
_SIGNS = {"segno": MarkKind.SEGNO, "coda": MarkKind.CODA}


def read_barline(element: Element, bar: BarDraft) -> None:
    """Read a <barline> element into the bar."""
    location = element.get("location") or "right"
    onset = {"left": ZERO, "middle": bar.now}.get(location, bar.reach)
    for child in element:
        if child.tag == "repeat":
            _repeat(child, location, bar)
        elif child.tag == "ending":
            _ending(child, location, bar)
        elif child.tag == "fermata":
            bar.mark(MarkKind.FERMATA, onset)
        elif child.tag in _SIGNS:
            bar.jumps.append(Jump(_SIGNS[child.tag], onset, BY_SIGN))


def _repeat(element: Element, location: str, bar: BarDraft) -> None:
    at_start = location == "left" or (location == "middle" and bar.now == ZERO)
    if location == "middle" and not at_start:
        bar.remark(
            Weight.DOUBT, "a repeat sign inside a bar is read as standing at the end of the bar"
        )
    direction = element.get("direction")
    if direction == "forward":
        bar.part.last_pass = 0
    if direction == "forward" and at_start:
        bar.repeat_start = True
    elif direction == "forward":
        bar.repeat_starts_after = True
    elif direction == "backward":
        times = whole(element.get("times") or "2", 1, _MOST_TIMES)
        if times is None:
            bar.remark(Weight.DOUBT, "a repeat gives no sensible number of times; played twice")
        if at_start:
            bar.repeat_ended_before = times or 2
        else:
            bar.repeat_end = times or 2


def _ending(element: Element, location: str, bar: BarDraft) -> None:
    if element.get("type") == "start":
        passes = _passes(element, bar)
        bar.part.last_pass = max(passes)
        if location == "right":
            bar.ending_after = passes
        else:
            bar.ending = passes
    elif location == "left":
        bar.ending_stopped_before = True
    else:
        bar.ending_stop = True


def _passes(element: Element, bar: BarDraft) -> tuple[int, ...]:
    """Passes of an ending, "1,2" or "1-3"; where none are given, the next after the last."""
    for text in ((element.get("number") or "")[:MAX_LABEL], words(element)[:MAX_LABEL]):
        found = _PASSES.findall(text)
        passes = {
            number
            for low, high in found
            for number in range(int(low), int(high or low) + 1)
            if number >= 1
        }
        if passes:
            return tuple(sorted(passes))
    bar.remark(Weight.DOUBT, "an ending has no number; read as the next in order", ZERO)
    return (bar.part.last_pass + 1,)
