"""The part list: names, brackets and instruments."""

from __future__ import annotations

from dataclasses import dataclass, replace

from retune.adapters.xml import Element
from retune.score.musicxml.values import MAX_LABEL, whole, words

_MOST_OPEN_GROUPS = 64


@dataclass(frozen=True, slots=True)
class Heading:
    """What the part list says of one part; fields as in `WrittenPart`."""

    id: str
    name: str
    abbreviation: str = ""
    instrument: str = ""
    program: int | None = None
    group: str = ""

    def again(self, number: int) -> Heading:
        """The heading of a further part that claims the same id."""
        return replace(self, id=f"{self.id}#{number}")


def read_part_list(part_list: Element | None) -> list[Heading]:
    """The headings in order; empty where there is no part list."""
    headings: list[Heading] = []
    open_groups: dict[str, str] = {}
    for entry in () if part_list is None else part_list:
        if entry.tag == "part-group":
            _turn_group(entry, open_groups)
        elif entry.tag == "score-part":
            group = next((name for name in reversed(open_groups.values()) if name), "")
            headings.append(_heading(entry, len(headings) + 1, group))
    return headings


def identity_of(element: Element) -> str:
    """The id of a part or of its entry in the list; "" for none."""
    return (element.get("id") or "").strip()[:MAX_LABEL]


def _turn_group(entry: Element, open_groups: dict[str, str]) -> None:
    number = entry.get("number") or "1"
    open_groups.pop(number, None)
    if entry.get("type") == "start" and len(open_groups) < _MOST_OPEN_GROUPS:
        open_groups[number] = _name(entry, "group-name")


def _heading(entry: Element, number: int, group: str) -> Heading:
    sounds = entry.find("score-instrument")
    instrument = ""
    if sounds is not None:
        instrument = words(sounds.find("instrument-sound")) or words(sounds.find("instrument-name"))
    printed_instrument = "" if sounds is None else words(sounds.find("instrument-name"))
    name = _name(entry, "part-name") or printed_instrument or f"Part {number}"
    program = whole(entry.findtext("midi-instrument/midi-program"), 1, 128)
    return Heading(
        id=identity_of(entry) or f"#{number}",
        name=name,
        abbreviation=_name(entry, "part-abbreviation"),
        instrument=instrument,
        program=None if program is None else program - 1,
        group=group,
    )


def _name(entry: Element, tag: str) -> str:
    """A name, or what is displayed in its place where the name itself is empty."""
    plain = words(entry.find(tag))
    if plain:
        return plain
    display = entry.find(f"{tag}-display")
    if display is None:
        return ""
    return " ".join(text for text in map(words, display.iterchildren("display-text")) if text)
