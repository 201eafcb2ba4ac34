"""Exporters held to their contract while they work.

What a plug-in does wrong (an exception of its own, a file that is no file, a name that leads out
of the folder, contents that are no bytes) becomes an `OutputError` that says which output of
which distribution failed; nothing is written then. A `RetuneError` that it raises itself passes
as it is, and the cause stands behind every other for `--debug`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from typing import Any, TypeVar

from retune.adapters.filenames import check_names
from retune.errors import OutputError, RetuneError
from retune.export.base import LateFile, Output, OutputFile
from retune.export.registry import Entry
from retune.tracks.take import Take

Made = TypeVar("Made", bytes, str)


def files_of(entry: Entry, takes: Sequence[Take], options: Any) -> list[Output]:
    """All files that one exporter makes of the takes, each guarded until it is on the disk.

    Raises
    ------
    OutputError
        The exporter failed or broke its contract; it is named, with its distribution.
    RetuneError
        What the exporter raises itself.
    """
    with _blamed(entry):
        made = [_guarded(entry, file) for file in entry.exporter.export(takes, options)]
    try:
        check_names([file.name for file in made])
    except OutputError as error:
        raise _fault(entry, f"made what cannot be written: {error.what}") from None
    return made


def _guarded(entry: Entry, file: object) -> Output:
    """The same file, whose late contents and check are watched too; raises `OutputError`."""
    if not isinstance(file, OutputFile | LateFile):
        raise _fault(entry, f"made a {_kind(file)} where a file was expected")
    for what, value in (("name", file.name), ("note", file.note), ("series", file.series)):
        if not isinstance(value, str):
            raise _fault(entry, f"made a file whose {what} is a {_kind(value)}, not text")
    if file.check is not None and not callable(file.check):
        raise _fault(entry, f"made a file whose check is a {_kind(file.check)}: {file.name}")
    check = None if file.check is None else _checking(entry, file.name, file.check)
    if isinstance(file, LateFile):
        return replace(file, render=_rendering(entry, file.name, file.render), check=check)
    return replace(file, data=_required(entry, file.name, file.data, bytes), check=check)


def _rendering(entry: Entry, name: str, render: Callable[[], bytes]) -> Callable[[], bytes]:
    def guarded() -> bytes:
        with _blamed(entry, name):
            return _required(entry, name, render(), bytes)

    return guarded


def _checking(entry: Entry, name: str, check: Callable[[bytes], str]) -> Callable[[bytes], str]:
    def guarded(data: bytes) -> str:
        with _blamed(entry, name):
            return _required(entry, name, check(data), str)

    return guarded


def _required(entry: Entry, name: str, value: object, kind: type[Made]) -> Made:
    if isinstance(value, kind):
        return value
    what = "holds" if kind is bytes else "is checked with"
    raise _fault(entry, f"made a file that {what} a {_kind(value)}, not {kind.__name__}: {name}")


@contextmanager
def _blamed(entry: Entry, name: str = "") -> Iterator[None]:
    """Turn whatever a plug-in raises, except for `RetuneError`, into an error that names it."""
    try:
        yield
    except RetuneError:
        raise
    # Foreign code may raise anything, and may call sys.exit.
    except (Exception, SystemExit) as error:
        where = f" at {name}" if name else ""
        raise _fault(entry, f"failed{where}: {type(error).__name__}: {error}") from error


def _fault(entry: Entry, what: str) -> OutputError:
    return OutputError(
        f"the output {entry.exporter.name} of {entry.distribution} {what}",
        hint="Leave this output out; its makers can use what --debug prints",
    )


def _kind(value: object) -> str:
    return type(value).__name__
