"""Where in a TOML text each table and key stands, which the standard reader does not tell.

Conventions
-----------
* A path is a tuple of keys, with the number of the table, from 0, after the name of an array of
  tables: ("chord", 2, "root").
* Lines and columns count from 1.
* The text is valid TOML: `tomllib` has read it.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass

Path = tuple[str | int, ...]

_STRING = re.compile(
    r'"""(?:\\.|"{1,2}(?!")|[^"\\])*"{3,5}'
    r"|'''(?:'{1,2}(?!')|[^'])*'{3,5}"
    r'|"(?:\\.|[^"\\\n])*"'
    r"|'[^'\n]*'",
    re.DOTALL,
)
_SKIPPED = re.compile(r"#[^\n]*")
_BLANK = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_KEY = re.compile(r"""(?:[A-Za-z0-9_-]+|"(?:\\.|[^"\\\n])*"|'[^'\n]*')""")
_DOT = re.compile(r"[ \t]*\.[ \t]*")


@dataclass(frozen=True, slots=True)
class Position:
    """A line and a column."""

    line: int
    column: int

    def __str__(self) -> str:
        return f"line {self.line}, column {self.column}"


def positions(text: str) -> dict[Path, Position]:
    """The place of every table and of every key that begins a line of its own.

    >>> where = positions('title = "Psalm"\\n[[chord]]\\nat = "1:1"\\n[[chord]]\\nroot = "D"')
    >>> str(where["chord", 1, "root"])
    'line 5, column 1'
    """
    found: dict[Path, Position] = {}
    count: dict[Path, int] = {}
    table: Path = ()
    for start, header, keys in _statements(text):
        here = _position(text, start)
        if header == 0:
            _note(found, table, keys, here)
            continue
        table = _open(count, keys, header == 2)
        found.setdefault(table, here)
    return found


def _note(found: dict[Path, Position], table: Path, keys: list[str], here: Position) -> None:
    for length in range(1, len(keys) + 1):
        found.setdefault((*table, *keys[:length]), here)


def _open(count: dict[Path, int], keys: list[str], array: bool) -> Path:
    """The path of a table that a header opens, through the last table of each array."""
    path: Path = ()
    for place, key in enumerate(keys):
        path = (*path, key)
        last = place == len(keys) - 1
        if array and last:
            count[path] = count.get(path, -1) + 1
        if path in count and (array or not last):
            path = (*path, count[path])
    return path


def _position(text: str, offset: int) -> Position:
    before = text.rfind("\n", 0, offset)
    return Position(text.count("\n", 0, offset) + 1, offset - before)


def _statements(text: str) -> Iterator[tuple[int, int, list[str]]]:
    """Start, brackets of the header (0 for a key) and keys of every statement."""
    at = _end_of(_BLANK, text, 0)
    while at < len(text):
        start = at
        header = 2 if text.startswith("[[", at) else 1 if text[at] == "[" else 0
        at = _end_of(re.compile(r"[ \t]*"), text, at + header)
        keys, at = _dotted(text, at)
        yield start, header, keys
        at = _end_of(_BLANK, text, _after(text, at + header))


def _dotted(text: str, at: int) -> tuple[list[str], int]:
    keys = []
    while match := _KEY.match(text, at):
        keys.append(_plain(match[0]))
        at = match.end()
        dot = _DOT.match(text, at)
        if dot is None:
            break
        at = dot.end()
    return keys, max(at, 0)


def _plain(key: str) -> str:
    return next(iter(tomllib.loads(f"{key} = 0"))) if key[:1] in "\"'" else key


def _after(text: str, at: int) -> int:
    """The end of a statement's line: the first line break outside strings and brackets."""
    depth = 0
    while at < len(text):
        sign = text[at]
        if sign in "\"'":
            at = _end_of(_STRING, text, at)
            continue
        if sign == "#":
            at = _end_of(_SKIPPED, text, at)
            continue
        if sign == "\n" and depth <= 0:
            return at
        depth += (sign in "[{") - (sign in "]}")
        at += 1
    return at


def _end_of(pattern: re.Pattern[str], text: str, at: int) -> int:
    match = pattern.match(text, at)
    return at + 1 if match is None else match.end()
