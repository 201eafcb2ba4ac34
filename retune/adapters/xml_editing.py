"""XML edited in its own bytes: what is not changed stays as it is, down to blanks and quotes.

The tree of `retune.adapters.xml` says what is there, a second pass over the text says where, and
markup is spliced in between. Declarations, comments, document types, line ends, entities and
the encoding are never written anew; what the encoding lacks becomes a character reference.
"""

from __future__ import annotations

import codecs
import re
from collections.abc import Iterable, Iterator, Sequence
from copy import deepcopy
from dataclasses import dataclass
from typing import cast
from xml.parsers import expat
from xml.sax.saxutils import escape, quoteattr

from lxml import etree

from retune.adapters.engraving_markup import Node
from retune.adapters.xml import Element, read_document
from retune.errors import UnreadableError
from retune.limits import Limits

_BOMS = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF32_LE, "utf-32-le"),
    (codecs.BOM_UTF32_BE, "utf-32-be"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
_INDENT = re.compile(rb"\r?\n[ \t]*\Z")
_MOST_INDENT = 400


@dataclass(slots=True)
class _Span:
    """Where an element is in the text: its start tag, and its end tag if it has one."""

    start: int
    inside: int = 0
    close: int = 0
    end: int = 0
    last: int = 0
    """Where its last child ends; 0 without one."""
    first: int = 0
    """Where its first child starts; 0 without one."""


class EditedDocument:
    """A document and the changes wished to it.

    Parameters
    ----------
    data : bytes
        XML, not compressed.
    limits : Limits
        As `read_document` takes them.

    `root` is the tree that is read, `elements` all of it in order, `utf8` the text before it is
    changed.

    Raises
    ------
    UnreadableError, LimitError
        As `read_document` does, and for an encoding in which places cannot be found.
    """

    def __init__(self, data: bytes, limits: Limits) -> None:
        document = read_document(data, limits)
        self.root: Element = document.root
        self.utf8, self._lead, self._encoding = _as_utf8(data, cast(etree._Element, self.root))
        spans = _spans(self.utf8)
        elements = list(cast(etree._Element, self.root).iter())
        if len(spans) != len(elements):
            raise UnreadableError("the places of the elements cannot be found in the file")
        self._spans = dict(zip(map(id, elements), spans, strict=True))
        # Held here too because Python may give an id again once an element is gone.
        self.elements: Sequence[Element] = elements
        name = re.match(rb"<([^\s/>:]+:)?", self.utf8[spans[0].start : spans[0].start + 100])
        self._prefix = (name[1] or b"").decode() if name else ""
        self._added: list[tuple[int, int, bytes]] = []
        self._removed: list[tuple[int, int]] = []

    def element(self, tag: str, content: str = "", **attributes: str) -> str:
        """Markup of a new element; `content` is markup, see `text`."""
        name = self._prefix + tag
        said = "".join(f" {key.replace('_', '-')}={quoteattr(v)}" for key, v in attributes.items())
        return f"<{name}{said}>{content}</{name}>" if content else f"<{name}{said}/>"

    def add_before(self, element: Element, markup: str) -> None:
        """Put markup before an element, on a line of its own where the file is laid out so."""
        start = self._span(element).start
        self._add(start, markup.encode() + self._indent_at(start))

    def add_after(self, element: Element, markup: str) -> None:
        """Put markup after an element."""
        span = self._span(element)
        self._add(span.end, self._indent_at(span.start) + markup.encode())

    def add_inside(self, element: Element, markup: str) -> None:
        """Put markup at the end of an element."""
        span = self._span(element)
        if span.close == span.end:
            # An empty tag is opened.
            name = re.match(rb"<([^\s/>]+)", self.utf8[span.start : span.end])
            assert name is not None, "a span starts with its tag"
            slash = self.utf8.rindex(b"/", span.start, span.end)
            self._removed.append((slash, span.end))
            self._add(span.end, b">" + markup.encode() + b"</" + name[1] + b">")
        elif span.last:
            self._add(span.last, self._indent_at(span.first) + markup.encode())
        else:
            self._add(span.close, markup.encode())

    def add_attribute(self, element: Element, name: str, value: str) -> None:
        """Give an element an attribute that it does not have."""
        span = self._span(element)
        tag = self.utf8[span.start : span.inside].rstrip(b">").rstrip(b"/").rstrip()
        self._add(span.start + len(tag), f" {name}={quoteattr(value)}".encode())

    def remove(self, element: Element) -> None:
        """Take out an element with its content and the line it stands on."""
        span = self._span(element)
        indent = self._indent_at(span.start)
        if indent:
            self._removed.append((span.start - len(indent), span.end))
        else:
            self._removed.append((span.start, span.end))

    def remove_attribute(self, element: Element, name: str) -> None:
        """Take an attribute away, if the element has it."""
        span = self._span(element)
        tag = self.utf8[span.start : span.inside]
        found = re.search(rb"\s+" + name.encode() + rb"""\s*=\s*("[^"]*"|'[^']*')""", tag)
        if found:
            self._removed.append((span.start + found.start(), span.start + found.end()))

    def utf8_without(self, elements: Iterable[Element]) -> bytes:
        """The text in UTF-8 as it was given, but for some elements, none within another."""
        pieces: list[bytes] = []
        done = 0
        for span in sorted(map(self._span, elements), key=lambda one: one.start):
            pieces.append(self.utf8[done : span.start])
            done = span.end
        return b"".join([*pieces, self.utf8[done:]])

    def result(self) -> bytes:
        """The document with all changes, in its own encoding."""
        edits = [(at, order, at, text) for at, order, text in self._added]
        edits += [(start, -1, end, b"") for start, end in self._removed]
        pieces: list[bytes] = []
        done = 0
        for start, _, end, text in sorted(edits, key=lambda edit: edit[:2]):
            if start > done:
                pieces.append(self.utf8[done:start])
            pieces.append(text)
            done = max(done, end)
        pieces.append(self.utf8[done:])
        made = b"".join(pieces).decode("utf-8")
        return self._lead + made.encode(self._encoding, "xmlcharrefreplace")

    def _span(self, element: Element) -> _Span:
        return self._spans[id(element)]

    def _add(self, at: int, markup: bytes) -> None:
        self._added.append((at, len(self._added), markup))

    def _indent_at(self, start: int) -> bytes:
        found = _INDENT.search(self.utf8[max(start - _MOST_INDENT, 0) : start])
        return found[0] if found else b""


def text(content: str) -> str:
    """Text as it stands in markup."""
    return escape(content)


def _as_utf8(data: bytes, root: etree._Element) -> tuple[bytes, bytes, str]:
    """The text in UTF-8, the bytes before it, and its own encoding."""
    body = data.lstrip(b" \t\r\n")
    lead = data[: len(data) - len(body)]
    for mark, name in _BOMS:
        if body.startswith(mark):
            return body[len(mark) :].decode(name).encode(), lead + mark, name
    used = (root.getroottree().docinfo.encoding or "utf-8").lower()
    if used.startswith(("utf-16", "ucs-2", "iso-10646-ucs-2")):
        used = "utf-16-be" if body[:1] == b"\0" else "utf-16-le"
    try:
        return body.decode(used).encode(), lead, used
    except (LookupError, UnicodeError):
        raise UnreadableError(
            f"the file's encoding, {used[:40]}, cannot be written",
            hint="Export the score again as MusicXML in UTF-8",
        ) from None


def _spans(utf8: bytes) -> list[_Span]:
    """Where every element is, in the order of their start tags."""
    found: list[_Span] = []
    open_: list[_Span] = []
    parser = expat.ParserCreate("UTF-8")
    # Character data is not asked for; entities are never expanded, as none is declared.
    parser.SetParamEntityParsing(expat.XML_PARAM_ENTITY_PARSING_NEVER)

    def starts(_: str, __: dict[str, str]) -> None:
        span = _Span(parser.CurrentByteIndex)
        if open_ and not open_[-1].first:
            open_[-1].first = span.start
        found.append(span)
        open_.append(span)

    def ends(_: str) -> None:
        span = open_.pop()
        at = parser.CurrentByteIndex
        # An empty tag starts and ends at one place.
        span.close = at
        span.inside = _tag_end(utf8, span.start)
        empty = utf8[span.inside - 2 : span.inside] == b"/>"
        span.end = span.inside if empty else utf8.index(b">", at) + 1
        if empty:
            span.close = span.end
        if open_:
            open_[-1].last = span.end

    parser.StartElementHandler = starts
    parser.EndElementHandler = ends
    try:
        parser.Parse(utf8, True)
    except expat.ExpatError as fault:
        raise UnreadableError(f"the file cannot be edited: {fault}") from None
    return found


def _tag_end(utf8: bytes, start: int) -> int:
    """Where a start tag ends; > may stand in the value of an attribute."""
    found = _TAG.match(utf8, start)
    return found.end() if found else utf8.index(b">", start) + 1


_TAG = re.compile(rb"""<[^"'>]*(?:"[^"]*"[^"'>]*|'[^']*'[^"'>]*)*>""")


# --- trees that are written again ------------------------------------------------------------


def whole_tree(utf8: bytes) -> Node:
    """The root of an `EditedDocument.utf8` with what `read_document` leaves out.

    Comments, processing instructions and blanks stay, so that `whole_text` gives them back,
    but for those inside a word or number. A score in a namespace leaves it: MusicXML has none.
    """
    parser = etree.XMLParser(
        encoding="utf-8",
        resolve_entities=False,
        no_network=True,
        load_dtd=False,
        dtd_validation=False,
        attribute_defaults=False,
        huge_tree=False,
        strip_cdata=False,
    )
    root = etree.fromstring(utf8, parser)
    if root.tag.startswith("{"):
        namespace = root.tag[: root.tag.index("}") + 1]
        for element in root.iter(f"{namespace}*"):
            element.tag = element.tag[len(namespace) :]
        etree.cleanup_namespaces(root)
    for aside in list(root.iter(etree.Comment, etree.ProcessingInstruction)):
        parent = aside.getparent()
        # Inside a word or number it would cut its text in two.
        if parent is not None and next(parent.iterchildren(etree.Element), None) is None:
            etree.strip_tags(parent, etree.Comment, etree.ProcessingInstruction)
    return cast(Node, root)


def whole_text(root: Node) -> bytes:
    """A document with its document type, in UTF-8."""
    tree = cast(etree._Element, root).getroottree()
    return cast(bytes, etree.tostring(tree, xml_declaration=True, encoding="UTF-8"))


def elements_of(root: Node) -> Iterator[Node]:
    """All elements, without comments and the like, in order."""
    return cast("Iterator[Node]", cast(etree._Element, root).iter(etree.Element))


def elements_in(parent: Node) -> Iterator[Node]:
    """The children that are elements."""
    return cast("Iterator[Node]", cast(etree._Element, parent).iterchildren(etree.Element))


def as_element(node: Node) -> Element:
    """A node as what only reads takes it."""
    return cast(Element, node)


def copy_of(node: Node) -> Node:
    """A copy of an element with all that is in it and the blanks after it."""
    return deepcopy(node)
