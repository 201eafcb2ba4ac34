"""How long a note element lasts, exactly."""

from __future__ import annotations

import math
from fractions import Fraction

from retune.adapters.xml import Element
from retune.errors import Weight
from retune.score.musicxml.draft import ZERO, BarDraft, PartState
from retune.score.musicxml.values import QUARTERS_OF_TYPE, decimal, dotted, whole, words

Fields = dict[str, Element]

_MOST_IN_TUPLET = 1000
_FINEST_SHARED = 10**30
_FINE = 100_800
"""Parts of a quarter note that hold tuplets of 2 to 10 and sixty-fourths exactly."""


def read_length(element: Element | None, bar: BarDraft) -> Fraction | None:
    """Quarter notes in a <duration>; None where it is missing, unreadable or below 0."""
    if element is None:
        return None
    text, part = element.text, bar.part
    if text in part.lengths:
        return part.lengths[text]
    if part.divisions is None:
        bar.remark(Weight.DOUBT, "no divisions are given; durations are read as quarter notes")
        part.divisions = Fraction(1)
    value = decimal(text)
    length = None if value is None or value < 0 else _kept_countable(value / part.divisions, bar)
    part.lengths[text] = length
    return length


def _kept_countable(length: Fraction, bar: BarDraft) -> Fraction:
    """The length itself, unless a file of endlessly fine lengths would make sums run wild."""
    part = bar.part
    shared = math.lcm(part.shared_denominator, length.denominator)
    if shared <= _FINEST_SHARED:
        part.shared_denominator = shared
        return length
    bar.remark(Weight.DOUBT, f"a duration is too fine to count; rounded to 1/{_FINE} quarter note")
    part.shared_denominator = math.lcm(part.shared_denominator, _FINE)
    return Fraction(round(length * _FINE), _FINE)


def note_duration(element: Element, fields: Fields, bar: BarDraft) -> Fraction:
    """Quarter notes of a note element; 0 for a grace note.

    The duration counts; the printed note value stands in where it is missing, and is compared
    with it where both are there.
    """
    if "grace" in fields:
        return ZERO
    length = read_length(fields.get("duration"), bar)
    if length is None or (length == 0 and "rest" not in fields):
        return _without_duration(element, fields, bar)
    if "type" in fields and "rest" not in fields and not _fits(element, fields, length, bar.part):
        bar.remark(
            Weight.DOUBT,
            "a duration does not fit the printed note value; the duration is used",
            bar.chord.onset if "chord" in fields and bar.chord is not None else bar.now,
        )
    return length


def _without_duration(element: Element, fields: Fields, bar: BarDraft) -> Fraction:
    if "chord" in fields and bar.chord is not None:
        return bar.chord.duration
    printed = _printed_value(element, fields)
    if printed is not None:
        bar.remark(Weight.DOUBT, "a note has no duration; its printed value is used")
        return printed
    if "rest" in fields:
        bar.remark(Weight.DOUBT, "a rest has no duration; read as a whole bar")
        return bar.part.bar_length
    bar.remark(Weight.LOSS, "a note has neither duration nor note value; it is left out")
    return ZERO


def _fits(element: Element, fields: Fields, length: Fraction, part: PartState) -> bool:
    """Whether printed value and duration agree to within one division."""
    dots = sum(1 for _ in element.iterchildren("dot")) if "dot" in fields else 0
    if "time-modification" in fields:
        return _agree(_printed_value(element, fields), length, part)
    same = (fields["duration"].text, fields["type"].text, dots)
    if same not in part.fitting:
        part.fitting[same] = _agree(_printed_value(element, fields), length, part)
    return part.fitting[same]


def _agree(printed: Fraction | None, length: Fraction, part: PartState) -> bool:
    return printed is None or abs(printed - length) * (part.divisions or 1) < 1


def _printed_value(element: Element, fields: Fields) -> Fraction | None:
    """Note value with dots and tuplet ratio; None where the type is missing or unknown."""
    base = QUARTERS_OF_TYPE.get(words(fields.get("type")))
    if base is None:
        return None
    value = dotted(base, sum(1 for _ in element.iterchildren("dot")))
    ratio = fields.get("time-modification")
    if ratio is None:
        return value
    actual = whole(ratio.findtext("actual-notes"), 1, _MOST_IN_TUPLET)
    normal = whole(ratio.findtext("normal-notes"), 1, _MOST_IN_TUPLET)
    return value if actual is None or normal is None else value * normal / actual
