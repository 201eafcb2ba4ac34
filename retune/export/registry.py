"""Which exporters are installed: the entry-point group `retune.exporters`.

Built-in exporters and foreign ones are found the same way. A plug-in that cannot be loaded or
breaks the contract of `retune.export.base.Exporter` is left out with a finding that names it.
"""

from __future__ import annotations

import importlib.metadata
import inspect
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from importlib.metadata import EntryPoint
from itertools import pairwise
from typing import Any

from retune.errors import Finding, OutputError, RetuneError, Weight, WishError
from retune.export.base import Exporter
from retune.export.options import did_you_mean, option_types, read_options, require_allowed

GROUP = "retune.exporters"


@dataclass(frozen=True, slots=True)
class Entry:
    """One exporter that works, and the distribution it comes from, with its version."""

    exporter: Exporter
    distribution: str


@dataclass(frozen=True, slots=True)
class Exporters:
    """All exporters that work, in order of name, and why others do not, by name."""

    entries: tuple[Entry, ...]
    broken: Mapping[str, str] = field(default_factory=dict)

    @property
    def findings(self) -> tuple[Finding, ...]:
        """One for each plug-in that cannot be used."""
        return tuple(Finding(Weight.LOSS, reason) for reason in self.broken.values())

    def get(self, name: str) -> Exporter:
        """The exporter of a name; raises `WishError` that lists what is installed."""
        return self.entry(name).exporter

    def entry(self, name: str) -> Entry:
        """The exporter of a name and its distribution; raises as `get` does."""
        for entry in self.entries:
            if entry.exporter.name == name:
                return entry
        if name in self.broken:
            raise WishError(self.broken[name], hint="Install it again, or remove it")
        names = [entry.exporter.name for entry in self.entries]
        installed = f"Installed are {', '.join(names)}" if names else "None is installed"
        hint = did_you_mean(name, names) + installed
        raise WishError(f"there is no output called '{name}'", hint=hint)


def find_exporters(entry_points: Iterable[EntryPoint] | None = None) -> Exporters:
    """Load every installed exporter.

    Parameters
    ----------
    entry_points : iterable of EntryPoint, optional
        What to look through; the installed ones of the group by default.

    Raises
    ------
    OutputError
        Two exporters have one name; both distributions are named.
    """
    if entry_points is None:
        entry_points = importlib.metadata.entry_points(group=GROUP)
    points = sorted(entry_points, key=lambda point: (point.name, _distribution(point)))
    for point, following in pairwise(points):
        if point.name == following.name:
            raise OutputError(
                f"two installed outputs are called {point.name}: "
                f"one of {_distribution(point)}, one of {_distribution(following)}",
                hint="Uninstall one of them",
            )
    entries: list[Entry] = []
    broken: dict[str, str] = {}
    for point in points:
        try:
            entries.append(Entry(_load(point), _distribution(point)))
        # Whatever a foreign module does while it loads must not stop the others.
        except (Exception, SystemExit) as error:
            reason = f"{type(error).__name__}: {error}".removeprefix("TypeError: ")
            broken[point.name] = (
                f"the output {point.name} of {_distribution(point)} cannot be used: {reason}"
            )
    return Exporters(tuple(entries), broken)


def parse_options(exporter: Exporter, texts: Mapping[str, str]) -> Any:
    """The exporter's `Options` from texts by name; raises `WishError` (see `read_options`).

    What the class itself refuses, with whatever exception, is a `WishError` too.
    """
    try:
        return read_options(exporter.name, exporter.Options, texts)
    except RetuneError:
        raise
    except Exception as error:
        reason = f"{type(error).__name__}: {error}".removeprefix("ValueError: ")
        raise WishError(f"the output {exporter.name} refuses its options: {reason}") from error


def _distribution(point: EntryPoint) -> str:
    if point.dist is None:
        return point.value
    return f"{point.dist.name} {point.dist.version}"


def _load(point: EntryPoint) -> Exporter:
    """Load and check one plug-in; raises `TypeError` where it breaks the contract."""
    loaded = point.load()
    if not isinstance(loaded, type):
        raise TypeError("it is no class")
    for attribute in ("name", "summary", "suffixes", "Options", "export"):
        if not hasattr(loaded, attribute):
            raise TypeError(f"it has no {attribute}")
    made = loaded()
    if made.name != point.name:
        raise TypeError(f"it calls itself {made.name!r}")
    if not isinstance(made.summary, str) or not made.summary.strip():
        raise TypeError("its summary is no text")
    if not _are_suffixes(made.suffixes):
        raise TypeError("its suffixes are no tuple of endings such as '.mid'")
    option_types(made.Options)
    require_allowed(point.name, made.Options())
    _require_explicit(made.export)
    exporter: Exporter = made
    return exporter


def _are_suffixes(found: object) -> bool:
    return (
        isinstance(found, tuple)
        and bool(found)
        and all(isinstance(suffix, str) and suffix.startswith(".") for suffix in found)
    )


def _require_explicit(export: Any) -> None:
    """`export` takes takes and options, by name; catch-all parameters would hide mistakes."""
    parameters = inspect.signature(export).parameters.values()
    kinds = {parameter.kind for parameter in parameters}
    if kinds & {inspect.Parameter.VAR_POSITIONAL, inspect.Parameter.VAR_KEYWORD}:
        raise TypeError("its export takes *args or **kwargs")
    needed = [one.name for one in parameters if one.default is inspect.Parameter.empty]
    if needed != ["takes", "options"]:
        raise TypeError(f"its export takes ({', '.join(needed)}), not (takes, options)")
