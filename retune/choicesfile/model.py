"""A choices file as read: settings of the piece, and decisions with the lines they stand on."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from retune.errors import Place


@dataclass(frozen=True)
class Entry:
    """One decision: the table it stands in, which of these it is from 0, its line, its values."""

    table: str
    index: int
    line: int
    values: Mapping[str, Any]

    def get(self, name: str) -> Any:
        """A value, or None."""
        return self.values.get(name)


@dataclass(frozen=True)
class ChoicesFile:
    """All that a choices file says.

    Parameters
    ----------
    path : Path
    text : str
        The file as it stands.
    piece : mapping
        Title and reference pitch.
    sections : mapping of str to mapping
        The settings of `tuning`, `parts`, `playing` and `tracks`.
    entries : tuple of Entry
        Decisions in the order of the file's tables.
    lines : mapping
        Lines of the sections' settings, by (section, name).
    """

    path: Path
    text: str = ""
    piece: Mapping[str, Any] = field(default_factory=dict)
    sections: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    entries: tuple[Entry, ...] = ()
    lines: Mapping[tuple[str, str], int] = field(default_factory=dict)

    def section(self, name: str) -> Mapping[str, Any]:
        """A section's settings; empty where the file has none."""
        return self.sections.get(name, {})

    def of(self, table: str) -> tuple[Entry, ...]:
        """The decisions of one kind."""
        return tuple(entry for entry in self.entries if entry.table == table)

    def place(self, line: int | None) -> Place:
        """A line of the file, for errors and findings."""
        return Place(self.path.name, line=line or None)
