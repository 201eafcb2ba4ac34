"""One singer's own line, cut out of the user's MusicXML; what is theirs stays as it is."""

from __future__ import annotations

from collections.abc import Mapping

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
from retune.score.musicxml import noteheads
from retune.score.musicxml.layout import read_layout
from retune.score.musicxml.log import Log
from retune.tuning.model import TunedScore

_BREAKS = ("new-system", "new-page", "page-number", "blank-page", "staff-spacing")


def part_document(
    tuned: TunedScore, utf8: bytes, part: Part, limits: Limits
) -> tuple[EditedDocument, Mapping[str, Element]]:
    """The document of one part alone, and its note elements by `Note.sources`.

    Line and page breaks of the whole score go, tempo and rehearsal marks that stand at another
    staff come; a part that shares its staff gets its own name. `utf8` is that of the whole
    `EditedDocument`.
    """
    root = whole_tree(utf8)
    tree = as_element(root)
    layout = read_layout(tree, Log())
    named = {source: as_node(note) for source, note in noteheads(tree)}
    music = {
        one.heading.id: [(as_node(bar.frame), as_node(bar.body)) for bar in one.bars]
        for one in layout
    }
    shared = sum(other.source == part.source for other in tuned.score.parts) > 1
    for_all = shared_directions(layout)
    if shared:
        keep_only(tuned, part.index, music, named)
    for one in layout:
        if one.heading.id == part.source:
            add_shared(one, 1 if shared else part.staff, for_all)
    bodies = {id(body) for _, body in music.get(part.source, ())}
    for element in list(root.iter("part")):
        if id(element) not in bodies and not any(id(bar) in bodies for bar in element):
            _cut(element)
    own = next((element.get("id", "").strip() for element in root.iter("part")), "")
    _keep_listed(root, own, part, shared)
    _without_breaks(root)
    order = {id(element): index for index, element in enumerate(elements_of(root))}
    alone = EditedDocument(whole_text(root), limits)
    return alone, {
        source: alone.elements[order[id(note)]]
        for source, note in named.items()
        if id(note) in order
    }


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
