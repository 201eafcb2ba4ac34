"""What a score says of itself: title, composer, lyricist, rights."""

from __future__ import annotations

from collections.abc import Iterable
from fractions import Fraction

from retune.adapters.xml import Element
from retune.score.musicxml.values import MAX_TEXT, decimal, words

_LYRICISTS = ("lyricist", "poet", "librettist", "text")


def read_title(root: Element) -> str:
    """Work and movement title, else the title printed on the page, else ""."""
    work = words(root.find("work/work-title"))
    movement = words(root.find("movement-title"))
    if not work or not movement:
        return work or movement or _credit(root, ("title",)) or _largest_credit(root)
    if movement in work or work in movement:
        return max(work, movement, key=len)
    return f"{work}: {movement}"


def read_composer(root: Element) -> str:
    """Composers, joined by commas."""
    return _creators(root, ("composer",)) or _credit(root, ("composer",))


def read_lyricist(root: Element) -> str:
    """Writers of the text, joined by commas."""
    return _creators(root, _LYRICISTS) or _credit(root, _LYRICISTS)


def read_rights(root: Element) -> str:
    """Statements of copyright, joined by semicolons."""
    rights = _joined(map(words, root.findall("identification/rights")), "; ")
    return rights or _credit(root, ("rights",))


def _creators(root: Element, kinds: tuple[str, ...]) -> str:
    creators = root.findall("identification/creator")
    return _joined((words(c) for c in creators if (c.get("type") or "").lower() in kinds), ", ")


def _credit(root: Element, kinds: tuple[str, ...]) -> str:
    for credit in root.iterchildren("credit"):
        if any(words(kind).lower() in kinds for kind in credit.iterchildren("credit-type")):
            return _credit_text(credit)
    return ""


def _credit_text(credit: Element) -> str:
    return _joined(map(words, credit.iterchildren("credit-words")), " ")


def _largest_credit(root: Element) -> str:
    """The credit in the largest print on the first page that names no kind of its own."""
    best, size = "", Fraction(0)
    for credit in root.iterchildren("credit"):
        first = credit.find("credit-words")
        if first is None or credit.find("credit-type") is not None:
            continue
        if (credit.get("page") or "1") != "1":
            continue
        printed = decimal(first.get("font-size"))
        if printed is not None and printed > size:
            best, size = _credit_text(credit), printed
    return best


def _joined(texts: Iterable[str], between: str) -> str:
    return between.join(dict.fromkeys(text for text in texts if text))[:MAX_TEXT]
