"""`retune watch`: everything for one piece, again at each save."""

from __future__ import annotations

import time
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from retune.cli.console import say, working
from retune.cli.options import (
    bars_option,
    examples,
    folder_option,
    score_argument,
    settings_option,
    talk_options,
    tuning_options,
)
from retune.cli.report import counted
from retune.cli.stacking import stacked
from retune.cli.track_options import track_options
from retune.errors import Place, RetuneError, UnreadableError

if TYPE_CHECKING:
    from retune.adapters.disk import WriteReport
    from retune.watch import Run


_OPTIONS = stacked(
    score_argument,
    folder_option,
    bars_option,
    track_options,
    settings_option,
    tuning_options,
    talk_options,
)


class _Remembering(click.Command):
    """Keeps its arguments, so that they can be understood anew at each save."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        """As every command does."""
        ctx.meta[_ARGUMENTS] = tuple(args)
        return super().parse_args(ctx, args)


_ARGUMENTS = "retune.watch.arguments"


@click.command("watch")
@_OPTIONS
def once(score: Path, quiet: bool, **wishes: Any) -> WriteReport:
    """One making; the choices and the tables that options name are read with it."""
    from retune.cli.learning import learn
    from retune.pipeline import ALL_OUTPUTS

    with working(f"Making {score}", quiet):
        return learn("watch", ALL_OUTPUTS, score, quiet=True, **wishes)


@click.command(
    "watch",
    cls=_Remembering,
    short_help="As make, again at each save.",
    epilog=examples(
        "retune watch hymn.musicxml",
        "retune watch hymn.musicxml -o ~/choir/hymn --audio none",
        "retune watch psalm.mxl --accompaniment-tuning organ.scl --part Alto",
    ),
)
@_OPTIONS
def command(score: Path, quiet: bool, **wishes: Any) -> None:
    """Write everything for one SCORE as `retune make` does, and again at each save of it, of
    its choices, or of the .scl file named with --accompaniment-tuning.

    Each run is told in one line. A score or choices that cannot be read, half saved or gone, are
    told too and waited for. Ctrl-C ends it: with exit code 0 while it waits, with 130 where it
    cuts a run short, which leaves the folder as it was.
    """
    from retune.watch import watch, watched_files

    if str(score) == "-":
        raise click.UsageError("watch needs a file, not standard input")
    if not score.is_file():
        raise UnreadableError("there is no such file", Place(str(score)), "Check the path")
    ctx = click.get_current_context()
    arguments = ctx.meta[_ARGUMENTS]
    tuning = ctx.params["accompaniment_tuning"]
    others = [Path(tuning)] if tuning.lower().endswith(".scl") else []
    if (choices := wishes["choices"]) is not None:
        others.append(choices.path)
    busy = False

    def make() -> WriteReport:
        nonlocal busy
        busy = True
        with once.make_context("watch", list(arguments), parent=ctx.parent) as fresh:
            report: WriteReport = once.invoke(fresh)
        busy = False
        return report

    if not quiet:
        say(f"Watching {score}; Ctrl-C ends it")
    try:
        for run in watch(watched_files(score, others), make):
            busy = False
            if run.error is not None or not quiet:
                say(line_of(run, score))
    except KeyboardInterrupt:
        if busy:
            raise


def line_of(run: Run, score: Path) -> str:
    """A run in one line: when it ended, what it wrote or what went wrong, how long it took."""
    now = time.strftime("%H:%M:%S")
    if run.report is None:
        return f"{now}  {_words(run.error, score)}; waiting for the next save"
    files = counted(len(run.report.written), "file")
    return f"{now}  {files} to {run.report.folder} in {run.seconds:.1f} s"


def _words(error: Exception | None, score: Path) -> str:
    if isinstance(error, RetuneError):
        where = f"{error.where}: " if str(error.where) else ""
        return " ".join(f"{where}{error.what}".split())
    fault = f"a fault inside retune ({type(error).__name__}: {error})"
    return " ".join(f"{score}: {fault}, see retune make --debug".split())
