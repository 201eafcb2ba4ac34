"""`retune make`: everything for one piece."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from retune.cli.console import say, working
from retune.cli.options import (
    examples,
    grouped,
    score_argument,
    settings_option,
    source_of,
    talk_options,
    tuning_options,
)
from retune.cli.report import report_findings, summary, written_lines

if TYPE_CHECKING:
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy


@click.command(
    "make",
    short_help="Everything for one piece, in one folder.",
    epilog=examples(
        "retune make hymn.musicxml",
        "retune make hymn.musicxml -o ~/choir/hymn --drift anchored",
        "retune make song.mid --prime-limit 7 --melody Lead",
    ),
)
@score_argument
@click.option(
    "-o",
    "--output",
    type=click.Path(path_type=Path),
    metavar="FOLDER",
    help="Folder to write to.  [default: named after the score, beside it]",
)
@settings_option
@tuning_options
@talk_options
def command(
    score: Path,
    output: Path | None,
    settings: tuple[tuple[str, str, str], ...],
    policy: Policy,
    reading: ReadOptions,
    all_findings: bool,
    quiet: bool,
) -> None:
    """Write everything for one SCORE: MIDI, tuning tables, note list, and how to use them."""
    from retune import pipeline

    wishes = grouped(settings)
    if unused := set(wishes) - set(pipeline.ALL_OUTPUTS):
        raise click.UsageError(
            f"--set speaks of {', '.join(sorted(unused))}, which make does not write"
        )
    pipeline.check_wishes(pipeline.ALL_OUTPUTS, wishes)
    if output is None and str(score) == "-":
        raise click.UsageError("a score from standard input needs -o FOLDER")
    source, name = source_of(score)
    with working(f"Tuning {name}", quiet):
        tuned = pipeline.retuned(source, name, reading, policy)
    folder = output if output is not None else score.parent / tuned.score.stem
    with working("Writing", quiet):
        report = pipeline.make(tuned, folder, wishes)
    if not quiet:
        say(summary(tuned))
        report_findings(tuned, all_findings)
        say("\n".join(written_lines(report)))
