"""Where in a bar of MusicXML a moment is: the note before it, and how far after that."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction

from retune.adapters.xml import Element
from retune.score.musicxml.layout import PartSource
from retune.score.musicxml.values import decimal

_ZERO = Fraction(0)


@dataclass(frozen=True, slots=True)
class BarPlaces:
    """Notes and rests of one staff in one bar, with their onsets in quarter notes."""

    divisions: Fraction
    notes: tuple[tuple[Fraction, Element], ...]

    def at(self, onset: Fraction) -> tuple[Element, str] | None:
        """The note that begins at an onset or last before it, and the offset after it.

        The offset is in the file's divisions, as text; empty for none. None in an empty bar.
        """
        before = [place for place in self.notes if place[0] <= onset]
        if not before:
            return None
        latest = max(start for start, _ in before)
        note = next(element for start, element in before if start == latest)
        return note, _offset((onset - latest) * self.divisions)


def _offset(divisions: Fraction) -> str:
    """A length in divisions as xs:decimal.

    >>> _offset(Fraction(0)), _offset(Fraction(3)), _offset(Fraction(1, 3))
    ('', '3', '0.333333')
    """
    if divisions == 0:
        return ""
    if divisions.denominator == 1:
        return str(divisions.numerator)
    return f"{float(divisions):.6f}".rstrip("0").rstrip(".")


def places_of(part: PartSource, staff: int) -> Iterator[BarPlaces]:
    """The places of every bar of a part."""
    divisions = Fraction(1)
    for bar in part.bars:
        now = start = _ZERO
        notes: list[tuple[Fraction, Element]] = []
        for child in bar.body:
            length = (decimal(child.findtext("duration")) or _ZERO) / divisions
            if child.tag == "attributes":
                divisions = _positive(child.findtext("divisions")) or divisions
            elif child.tag == "backup":
                now = max(now - length, _ZERO)
            elif child.tag == "forward":
                now += length
            elif child.tag == "note" and child.find("chord") is None:
                start = now
                here = (child.findtext("staff") or "1").strip() == str(staff)
                if here and child.find("grace") is None:
                    notes.append((start, child))
                now += length
        yield BarPlaces(divisions, tuple(notes))


def _positive(text: str | None) -> Fraction | None:
    value = decimal(text)
    return value if value is not None and value > 0 else None
