"""Metronome marks.

Conventions
-----------
* Tempi are quarter notes a minute, as exact fractions.
"""

from __future__ import annotations

import re
from fractions import Fraction

from retune.adapters.xml import Element
from retune.score.musicxml.values import QUARTERS_OF_TYPE, decimal, dotted, words

SLOWEST, FASTEST = Fraction(4), Fraction(2000)
"""Tempi outside are mistakes or attacks, in quarter notes a minute."""

_PER_MINUTE = re.compile(
    r"[^0-9]{0,12}(?P<low>[0-9]{1,4}(?:\.[0-9]{1,6})?)"
    r"(?:\s*[-–—/]\s*(?P<high>[0-9]{1,4}(?:\.[0-9]{1,6})?))?[^0-9]{0,12}"
)


def within_reason(tempo: Fraction | None) -> Fraction | None:
    """A tempo, or None where it is none."""
    return tempo if tempo is not None and SLOWEST <= tempo <= FASTEST else None


def per_minute(text: str) -> Fraction | None:
    """The number of a metronome mark; the middle of a range.

    >>> per_minute("c. 72"), per_minute("60-66"), per_minute("fast")
    (Fraction(72, 1), Fraction(63, 1), None)
    """
    match = _PER_MINUTE.fullmatch(text)
    if match is None:
        return None
    low = decimal(match["low"])
    high = decimal(match["high"]) or low
    return None if low is None or high is None else (low + high) / 2


def read_metronome(element: Element, current: Fraction | None) -> Fraction | None:
    """The tempo of a metronome mark; a metric modulation counts from the current tempo."""
    units = _beat_units(element)
    beats = per_minute(words(element.find("per-minute")))
    if units and beats is not None:
        return within_reason(units[0] * beats)
    if not units:
        units = _note_units(element)
    if len(units) == 2 and current is not None:
        return within_reason(current * units[1] / units[0])
    return None


def _beat_units(element: Element) -> list[Fraction]:
    """Lengths of the note values of a mark: the beat, or both sides of a modulation."""
    bases: list[Fraction] = []
    dots: list[int] = []
    for child in element:
        if child.tag == "beat-unit":
            bases.append(QUARTERS_OF_TYPE.get(words(child), Fraction(0)))
            dots.append(0)
        elif child.tag == "beat-unit-dot" and dots:
            dots[-1] += 1
    units = [dotted(base, count) for base, count in zip(bases, dots, strict=True)]
    return units if all(units) else []


def _note_units(element: Element) -> list[Fraction]:
    """Lengths of the two notes of a modulation written with metronome notes, one a side."""
    if words(element.find("metronome-relation")) != "equals":
        return []
    units = []
    for note in element.iterchildren("metronome-note"):
        base = QUARTERS_OF_TYPE.get(words(note.find("metronome-type")))
        if base is None or note.find("metronome-tuplet") is not None:
            return []
        units.append(dotted(base, len(note.findall("metronome-dot"))))
    return units if len(units) == 2 else []
