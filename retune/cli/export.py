"""`retune export`: chosen outputs only."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from retune.cli.console import say, working, wrapped
from retune.cli.options import (
    bars_option,
    examples,
    grouped,
    score_argument,
    settings_option,
    source_of,
    talk_options,
    tuning_options,
)
from retune.cli.report import raise_last, report_findings, written_lines
from retune.errors import OutputError, WishError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from retune.choicesfile.model import ChoicesFile
    from retune.export.base import Output
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy


@click.command(
    "export",
    short_help="Chosen outputs only.",
    epilog=examples(
        "retune export hymn.musicxml --to midi -o out",
        "retune export hymn.musicxml --to scala --set scala.tables=4 -o tables",
        "retune export song.mid --to notes --prime-limit 7 -o out",
        "retune export hymn.musicxml --to midi -o - > hymn-just.mid",
    ),
)
@score_argument
@click.option(
    "--to",
    "exporters",
    multiple=True,
    required=True,
    metavar="NAME",
    help="Which output; may be repeated.",
)
@click.option(
    "-o",
    "--output",
    required=True,
    metavar="FOLDER",
    help="Folder to write to, or - for one file to standard output.",
)
@bars_option
@settings_option
@tuning_options
@talk_options
def command(
    score: Path,
    exporters: tuple[str, ...],
    output: str,
    bars: str | None,
    settings: tuple[tuple[str, str, str], ...],
    policy: Policy,
    reading: ReadOptions,
    choices: ChoicesFile | None,
    all_findings: bool,
    quiet: bool,
) -> None:
    """Write chosen outputs of one SCORE."""
    from retune import pipeline

    wishes = grouped(settings)
    if unused := set(wishes) - set(exporters):
        raise click.UsageError(
            f"--set speaks of {', '.join(sorted(unused))}, which --to leaves out"
        )
    chosen = tuple(dict.fromkeys(exporters))
    pipeline.check_wishes(chosen, wishes)
    source, name = source_of(score)
    with working(f"Tuning {name}", quiet):
        tuned = pipeline.retuned(source, name, reading, policy, choices)
        if bars:
            tuned = pipeline.cut(tuned, bars)
    failed: list[OutputError] = []
    if output == "-":
        notes = [_sent(pipeline.exported(pipeline.takes_of(tuned), chosen, wishes))]
    else:
        with working("Writing", quiet):
            notes = written_lines(pipeline.write(tuned, chosen, output, wishes, failed))
    if not quiet:
        report_findings(tuned, all_findings)
        say("\n".join(notes))
    raise_last(failed)


def _sent(files: Sequence[Output]) -> str:
    """Send the only file to standard output, checked; returns what is to be said of it."""
    if len(files) != 1:
        raise WishError(
            f"standard output takes one file, and this makes {len(files)}",
            hint="Choose one output with a single file, such as --to midi, or give a folder",
        )
    (file,) = files
    data = file.data
    checked = file.check(data) if file.check is not None else ""
    sys.stdout.buffer.write(data)
    sys.stdout.buffer.flush()
    return wrapped("; ".join(line for line in (file.note, checked) if line))
