"""Trees of markup that may be changed: a score to be engraved, and the SVG that comes back."""

from __future__ import annotations

from collections.abc import Iterator, MutableMapping
from typing import Protocol, cast

from lxml import etree

from retune.adapters.xml import Element, read_document
from retune.limits import Limits

SVG = "{http://www.w3.org/2000/svg}"


class Node(Protocol):
    """What is used of an element that may be changed."""

    tag: str
    text: str | None
    attrib: MutableMapping[str, str]

    def get(self, name: str, default: str) -> str: ...
    def set(self, name: str, value: str) -> None: ...
    def find(self, path: str) -> Node | None: ...
    def findtext(self, path: str) -> str | None: ...
    def findall(self, path: str) -> list[Node]: ...
    def iter(self, *tags: str) -> Iterator[Node]: ...
    def iterchildren(self, *tags: str) -> Iterator[Node]: ...
    def itersiblings(self, tag: str, *, preceding: bool) -> Iterator[Node]: ...
    def getparent(self) -> Node | None: ...
    def getnext(self) -> Node | None: ...
    def append(self, node: Node) -> None: ...
    def insert(self, index: int, node: Node) -> None: ...
    def addprevious(self, node: Node) -> None: ...
    def addnext(self, node: Node) -> None: ...
    def remove(self, node: Node) -> None: ...
    def replace(self, old: Node, new: Node) -> None: ...
    def __iter__(self) -> Iterator[Node]: ...
    def __len__(self) -> int: ...


def own_copy(document: bytes, limits: Limits) -> tuple[Element, Node]:
    """A score parsed afresh: the same tree to read and to change. Raises as `read_document`."""
    root = read_document(document, limits).root
    return root, cast(Node, root)


def as_node(element: Element) -> Node:
    """An element of a tree from `own_copy`, to be changed."""
    return cast(Node, element)


def node(tag: str, text: str | None = None, **attributes: str) -> Node:
    """A new element."""
    made = etree.Element(tag, attributes)
    made.text = text
    return cast(Node, made)


def svg_tree(text: str) -> Node:
    """The root of an SVG text."""
    parser = etree.XMLParser(resolve_entities=False, no_network=True, huge_tree=True)
    return cast(Node, etree.fromstring(text.encode(), parser))


def serialised(root: Node) -> str:
    """A tree as text, without an XML declaration."""
    return cast(str, etree.tostring(cast(etree._Element, root), encoding="unicode"))
