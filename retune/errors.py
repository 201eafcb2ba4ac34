"""What went wrong, where, and what to do about it: one error class and one kind of finding.

The library raises `RetuneError`; only the command line turns it into text and an exit code.
A `Finding` is a doubt or a loss that does not stop the work.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import StrEnum


@dataclass(frozen=True, slots=True)
class Place:
    """Where in a score: file, part, printed bar number and beat, each where known.

    `line` is that of a text file, such as a score's choices.
    """

    file: str | None = None
    part: str | None = None
    bar: str | None = None
    beat: str | None = None
    line: int | None = None

    def __str__(self) -> str:
        named = [f"bar {self.bar}"] if self.bar is not None else []
        if self.beat is not None:
            named.append(f"beat {self.beat}")
        if self.part is not None:
            named.insert(0, self.part)
        if self.line is not None:
            named.insert(0, f"line {self.line}")
        inside = ", ".join(named)
        if self.file is None:
            return inside
        return f"{self.file}: {inside}" if inside else self.file


class RetuneError(Exception):
    """A failure the user can act on.

    Parameters
    ----------
    what : str
        What happened, and what was expected.
    where : Place
        File, part, bar and beat, as far as known.
    hint : str
        What to do next; may be empty.
    """

    def __init__(self, what: str, where: Place | None = None, hint: str = "") -> None:
        super().__init__(what, where, hint)
        self.what = what
        self.where = where or Place()
        self.hint = hint

    def in_file(self, file: str) -> RetuneError:
        """The same error, with the file named unless one is named already."""
        if self.where.file is not None:
            return self
        return type(self)(self.what, replace(self.where, file=file), self.hint)

    def __str__(self) -> str:
        where = str(self.where)
        text = f"{where}: {self.what}" if where else self.what
        return f"{text}. {self.hint}" if self.hint else text


class UnreadableError(RetuneError):
    """The input is not a score this tool can read."""


class LimitError(RetuneError):
    """The input is larger than a limit allows."""


class OutputError(RetuneError):
    """An output cannot be made or written."""


class WishError(RetuneError):
    """A wish that does not fit the score, such as a part name it does not have."""


class Weight(StrEnum):
    """How much a finding matters."""

    NOTE = "note"
    """An inference the user may want to know of."""
    DOUBT = "doubt"
    """The file allows two readings; one was chosen."""
    LOSS = "loss"
    """Something of the file was left out."""


@dataclass(frozen=True, slots=True)
class Finding:
    """A doubt, loss or inference met on the way, with its place."""

    weight: Weight
    what: str
    where: Place = Place()

    def __str__(self) -> str:
        where = str(self.where)
        return f"{self.weight}: {where}: {self.what}" if where else f"{self.weight}: {self.what}"
