"""Reading a choices file: every mistake by line and column, all at once."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from retune.choicesfile.kinds import WrongValueError, meant
from retune.choicesfile.model import ChoicesFile, Entry
from retune.choicesfile.positions import Path as KeyPath
from retune.choicesfile.positions import Position, positions
from retune.choicesfile.schema import DECISIONS, PIECE, SECTIONS, Table
from retune.errors import Place, UnreadableError

ENDING = ".choices.toml"
MOST_BYTES = 4_000_000
_MOST_MISTAKES = 12


def load(path: Path) -> ChoicesFile:
    """Read a choices file.

    Raises
    ------
    UnreadableError
        It is not there, is no TOML, or says what cannot be; every mistake is named with its line
        and column, and what is allowed there.
    """
    try:
        with path.open("rb") as file:
            data = file.read(MOST_BYTES + 1)
    except OSError as error:
        raise UnreadableError(
            f"the choices cannot be read: {error.strerror}", Place(str(path)), "Check the path"
        ) from None
    if len(data) > MOST_BYTES:
        raise UnreadableError(f"larger than {MOST_BYTES} bytes", Place(str(path)))
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        raise UnreadableError(
            "the choices are no UTF-8 text", Place(str(path)), "Save the file as UTF-8"
        ) from None
    return loads(text, path)


def loads(text: str, path: Path) -> ChoicesFile:
    """Read the text of a choices file; raises as `load` does."""
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise UnreadableError(
            str(error), Place(str(path)), 'Texts stand in quotes, as in root = "D"'
        ) from None
    except (RecursionError, ValueError) as error:
        raise UnreadableError(f"this is no choices file: {error}", Place(str(path))) from None
    reader = _Reader(path, text, positions(text))
    found = reader.read(document)
    if reader.mistakes:
        raise _unreadable(path, reader.mistakes)
    return found


def _unreadable(path: Path, mistakes: list[tuple[Position, str]]) -> UnreadableError:
    mistakes.sort(key=lambda one: (one[0].line, one[0].column))
    lines = [f"{position}: {what}" for position, what in mistakes[:_MOST_MISTAKES]]
    if len(mistakes) > _MOST_MISTAKES:
        lines.append(f"and {len(mistakes) - _MOST_MISTAKES} more")
    return UnreadableError(
        "; ".join(lines), Place(str(path)), "Correct these, or put # before the lines"
    )


class _Reader:
    """Checks one document and gathers its mistakes."""

    def __init__(self, path: Path, text: str, where: Mapping[KeyPath, Position]) -> None:
        self.path, self.text, self.where = path, text, where
        self.mistakes: list[tuple[Position, str]] = []

    def read(self, document: Mapping[str, Any]) -> ChoicesFile:
        """All of it, as far as it is right."""
        piece = {name: value for name, value in document.items() if not _is_table(value)}
        known = (*PIECE, *SECTIONS, *DECISIONS)
        sections: dict[str, Mapping[str, Any]] = {}
        entries: list[Entry] = []
        for name, value in document.items():
            if name in SECTIONS and isinstance(value, dict):
                sections[name] = self._values((name,), SECTIONS[name], value)
            elif name in DECISIONS and _is_tables(value):
                entries += self._entries(name, value)
            elif name in SECTIONS:
                self._mistake((name,), f"'{name}' is a section; write [{name}]")
            elif name in DECISIONS:
                self._mistake((name,), f"'{name}' stands in double brackets; write [[{name}]]")
            elif name not in PIECE:
                self._mistake((name,), f"there is no '{name}'{_or(name, known)}")
        tuning = document.get("tuning")
        tuning = tuning if isinstance(tuning, dict) else {}
        if "drift_within" in tuning and tuning.get("drift") != "within":
            what = 'drift_within goes with drift = "within"'
            self._mistake(("tuning", "drift_within"), what)
        own = {name: piece[name] for name in piece if name in PIECE}
        lines = {
            (name, key): self._position((name, key)).line
            for name, values in sections.items()
            for key in values
        }
        return ChoicesFile(
            self.path,
            self.text,
            self._values((), PIECE, own),
            sections,
            tuple(entries),
            lines,
        )

    def _entries(self, name: str, tables: list[Mapping[str, Any]]) -> Iterator[Entry]:
        for index, values in enumerate(tables):
            path: KeyPath = (name, index)
            before = len(self.mistakes)
            read = self._values(path, DECISIONS[name], values)
            table = DECISIONS[name]
            missing = [key for key, one in table.items() if one.needed and key not in values]
            for key in missing:
                help_ = DECISIONS[name][key].help
                self._mistake(path, f"[[{name}]] needs '{key}': {help_}")
            decides = [key for key in values if key not in _PLACING]
            if name in _DECIDING and not decides:
                others = ", ".join(f"'{key}'" for key in DECISIONS[name] if key not in _PLACING)
                self._mistake(path, f"[[{name}]] decides nothing; give it {others}")
            if len(self.mistakes) == before:
                yield Entry(name, index, self._position(path).line, read)

    def _values(self, path: KeyPath, table: Table, values: Mapping[str, Any]) -> dict[str, Any]:
        read = {}
        for key, value in values.items():
            if key not in table:
                inside = f" in {_brackets(path)}" if path else ""
                self._mistake((*path, key), f"there is no '{key}'{inside}{_or(key, table)}")
                continue
            try:
                read[key] = table[key].kind(value)
            except WrongValueError as error:
                self._mistake((*path, key), f"{key}: {error}")
        return read

    def _position(self, path: KeyPath) -> Position:
        while path and path not in self.where:
            path = path[:-1]
        return self.where.get(path, Position(1, 1))

    def _mistake(self, path: KeyPath, what: str) -> None:
        self.mistakes.append((self._position(path), what))


_PLACING = frozenset({"at", "bars", "pass", "sounds", "ends", "beats"})
_DECIDING = ("chord", "passage")
"""Tables that say nothing by their place alone."""


def _brackets(path: KeyPath) -> str:
    """A table as its header has it."""
    return f"[[{path[0]}]]" if path[0] in DECISIONS else f"[{path[0]}]"


def _is_table(value: Any) -> bool:
    return isinstance(value, dict) or _is_tables(value)


def _is_tables(value: Any) -> bool:
    return isinstance(value, list) and bool(value) and all(isinstance(one, dict) for one in value)


def _or(name: str, known: Any) -> str:
    """What was perhaps meant, else all there is."""
    return meant(name, known) or f"; there are {', '.join(known)}"
