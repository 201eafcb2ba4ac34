"""Where a direction or chord symbol stands."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from retune.adapters.xml import Element
from retune.score.musicxml.draft import ZERO, BarDraft
from retune.score.musicxml.values import MAX_STAVES, decimal, whole, words


@dataclass(frozen=True, slots=True)
class Place:
    """An onset in the bar, a staff (0 for all) and a voice, if one is named."""

    onset: Fraction
    staff: int = 0
    voice: str | None = None


def placed(element: Element, bar: BarDraft) -> Place:
    """The place of an element that may bear <offset>, <staff> and <voice>."""
    onset, staff, voice = bar.now, 0, None
    for child in element:
        if child.tag == "offset":
            onset += (decimal(child.text) or ZERO) / (bar.part.divisions or 1)
        elif child.tag == "staff":
            staff = whole(child.text, 1, MAX_STAVES) or 0
        elif child.tag == "voice":
            voice = words(child) or None
    return Place(max(onset, ZERO), staff, voice)
