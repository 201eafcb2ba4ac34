"""A copy of the user's score made ready for the engraver.

Every notehead gets a name of ours, parts that do not sound go, layout made for paper goes, and
cents are added as a verse of their own, so that the engraver leaves room for them.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from itertools import takewhile

from retune.adapters.engraving_markup import Node, as_node, node, own_copy, serialised
from retune.limits import Limits
from retune.page.engrave_labels import Head, heads_of
from retune.page.engrave_part import Bars, keep_only
from retune.page.engrave_shared import add_shared, shared_directions
from retune.score.model import Part
from retune.score.musicxml import noteheads
from retune.score.musicxml.layout import read_layout
from retune.score.musicxml.log import Log
from retune.tuning.model import TunedScore

CENTS_VERSE = 900
"""Verses from this number on hold cents: rows from the top of a stack of noteheads."""

_NAMED = frozenset({"part", "score-part", "score-instrument", "instrument"})
_FOR_PAPER = ("defaults", "credit", "identification", "work", "movement-title")
_LOOKS = frozenset(
    {
        "color", "default-x", "default-y", "relative-x", "relative-y", "font-family",
        "font-size", "new-system", "new-page", "justify", "halign", "valign",
    }
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Annotated:
    """A score ready to engrave: MusicXML by parts, and what its noteheads mean.

    `ids` maps `Note.sources` to names in the copy, `heads` those names to what is known of
    each notehead that sounds.
    """

    document: str
    ids: dict[str, str]
    heads: dict[str, Head]


def notehead_ids(document: bytes, limits: Limits | None = None) -> dict[str, str]:
    """Names of noteheads in the engraving by `Note.sources`.

    They are ours even where the file has its own, so that none clashes with the page's or is
    odd. Raises `UnreadableError` or `LimitError` for what is no score.
    """
    root, _ = own_copy(document, limits or Limits())
    return {source: f"n{index}" for index, (source, _) in enumerate(noteheads(root))}


def annotated(
    tuned: TunedScore, document: bytes, part: int | None = None, short_names: bool = False
) -> Annotated:
    """The copy of a score that is engraved.

    Parameters
    ----------
    document : bytes
        The MusicXML the score was read from.
    part : int, optional
        Index of the only part to keep.
    short_names : bool
        Whether abbreviated part names stand at the first system too.
    """
    read, root = own_copy(document, Limits())
    named = [(source, as_node(element)) for source, element in noteheads(read)]
    ids = {source: f"n{index}" for index, (source, _) in enumerate(named)}
    layout = read_layout(read, Log())
    parts = {source.heading.id: source for source in layout}
    music = {
        name: [(as_node(bar.frame), as_node(bar.body)) for bar in source.bars]
        for name, source in parts.items()
    }
    lengths = written_lengths([body for _, body in bars] for bars in music.values())
    by_element = {id(element): source for source, element in named}
    heads = heads_of(tuned, {by_element[key]: length for key, length in lengths.items()})

    for element in root.iter():
        _plain(element)
    for source, element in named:
        element.set("id", ids[source])
    if part is not None:
        for_all = shared_directions(layout)
        keep_only(tuned, part, music, dict(named))
        own = parts.get(tuned.score.parts[part].source)
        if own is not None:
            add_shared(own, 1, for_all)
    _write_cents(heads, dict(named), music)
    kept = [tuned.score.parts[part]] if part is not None else tuned.score.parts
    _keep_parts(root, music, {one.source for one in kept}, part is not None)
    if part is not None:
        _name(root, tuned.score.parts[part])
    if short_names:
        _shorten_names(root)
    by_name = {ids[source]: head for source, head in heads.items() if source in ids}
    return Annotated(serialised(root), ids, by_name)


def _plain(element: Node) -> None:
    """Drop names that could clash with ours and looks that were meant for paper."""
    if element.tag not in _NAMED and "id" in element.attrib:
        del element.attrib["id"]
    for name in _LOOKS & set(element.attrib):
        del element.attrib[name]


def written_lengths(parts: Iterable[list[Node]]) -> dict[int, Fraction]:
    """Written lengths of note elements in quarter notes, by the elements' identity."""
    found: dict[int, Fraction] = {}
    for bars in parts:
        divisions = Fraction(1)
        for bar in bars:
            for child in bar:
                if child.tag == "attributes":
                    divisions = _number(child.findtext("divisions")) or divisions
                elif child.tag == "note":
                    found[id(child)] = _number(child.findtext("duration")) / divisions
    return found


def _number(text: str | None) -> Fraction:
    """A positive number of the file; 0 for none, as the reader has reported already."""
    text = (text or "").strip()
    if len(text) > 20 or not text.replace(".", "", 1).isdecimal():
        return Fraction(0)
    return Fraction(text)


# --- cents ---------------------------------------------------------------------------------


