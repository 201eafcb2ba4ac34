"""What an exporter is: a class that turns takes into named bytes and never touches the disk."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any, ClassVar, Protocol

from retune.tracks.take import Take


@dataclass(frozen=True)
class OutputFile:
    """One file to be written.

    Parameters
    ----------
    name : str
        Relative to the output folder, with / between folders and the ending.
    data : bytes
        The whole content.
    note : str
        One line for the user, such as the greatest rounding error; may be empty.
    check : callable or None
        Called with the bytes as read back from disk, before the file takes its final name.
        Returns a line for the user; raises `OutputError` where they do not mean what the
        tuned score says.
    series : str
        A numbered set that the file belongs to, such as the tables of one piece. Files that an
        earlier run wrote in the same series and this run does not are taken away.
    """

    name: str
    data: bytes
    note: str = ""
    check: Callable[[bytes], str] | None = None
    series: str = ""


@dataclass(frozen=True)
class LateFile:
    """A file whose bytes are made when they are wanted, such as sound.

    Names are known at once, so that nothing is rendered that could not be written; bytes of
    several files may be asked for at the same time, from several threads, and each once.

    Parameters
    ----------
    name, note, check, series
        As of `OutputFile`.
    render : callable
        Makes the whole content.
    """

    name: str
    render: Callable[[], bytes]
    note: str = ""
    check: Callable[[bytes], str] | None = None
    series: str = ""

    @property
    def data(self) -> bytes:
        """The whole content, made anew each time."""
        return self.render()


Output = OutputFile | LateFile


class Exporter(Protocol):
    """The contract of an exporter plug-in (entry-point group `retune.exporters`).

    `Options` is a frozen dataclass whose fields have defaults and, in their metadata, a
    one-line "help". All takes of a piece come at once, so that work can be shared.
    """

    name: ClassVar[str]
    summary: ClassVar[str]
    suffixes: ClassVar[tuple[str, ...]]
    Options: ClassVar[type[Any]]

    def export(self, takes: Sequence[Take], options: Any) -> Iterator[Output]:
        """Yield the files; raises `OutputError` naming bar and beat where it cannot."""
        ...
