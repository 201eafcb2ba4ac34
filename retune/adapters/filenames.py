"""Names of files that stay inside their folder and that every common system accepts."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Sequence

from retune.errors import OutputError

MAX_NAME_BYTES = 240
"""Longest name of one file or folder; common file systems allow 255 bytes."""

FORBIDDEN = re.compile(r'[\x00-\x1f\x7f<>:"/\\|?*]')
"""Characters that some common system forbids in a name."""

_RESERVED = re.compile(r"(?:con|prn|aux|nul|com[0-9¹²³]|lpt[0-9¹²³])(?:\..*)?", re.IGNORECASE)
_HINT = "This is a fault of the exporter that named it"


def is_reserved(name: str) -> bool:
    """Whether Windows keeps a name for a device.

    >>> is_reserved("NUL.txt"), is_reserved("null")
    (True, False)
    """
    return _RESERVED.fullmatch(name) is not None


def check_names(names: Sequence[str]) -> None:
    """Raise `OutputError` for a name that leads out of its folder or that a system refuses.

    Names have / between folders. Two names that differ only in case or in how accents are
    encoded are refused, as is a file where another name has a folder: on some systems one
    would take the other's place.
    """
    files: dict[str, str] = {}
    folders: dict[str, str] = {}
    for name in names:
        parts = name.split("/")
        for part in parts:
            _check_part(part, name)
        key = _folded(name)
        if key in files:
            raise OutputError(f"two files would be called '{name}' and '{files[key]}'", hint=_HINT)
        files[key] = name
        for depth in range(1, len(parts)):
            folders.setdefault(_folded("/".join(parts[:depth])), name)
    for key in files.keys() & folders.keys():
        raise OutputError(f"'{files[key]}' would be a file and a folder", hint=_HINT)


def _folded(name: str) -> str:
    return unicodedata.normalize("NFC", name).casefold()


def _check_part(part: str, name: str) -> None:
    wrong = (
        "an empty part"
        if not part
        else "a part that leads out of the folder"
        if part in (".", "..")
        else "a hidden name"
        if part.startswith(".")
        else "a character that some systems forbid"
        if FORBIDDEN.search(part) or not _encodes(part)
        else "a name that Windows keeps for a device"
        if is_reserved(part)
        else "a blank or a dot at the end of a name"
        if part[-1] in " ."
        else "a name that is too long"
        if len(part.encode("utf-8")) > MAX_NAME_BYTES
        else ""
    )
    if wrong:
        raise OutputError(f"the output name {name!r} has {wrong}", hint=_HINT)


def _encodes(part: str) -> bool:
    try:
        part.encode("utf-8")
    except UnicodeEncodeError:
        return False
    return True
