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
_SPACE = re.compile(r"[ \t]*")
_VALUE = re.compile(r"[ \t]*=[ \t]*")


@dataclass(frozen=True, slots=True)
class Position:
    """A line and a column."""

    line: int
    column: int

    def __str__(self) -> str:
        return f"line {self.line}, column {self.column}"


@dataclass(frozen=True, slots=True)
class Statement:
    """One header or one key with its value; offsets into the text.

    `path` is the table that a header opens or that a key stands in, `keys` are empty for headers.
    `value` and `end` bound the value, without the comment behind it; of a header, the header.
    `line_end` is where its line ends.
    """

    path: Path
    keys: tuple[str, ...]
    start: int
    value: int
    end: int
    line_end: int


def statements(text: str) -> Iterator[Statement]:
    """All statements of a valid text, in order."""
    count: dict[Path, int] = {}
    table: Path = ()
    for start, header, keys, after_keys in _statements(text):
        if header:
            table = _open(count, keys, header == 2)
        value = start if header else _VALUE.match(text, after_keys).end()  # type: ignore[union-attr]
        end, line_end = _ends(text, after_keys + header if header else value)
        yield Statement(table, () if header else tuple(keys), start, value, end, line_end)


def positions(text: str) -> dict[Path, Position]:
    """The place of every table and of every key that begins a line of its own.

    >>> where = positions('title = "Psalm"\\n[[chord]]\\nat = "1:1"\\n[[chord]]\\nroot = "D"')
    >>> str(where["chord", 1, "root"])
    'line 5, column 1'
    """
    found: dict[Path, Position] = {}
    for one in statements(text):
        here = _position(text, one.start)
        found.setdefault(one.path, here)
        for length in range(1, len(one.keys) + 1):
            found.setdefault((*one.path, *one.keys[:length]), here)
    found.pop((), None)
    return found


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


def _statements(text: str) -> Iterator[tuple[int, int, list[str], int]]:
    """Start, brackets of the header (0 for a key), keys and their end, of every statement."""
    at = _end_of(_BLANK, text, 0)
    while at < len(text):
        start = at
        header = 2 if text.startswith("[[", at) else 1 if text[at] == "[" else 0
        at = _end_of(_SPACE, text, at + header)
        keys, at = _dotted(text, at)
        yield start, header, keys, at
        at = _end_of(_BLANK, text, _ends(text, at + header)[1])


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


def _ends(text: str, at: int) -> tuple[int, int]:
    """Where a value ends, and its line: the first line break outside strings and brackets."""
    depth, last = 0, at
    while at < len(text):
        sign = text[at]
        if sign == "\n" and depth <= 0:
            break
        if sign == "#":
            at = _end_of(_SKIPPED, text, at)
            continue
        if sign in "\"'":
            last = at = _end_of(_STRING, text, at)
            continue
        depth += (sign in "[{") - (sign in "]}")
        at += 1
        if not sign.isspace():
            last = at
    return last, at


def _end_of(pattern: re.Pattern[str], text: str, at: int) -> int:
    match = pattern.match(text, at)
    return at + 1 if match is None else match.end()
