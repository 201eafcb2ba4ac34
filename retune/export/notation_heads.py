"""What is to be written at each notehead of the user's file: labels, cents, ratios.

Conventions
-----------
* Noteheads are named as `Note.sources` names them; `Played.values` are cents from equal
  temperament at the reference pitch, as in the note list.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from fractions import Fraction

from retune.export.places import rounded
from retune.page.engrave_labels import SMALL, Span, label_cents, label_values, signed, spans
from retune.tuning.model import TunedNote, TunedScore


class Cents(StrEnum):
    """What labels count from."""

    ROOT = "root"
    EQUAL = "equal"
    NONE = "none"


@dataclass(frozen=True, slots=True)
class Played:
    """A notehead as one pass plays it.

    `label` is whole cents as labels say them, one a change; `values` are quarter notes from
    the notehead to where a tuned pitch begins, and that pitch in cents; `ratio` is the first.
    """

    part: int
    label: tuple[int, ...]
    values: tuple[tuple[Fraction, float], ...]
    ratio: Fraction | None


def played_heads(
    tuned: TunedScore, lengths: Mapping[str, Fraction], cents: Cents, part: int | None = None
) -> dict[str, list[Played]]:
    """Every notehead that sounds with its passes in order.

    `lengths` are written lengths of noteheads in quarter notes; with `part` only that part's
    noteheads are given. One that several parts sing from is the first one's.
    """
    heads: dict[str, list[Played]] = {}
    for note in tuned.notes:
        if part not in (None, note.note.part):
            continue
        labels = label_values(tuned, note, equal=cents is Cents.EQUAL)
        for span in spans(note, lengths):
            label = () if cents is Cents.NONE else label_cents(note, labels, span)
            values = tuple(_values(note, span))
            ratio = next((s.ratio for s in note.segments if s.end > span.start), None)
            played = Played(note.note.part, label, values, ratio)
            passes = heads.setdefault(span.source, [])
            if not passes or passes[0].part == played.part:
                passes.append(played)
    return heads


def _values(note: TunedNote, span: Span) -> Iterator[tuple[Fraction, float]]:
    last: float | None = None
    for segment in note.segments:
        if segment.onset < span.end and segment.end > span.start:
            value = rounded(segment.cents)
            if value != last:
                yield max(segment.onset - span.start, Fraction(0)), value
            last = value


def label_text(passes: Sequence[Played], least: int) -> str:
    """The label of a notehead, such as "−14", "+2›−12" or "−14 (−6)"; empty for none.

    In brackets stands a later pass where it differs by more than is hardly heard.

    >>> [label_text([Played(0, c, (), None) for c in p], 0) for p in ([(2, -12)], [(0,), (-6,)])]
    ['+2›−12', '0 (−6)']
    """
    first = passes[0].label
    shown = [first]
    for later in passes[1:]:
        if all(_differs(later.label, one) for one in shown) and later.label:
            shown.append(later.label)
    if not any(abs(value) >= least for label in shown for value in label):
        return ""
    said = ["›".join(map(signed, label)) for label in shown]
    return said[0] + "".join(f" ({one})" for one in said[1:])


def _differs(one: tuple[int, ...], other: tuple[int, ...]) -> bool:
    return len(one) != len(other) or any(
        abs(a - b) > SMALL for a, b in zip(one, other, strict=True)
    )
