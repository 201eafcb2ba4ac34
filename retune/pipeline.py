"""The whole flow on one page: read -> analyse -> tune -> export -> write."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from retune.harmony import analyse
from retune.score.read import read, read_bytes
from retune.tracks.take import Take
from retune.tuning import tune

if TYPE_CHECKING:
    from retune.adapters.disk import WriteReport
    from retune.export.base import OutputFile
    from retune.score.options import ReadOptions
    from retune.tuning.model import TunedScore
    from retune.tuning.policy import Policy

Settings = Mapping[str, str]
"""Options of one exporter as text, by name."""

ALL_OUTPUTS = ("midi", "scala", "notes")
"""What `make` writes."""


def retuned(source: Path | bytes, name: str, reading: ReadOptions, policy: Policy) -> TunedScore:
    """Read, analyse and tune one score; `name` stands for the file in messages."""
    if isinstance(source, bytes):
        score = read_bytes(source, name, reading)
    else:
        score = read(source, reading)
    return tune(score, analyse(score, policy.tonic), policy)


def takes_of(tuned: TunedScore) -> tuple[Take, ...]:
    """The mixes of a piece: the full mix."""
    return (Take(tuned),)


def check_wishes(exporters: Sequence[str], settings: Mapping[str, Settings]) -> None:
    """Raise `WishError` for an unknown exporter or option, before any work is done."""
    from retune.export.registry import find_exporters, parse_options

    installed = find_exporters()
    for name in exporters:
        parse_options(installed.get(name), settings.get(name, {}))


def exported(
    takes: Sequence[Take], exporters: Sequence[str], settings: Mapping[str, Settings]
) -> list[OutputFile]:
    """Every file that the named exporters make of the takes; nothing touches the disk."""
    from retune.export.registry import find_exporters, parse_options

    installed = find_exporters()
    chosen = [installed.get(name) for name in exporters]
    options = [parse_options(one, settings.get(one.name, {})) for one in chosen]
    return [
        file
        for exporter, wish in zip(chosen, options, strict=True)
        for file in exporter.export(takes, wish)
    ]


def write(
    tuned: TunedScore,
    exporters: Sequence[str],
    folder: str | Path,
    settings: Mapping[str, Settings] | None = None,
) -> WriteReport:
    """Export a tuned score into a folder: all files or, on any failure, none.

    Parameters
    ----------
    exporters : sequence of str
        Names such as "midi", "scala", "notes".
    settings : mapping, optional
        Exporter name -> option name -> value as text, as in ``{"midi": {"channels": "one"}}``.

    Raises
    ------
    OutputError
        The folder cannot be written, or a file of the same name is not the tool's own.
    WishError
        No such exporter or option.
    """
    from retune.adapters.disk import write_all

    return write_all(exported(takes_of(tuned), exporters, settings or {}), Path(folder))


def make(
    tuned: TunedScore, folder: str | Path, settings: Mapping[str, Settings] | None = None
) -> WriteReport:
    """Write everything for one piece: all outputs and a text on how to use them.

    Raises as `write` does.
    """
    from retune.adapters.disk import write_all
    from retune.export.howto import how_to_use

    takes = takes_of(tuned)
    files = exported(takes, ALL_OUTPUTS, settings or {})
    return write_all([*files, how_to_use(takes, files)], Path(folder))
