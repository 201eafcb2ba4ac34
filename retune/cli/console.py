"""Talking to the user: messages go to standard error, data to standard output."""

from __future__ import annotations

import os
import shutil
import sys
import textwrap
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager

import click

from retune.errors import Finding, Place, Weight

_COLOURS = {Weight.NOTE: "cyan", Weight.DOUBT: "yellow", Weight.LOSS: "red"}
MOST_FINDINGS = 12
"""How many findings are listed unless all are asked for."""


def width() -> int:
    """Columns to write for: the terminal's, or COLUMNS, or 80 where there is none."""
    return max(shutil.get_terminal_size((80, 24)).columns, 40)


def colour_wanted(stream: object) -> bool:
    """Whether a stream is a terminal that wants colour (NO_COLOR is honoured)."""
    is_terminal = getattr(stream, "isatty", lambda: False)()
    return bool(is_terminal) and not os.environ.get("NO_COLOR")


def wrapped(text: str, hanging: str = "") -> str:
    """Text broken at the width of the terminal."""
    return textwrap.fill(
        text, width(), subsequent_indent=hanging, break_long_words=False, break_on_hyphens=False
    )


def _to_stderr(text: str) -> None:
    click.echo(text, err=True, color=colour_wanted(sys.stderr))


def print_error(what: str, where: Place | None = None, hint: str = "") -> None:
    """An error: where it is, what it is, and on a line of its own what to do next."""
    place = f"{where}: " if where and str(where) else ""
    label = click.style("Error:", fg="red", bold=True)
    _to_stderr(label + wrapped(f"Error: {place}{what}", "  ").removeprefix("Error:"))
    if hint:
        _to_stderr(wrapped(f"  {hint}.", "  "))


def print_findings(findings: Sequence[Finding], everything: bool = False) -> None:
    """The doubts, losses and inferences met on the way; notes only where all are asked for."""
    shown = [f for f in findings if everything or f.weight is not Weight.NOTE]
    limit = len(shown) if everything else MOST_FINDINGS
    for finding in shown[:limit]:
        label = f"  {finding.weight}:"
        where = f"{place}: " if (place := _inside(finding.where)) else ""
        text = wrapped(f"{label} {where}{finding.what}", "    ").removeprefix(label)
        _to_stderr(click.style(label, fg=_COLOURS[finding.weight]) + text)
    hidden = len(findings) - min(len(shown), limit)
    if hidden:
        _to_stderr(f"  {hidden} more remark{'s' * (hidden > 1)} with --findings")


def _inside(place: Place) -> str:
    """Of a place, what is not plain: the score's own name is."""
    if place.line is not None:
        return str(place).replace(": ", ", ")
    return str(Place(None, place.part, place.bar, place.beat))


def say(text: str) -> None:
    """A plain message."""
    _to_stderr(text)


@contextmanager
def working(what: str, quiet: bool) -> Iterator[None]:
    """Show on a terminal what is being done, and wipe it away afterwards."""
    live = not quiet and sys.stderr.isatty()
    if live:
        click.echo(f"\r{what} …", err=True, nl=False)
    try:
        yield
    finally:
        if live:
            click.echo("\r" + " " * (len(what) + 2) + "\r", err=True, nl=False)


@contextmanager
def progress_bar(what: str, quiet: bool) -> Iterator[Callable[[int, int], None] | None]:
    """Show on a terminal how much is done; yields what is to be told (done, of all) from 0 on."""
    if quiet or not sys.stderr.isatty():
        yield None
        return
    with click.progressbar(
        length=1, label=what, file=sys.stderr, width=0, show_eta=False, show_pos=True
    ) as bar:

        def tell(done: int, of: int) -> None:
            bar.length = of
            bar.update(done - bar.pos)

        yield tell
