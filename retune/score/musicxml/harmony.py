"""Chord symbols; they are evidence and never sound."""

from __future__ import annotations

from retune.adapters.xml import Element
from retune.errors import Weight
from retune.pitch import STEPS, PitchClass
from retune.score.musicxml.draft import BarDraft
from retune.score.musicxml.placing import placed
from retune.score.musicxml.values import whole, words
from retune.written import MarkKind, WrittenChordSymbol

_MOST_ALTERED = 2


def read_harmony(element: Element, bar: BarDraft) -> None:
    """Read the first chord symbol of a <harmony> element, at sounding pitch."""
    place = placed(element, bar)
    root = _pitch_class(element, "root", place.staff, bar)
    kind = words(element.find("kind"))
    if kind == "none":
        return
    if root is None:
        bar.remark(Weight.LOSS, "a chord symbol without a root is left out", place.onset)
        return
    symbol = WrittenChordSymbol(root, kind, _pitch_class(element, "bass", place.staff, bar))
    bar.mark(MarkKind.CHORD_SYMBOL, place.onset, symbol, place.staff)


def _pitch_class(harmony: Element, tag: str, staff: int, bar: BarDraft) -> PitchClass | None:
    """The root or bass of a chord symbol; None where it has none that can be read."""
    step = words(harmony.find(f"{tag}/{tag}-step")).upper()
    alter = whole(harmony.findtext(f"{tag}/{tag}-alter") or "0", -_MOST_ALTERED, _MOST_ALTERED)
    if len(step) != 1 or step not in STEPS or alter is None:
        return None
    return bar.part.transposition(staff or 1).pitch_class(PitchClass(step, alter))
