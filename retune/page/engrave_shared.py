"""Directions that all singers follow, though only the highest staff prints them.

Tempo, rehearsal marks and jumps go into a part's own file where it does not have them.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction

from retune.adapters.engraving_markup import Node, as_node, node
from retune.adapters.xml import Element
from retune.adapters.xml_editing import copy_of
from retune.page.engrave_moments import BarPlaces, moments, offset_text, places_of
from retune.score.musicxml.jumps import jump_in_words
from retune.score.musicxml.layout import PartSource
from retune.score.musicxml.values import words
from retune.score.tempo_words import tempo_word

_SIGNS = frozenset(("rehearsal", "metronome", "segno", "coda"))
_SOUNDS = ("tempo", "dacapo", "dalsegno", "segno", "coda", "tocoda", "fine")
_BEFORE_MUSIC = ("attributes", "print", "barline")
_PLACED = ("staff", "voice", "offset")


@dataclass(frozen=True, slots=True)
class Shared:
    """A direction for all: its bar, its onset there in quarter notes, and what it says."""

    bar: int
    onset: Fraction
    says: frozenset[str]
    element: Node


def shared_directions(layout: Sequence[PartSource]) -> list[Shared]:
    """The directions for all, each once, from the highest staff down."""
    found: dict[tuple[int, Fraction, str], Shared] = {}
    for one in _directions(layout):
        if not any((one.bar, one.onset, word) in found for word in one.says):
            found |= {(one.bar, one.onset, word): one for word in one.says}
    return list({id(one): one for one in found.values()}.values())


def add_shared(part: PartSource, staff: int, shared: Sequence[Shared]) -> None:
    """Put into a part what it does not say itself."""
    own = {(one.bar, one.onset, word) for one in _directions([part]) for word in one.says}
    places = list(places_of(part, staff))
    for one in shared:
        if one.bar < len(places) and not any(
            (one.bar, one.onset, word) in own for word in one.says
        ):
            _put(one, as_node(part.bars[one.bar].body), places[one.bar])


def _directions(layout: Sequence[PartSource]) -> Iterator[Shared]:
    for part in layout:
        for index, bar in enumerate(moments(part)):
            for onset, element in bar.children:
                if element.tag == "direction":
                    says = _says(element)
                    if says:
                        yield Shared(index, onset, says, as_node(element))


def _says(direction: Element) -> frozenset[str]:
    """What a direction says to all; nothing where it also says something to its own staff."""
    said: set[str] = set()
    texts: list[str] = []
    for kinds in direction.iterchildren("direction-type"):
        for child in kinds:
            if child.tag == "words":
                texts.append(words(child))
            elif child.tag in _SIGNS:
                said.add(f"{child.tag} {words(child)}" if child.tag == "rehearsal" else child.tag)
            else:
                return frozenset()
    text = " ".join(filter(None, texts))
    sound = direction.find("sound")
    jumps = [name for name in _SOUNDS if sound is not None and sound.get(name) is not None]
    if text and (jumps or tempo_word(text) is not None or jump_in_words(text) is not None):
        said.add(text.casefold())
    said.update(jumps)
    return frozenset(said)


def _put(one: Shared, body: Node, places: BarPlaces) -> None:
    """Put a copy of a direction where its moment is in another part."""
    element = copy_of(one.element)
    for child in list(element):
        if child.tag in _PLACED:
            element.remove(child)
    place = places.at(one.onset)
    if place is not None:
        anchor: Node | None = as_node(place[0])
        offset = place[1]
    else:
        music = (child for child in body if child.tag not in _BEFORE_MUSIC)
        anchor, offset = next(music, None), offset_text(one.onset * places.divisions)
    if offset:
        types = element.findall("direction-type")
        types[-1].addnext(node("offset", offset))
    if anchor is None:
        body.append(element)
    else:
        anchor.addprevious(element)
