"""File names that every system takes: one function for every name an exporter makes.

Names are joined as text, never as paths: a score called bwv6.6 stays bwv6.6.
"""

from __future__ import annotations

import unicodedata

from retune.adapters.filenames import FORBIDDEN, MAX_NAME_BYTES, is_reserved

_BYTES = (MAX_NAME_BYTES - len(" - .notes.json")) // 2
"""Room for one name in a file name that joins two, with an ending."""


def safe_name(text: str, fallback: str = "untitled") -> str:
    """A readable file name, without its ending, that every common system accepts.

    Letters of all scripts stay. Characters a system forbids become -, control and invisible
    ones go, as do blanks and dots at either end; reserved device names get an underscore.

    >>> safe_name("Kyrie: I/II?"), safe_name("bwv6.6"), safe_name("con"), safe_name("..")
    ('Kyrie- I-II-', 'bwv6.6', 'con_', 'untitled')
    """
    composed = unicodedata.normalize("NFC", text)
    shown = "".join(_shown(char) for char in composed)
    name = " ".join(FORBIDDEN.sub("-", shown).split()).strip(". ")
    while len(name.encode("utf-8")) > _BYTES:
        name = name[:-1].rstrip(". ")
    if not name:
        return fallback
    if is_reserved(name):
        stem, dot, ending = name.partition(".")
        return f"{stem}_{dot}{ending}"
    return name


def _shown(char: str) -> str:
    kind = unicodedata.category(char)
    if kind in ("Cs", "Co", "Cn"):
        return "-"
    if kind in ("Zs", "Zl", "Zp") or char in "\t\n\r\v\f":
        return " "
    return "" if kind in ("Cc", "Cf") else char
