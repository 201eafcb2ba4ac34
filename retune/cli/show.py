"""`retune show`: the piece chord by chord, then the figures."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from retune.cli.console import width, working
from retune.cli.options import (
    bars_option,
    examples,
    score_argument,
    source_of,
    talk_options,
    tuning_options,
)
from retune.cli.report import report_findings, summary

if TYPE_CHECKING:
    from retune.choicesfile.model import ChoicesFile
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy


@click.command(
    "show",
    short_help="The piece chord by chord, and its figures.",
    epilog=examples(
        "retune show hymn.musicxml",
        "retune show hymn.musicxml --bars 17-24",
        "retune show hymn.musicxml --rehearsal-notes --part Alto",
        "retune show hymn.musicxml --drift follow > follow.txt",
    ),
)
@score_argument
@bars_option
@click.option("--figures-only", is_flag=True, help="Leave out the chord table.")
@click.option(
    "--rehearsal-notes",
    "rehearsing",
    is_flag=True,
    help="Instead, the places hardest to tune, why, and what to listen for.",
)
@click.option("--part", metavar="NAME", help="Only the rehearsal notes for this part.")
@tuning_options
@talk_options
def command(
    score: Path,
    bars: str | None,
    figures_only: bool,
    rehearsing: bool,
    part: str | None,
    policy: Policy,
    reading: ReadOptions,
    choices: ChoicesFile | None,
    all_findings: bool,
    quiet: bool,
) -> None:
    """Show one SCORE chord by chord: where each part sings each note, then the figures."""
    from retune import pipeline
    from retune.cli.chordtable import table
    from retune.cli.figures import figures
    from retune.cli.rehearsal import rehearsal_lines
    from retune.score.excerpt import bar_range

    if part is not None and not rehearsing:
        raise click.UsageError("--part goes with --rehearsal-notes")
    source, name = source_of(score)
    with working(f"Tuning {name}", quiet):
        tuned = pipeline.retuned(source, name, reading, policy, choices)
    wanted = bar_range(tuned.score, bars) if bars else None
    lines = [summary(tuned), ""]
    if rehearsing:
        lines += rehearsal_lines(tuned, width(), wanted, part)
    else:
        if not figures_only:
            lines += [*table(tuned, width(), wanted), ""]
        lines += figures(tuned, width())
    click.echo("\n".join(lines))
    if not quiet:
        report_findings(tuned, all_findings)
