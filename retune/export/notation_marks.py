"""What an earlier run wrote into a MusicXML file, found by its marks and taken out again.

Everything added bears an `id` that begins with "retune-", but for what stands inside elements
of the user's: that is known by the field "retune" among the file's miscellaneous ones.
"""

from __future__ import annotations

import re

from retune.adapters.xml import Element
from retune.adapters.xml_editing import EditedDocument
from retune.limits import Limits

FIELD = "retune"
"""Name of the miscellaneous field that says that the file bears additions, and which."""

LABEL, CHORD, PLAY, SEPTIMAL = "cents", "chord", "play", "septimal"
CENTS_TYPE = "cents"
COMMA_SIGNS = "comma accidentals"
"""What the field says where arrows were added."""

ADDED_SIGN = {"cautionary": "no", "editorial": "no"}
"""What an accidental bears that was not there before: both say what holds anyway."""

_OURS = re.compile(rf"{FIELD}-({LABEL}|{CHORD}|{PLAY}|{SEPTIMAL})-\d+")
_CENTS = re.compile(rf"{CENTS_TYPE}( pass \d+)?( after \d+(/\d+)?)?")
_ARROWS = re.compile(r"accidental\w+Arrows?(Up|Down)")
_TAGS = ("direction", "play", "notations")


def identity(kind: str, number: int) -> str:
    """The id of something added."""
    return f"{FIELD}-{kind}-{number}"


def cents_type(number: int, after: object) -> str:
    """The type of a played pitch: which pass, from 1, and quarter notes from the notehead.

    >>> cents_type(1, 0), cents_type(2, "3/2")
    ('cents', 'cents pass 2 after 3/2')
    """
    passing = f" pass {number}" if number > 1 else ""
    return f"{CENTS_TYPE}{passing}{f' after {after}' if after else ''}"


def has_comma_signs(root: Element) -> bool:
    """Whether a score has accidentals with arrows that name their glyph."""
    return any(
        _ARROWS.fullmatch(sign.get("smufl") or "") for sign in root.iterfind(".//accidental")
    )


def without_additions(data: bytes, limits: Limits) -> tuple[bytes, bool]:
    """A score as it was before an earlier run, and whether labels may be left in it.

    They are where the file says that it was labelled, but bears no mark of a label any more: a
    program that saved it has dropped the marks.

    Parameters
    ----------
    data : bytes
        MusicXML, not compressed.
    """
    if not any(FIELD.encode(form) in data for form in ("utf-8", "utf-16-le", "utf-16-be")):
        return data, False
    document = EditedDocument(data, limits)
    fields = [
        field
        for field in document.root.iterfind("identification/miscellaneous/miscellaneous-field")
        if field.get("name") == FIELD
    ]
    removed = {
        id(element): element
        for tag in _TAGS
        for element in document.root.iterfind(f".//{tag}")
        if _OURS.fullmatch(element.get("id") or "")
    }
    labels = any(f"-{LABEL}-" in (one.get("id") or "") for one in removed.values())
    if fields:
        for play in document.root.iterfind(".//note/play"):
            if id(play) not in removed:
                removed |= {id(one): one for one in play.findall("other-play") if _is_cents(one)}
        if any(COMMA_SIGNS in (field.text or "") for field in fields):
            removed |= _without_arrows(document)
    if fields:
        box = _box(document.root, fields)
        removed |= {id(one): one for one in box}
    for element in removed.values():
        document.remove(element)
    return document.result(), bool(fields) and not labels


def _box(root: Element, fields: list[Element]) -> list[Element]:
    """The fields, or what holds nothing else."""
    miscellaneous = root.find("identification/miscellaneous")
    identification = root.find("identification")
    assert miscellaneous is not None, "it holds the fields"
    assert identification is not None, "it holds the fields"
    if len(list(miscellaneous)) > len(fields):
        return fields
    return [miscellaneous if len(list(identification)) > 1 else identification]


def _is_cents(play: Element) -> bool:
    return _CENTS.fullmatch(play.get("type") or "") is not None


def is_added_sign(sign: Element) -> bool:
    """Whether an accidental looks as those that are added where the file has none."""
    return all(sign.get(name) == value for name, value in ADDED_SIGN.items())


def _without_arrows(document: EditedDocument) -> dict[int, Element]:
    """Take glyph names off accidentals; those that are there for their arrows alone go."""
    added: dict[int, Element] = {}
    for sign in document.root.iterfind(".//note/accidental"):
        if _ARROWS.fullmatch(sign.get("smufl") or ""):
            if is_added_sign(sign):
                added[id(sign)] = sign
            else:
                document.remove_attribute(sign, "smufl")
    return added