def _write_cents(
    heads: Mapping[str, Head], named: Mapping[str, Node], music: Mapping[str, Bars]
) -> None:
    """Add each label as a verse, to the first note of the chord that its notehead is in.

    Labels of a chord stand under each other as its heads do, those of a staff's lower voice
    under those of its upper one.
    """
    stacks: dict[int, list[tuple[Node, Head]]] = {}
    for source, head in heads.items():
        element = named.get(source)
        if element is not None and head.cents:
            stacks.setdefault(id(first_of_chord(element)), []).append((element, head))
    for stack in stacks.values():
        stack.sort(key=lambda entry: -_height(entry[0]))
    for bars in music.values():
        for _, body in bars:
            _write_rows(body.findall("note"), stacks)


def _write_rows(notes: list[Node], stacks: Mapping[int, list[tuple[Node, Head]]]) -> None:
    """Write the labels of one bar, each voice in rows of its own."""
    heights: dict[tuple[str, str], int] = {}
    for note in notes:
        line = _line_of(note)
        heights[line] = max(heights.get(line, 1), len(stacks.get(id(note), ())))
    for note in notes:
        staff, voice = _line_of(note)
        before = takewhile((staff, voice).__ne__, heights)
        above = sum(heights[line] for line in before if line[0] == staff)
        for row, (_, head) in enumerate(stacks.get(id(note), ())):
            note.append(_verse(CENTS_VERSE + above + row, head.text))


def _line_of(note: Node) -> tuple[str, str]:
    """Staff and voice of a note element."""
    return note.findtext("staff") or "1", note.findtext("voice") or "1"


def _verse(number: int, text: str) -> Node:
    verse = node("lyric", number=str(number), placement="below")
    verse.append(node("syllabic", "single"))
    verse.append(node("text", text))
    return verse


def first_of_chord(element: Node) -> Node:
    """The note that a notehead shares its stem with and that bears the verses."""
    while element.find("chord") is not None:
        before = next(element.itersiblings("note", preceding=True), None)
        if before is None:
            break
        element = before
    return element


def _height(element: Node) -> int:
    step = element.findtext("pitch/step") or "C"
    octave = element.findtext("pitch/octave") or "4"
    return 7 * int(_number(octave)) + "CDEFGAB".find(step.strip())


# --- parts ---------------------------------------------------------------------------------


def _keep_parts(root: Node, music: Mapping[str, Bars], kept: set[str], alone: bool) -> None:
    """Make the score one by parts, with these parts only and without its paper."""
    for name in _FOR_PAPER:
        for child in root.findall(name):
            root.remove(child)
    part_list = root.find("part-list")
    entries = (
        {}
        if part_list is None
        else {e.get("id", "").strip(): e for e in part_list.findall("score-part")}
    )
    for child in list(root):
        root.remove(child)
    listed = node("part-list")
    root.append(listed)
    root.tag = "score-partwise"
    names = [name for name in music if name in kept]
    if part_list is not None and not alone:
        _keep_groups(part_list, listed, names)
    for number, name in enumerate(names, 1):
        entry = entries.get(name)
        if entry is None:
            entry = node("score-part")
            entry.append(node("part-name", name))
        if entry.getparent() is not listed:
            listed.append(entry)
        entry.set("id", f"P{number}")
        part = node("part", id=f"P{number}")
        for index, (frame, body) in enumerate(music[name]):
            part.append(_bar(frame, body, index))
        root.append(part)


def _bar(frame: Node, body: Node, index: int) -> Node:
    bar = node("measure", number=frame.get("number", str(index + 1)), id=f"b{index}")
    if frame.get("implicit", "") == "yes":
        bar.set("implicit", "yes")
    if frame is not body or body.tag == "measure":
        for child in list(body):
            bar.append(child)
    return bar


def _keep_groups(part_list: Node, listed: Node, names: list[str]) -> None:
    """Brackets and the kept parts in their order; a bracket around nothing is left out."""
    entries = list(part_list)
    for index, entry in enumerate(entries):
        if _is_part(entry, names) or (
            entry.tag == "part-group" and _encloses(entries, index, names)
        ):
            listed.append(entry)


def _is_part(entry: Node, names: list[str]) -> bool:
    return entry.tag == "score-part" and entry.get("id", "").strip() in names


def _encloses(entries: list[Node], index: int, names: list[str]) -> bool:
    """Whether a bracket's start or stop has a kept part between itself and its other end."""
    entry = entries[index]
    starts = entry.get("type", "") == "start"
    way = entries[index + 1 :] if starts else reversed(entries[:index])
    for other in way:
        if _is_part(other, names):
            return True
        if other.tag == "part-group" and other.get("number", "1") == entry.get("number", "1"):
            return False
    return False


def _name(root: Node, part: Part) -> None:
    """Give the only part its own name, where the file names a staff of several."""
    for entry in root.iter("score-part"):
        _rename(entry, part.name, part.abbreviation or part.name)


def _shorten_names(root: Node) -> None:
    """Abbreviated names at the first system too."""
    for entry in root.iter("score-part"):
        name, short = entry.findtext("part-name") or "", entry.findtext("part-abbreviation")
        short = short or name[:4]
        _rename(entry, short, short)


def _rename(entry: Node, name: str, short: str) -> None:
    """Set the printed names of a part, at the place that the schema gives them."""
    for child in list(entry):
        if child.tag.startswith(("part-name", "part-abbreviation")):
            entry.remove(child)
    entry.insert(0, node("part-name", name))
    entry.insert(1, node("part-abbreviation", short))
