"""One singer's own line, cut out of the user's MusicXML; what is theirs stays as it is."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from retune.adapters.engraving_markup import Node, as_node
from retune.adapters.xml import Element
from retune.adapters.xml_editing import (
    EditedDocument,
    as_element,
    elements_in,
    elements_of,
    whole_text,
    whole_tree,
)
from retune.limits import Limits
from retune.page.engrave_part import keep_only
from retune.page.engrave_shared import add_shared, shared_directions
from retune.score.model import Part
from retune.score.musicxml.layout import PartSource, read_layout
from retune.score.musicxml.log import Log
from retune.tuning.model import TunedScore

_BREAKS = ("new-system", "new-page", "page-number", "blank-page", "staff-spacing")


class PartCutter:
    """Cuts single parts out of a score.

    Parameters
    ----------
    whole : EditedDocument
        The score; it stays as it is.
    named : mapping
        Its note elements by `Note.sources`.
    """

    def __init__(
        self,
        tuned: TunedScore,
        whole: EditedDocument,
        named: Mapping[str, Element],
        limits: Limits,
    ) -> None:
        self._tuned = tuned
        self._whole = whole
        self._limits = limits
        self._layout = read_layout(whole.root, Log())
        self._names = {id(note): source for source, note in named.items()}
        self._for_all = shared_directions(self._layout)

    def alone(self, part: Part) -> tuple[EditedDocument, Mapping[str, Element]]:
        """The document of one part, and its note elements by `Note.sources`.

        Line and page breaks of the whole score go, tempo and rehearsal marks that stand at
        another staff come; a part that shares its staff gets its own name.
        """
        source = next(one for one in self._layout if one.heading.id == part.source)
        bodies = {id(bar.body) for bar in source.bars}
        others = [
            element
            for element in self._whole.root.iterfind(".//part")
            if id(element) not in bodies and not any(id(bar) in bodies for bar in element)
        ]
        root = whole_tree(self._whole.utf8_without(others))
        cut = read_layout(as_element(root), Log())[0]
        notes = zip(_notes_of(source), _notes_of(cut), strict=True)
        named = {self._names[id(old)]: as_node(new) for old, new in notes}
        shared = sum(other.source == part.source for other in self._tuned.score.parts) > 1
        if shared:
            music = [(as_node(bar.frame), as_node(bar.body)) for bar in cut.bars]
            keep_only(self._tuned, part.index, {part.source: music}, named)
        add_shared(cut, 1 if shared else part.staff, self._for_all)
        own = next((element.get("id", "").strip() for element in root.iter("part")), "")
        _keep_listed(root, own, part, shared)
        _without_breaks(root)
        order = {id(element): index for index, element in enumerate(elements_of(root))}
        alone = EditedDocument(whole_text(root), self._limits)
        return alone, {
            name: alone.elements[order[id(note)]]
            for name, note in named.items()
            if id(note) in order
        }


def _notes_of(part: PartSource) -> Iterator[Element]:
    """The note elements of a part in order."""
    for bar in part.bars:
        yield from bar.body.iterchildren("note")


def _keep_listed(root: Node, own: str, part: Part, shared: bool) -> None:
    """The part's own entry in the part list, without brackets and the other parts.

    `own` is the id that its music bears. Where the list does not have it, as in damaged files,
    one entry stays: the schema wants one.
    """
    listed = root.find("part-list")
    if listed is None:
        return
    entries = [entry for entry in elements_in(listed) if entry.tag == "score-part"]
    kept = next((e for e in entries if e.get("id", "").strip() == own), None)
    kept = kept if kept is not None or not entries else entries[0]
    for entry in list(elements_in(listed)):
        if entry is not kept:
            _cut(entry)
        elif shared:
            _rename(entry, "part-name", part.name)
            _rename(entry, "part-abbreviation", part.abbreviation or part.name)


def _rename(entry: Node, tag: str, name: str) -> None:
    """Another printed name in the place of the part's, if it has one."""
    printed = entry.find(f"{tag}-display")
    if printed is not None:
        entry.remove(printed)
    own = entry.find(tag)
    if own is not None:
        own.text = name


def _without_breaks(root: Node) -> None:
    for element in root.iter("print", "measure"):
        for name in _BREAKS if element.tag == "print" else ("width",):
            element.attrib.pop(name, "")
        for child in element.findall("staff-layout"):
            element.remove(child)


def _cut(element: Node) -> None:
    """Take an element out of its parent."""
    parent = element.getparent()
    if parent is not None:
        parent.remove(element)
