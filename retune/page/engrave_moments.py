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
        return note, offset_text((onset - latest) * self.divisions)


def offset_text(divisions: Fraction) -> str:
    """A length in divisions as xs:decimal; empty for none.

    >>> offset_text(Fraction(0)), offset_text(Fraction(3)), offset_text(Fraction(1, 3))
    ('', '3', '0.333333')
    """
    if divisions == 0:
        return ""
    if divisions.denominator == 1:
        return str(divisions.numerator)
    return f"{float(divisions):.6f}".rstrip("0").rstrip(".")


@dataclass(frozen=True, slots=True)
class BarMoments:
    """What is in a bar, each with its onset in quarter notes; a chord's notes share one."""

    divisions: Fraction
    children: tuple[tuple[Fraction, Element], ...]


def moments(part: PartSource) -> Iterator[BarMoments]:
    """The contents of every bar of a part."""
    divisions = Fraction(1)
    for bar in part.bars:
        now = chord = _ZERO
        children: list[tuple[Fraction, Element]] = []
        for child in bar.body:
            tag = child.tag
            if tag == "attributes":
                divisions = _positive(child.findtext("divisions")) or divisions
            elif tag in ("backup", "forward", "note"):
                length = (decimal(child.findtext("duration")) or _ZERO) / divisions
                if tag == "note" and child.find("chord") is not None:
                    children.append((chord, child))
                    continue
                if tag == "backup":
                    now = max(now - length, _ZERO)
                    continue
                children.append((now, child))
                chord = now
                now += length
                continue
            offset = decimal(child.findtext("offset")) if tag == "direction" else None
            children.append((max(now + (offset or _ZERO) / divisions, _ZERO), child))
        yield BarMoments(divisions, tuple(children))


def places_of(part: PartSource, staff: int) -> Iterator[BarPlaces]:
    """The places of every bar of a part: its notes and rests on a staff, but for grace notes."""
    for bar in moments(part):
        yield BarPlaces(
            bar.divisions,
            tuple(
                (onset, child)
                for onset, child in bar.children
                if child.tag == "note"
                and child.find("chord") is None
                and child.find("grace") is None
                and (child.findtext("staff") or "1").strip() == str(staff)
            ),
        )


def _positive(text: str | None) -> Fraction | None:
    value = decimal(text)
    return value if value is not None and value > 0 else None
