"""What `make` and `tracks` share: from a score to a folder of learning tracks."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from retune.cli.console import progress_bar, say, working
from retune.cli.options import grouped, source_of
from retune.cli.report import raise_last, report_findings, summary, written_lines
from retune.errors import OutputError

if TYPE_CHECKING:
    from retune.adapters.disk import WriteReport
    from retune.choicesfile.model import ChoicesFile
    from retune.cli.track_options import Practice
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy


def learn(
    command: str,
    outputs: tuple[str, ...],
    score: Path,
    output: Path | None,
    settings: tuple[tuple[str, str, str], ...],
    bars: str | None,
    policy: Policy,
    reading: ReadOptions,
    practice: Practice,
    choices: ChoicesFile | None,
    all_findings: bool,
    quiet: bool,
) -> WriteReport:
    """Write the outputs of one score into a folder; `output` None is a folder beside it."""
    from retune import pipeline

    chosen = practice.outputs(outputs)
    given = grouped(settings)
    if unused := set(given) - set(chosen):
        raise click.UsageError(
            f"--set speaks of {', '.join(sorted(unused))}, which {command} does not write"
        )
    wishes = practice.settings(given)
    pipeline.check_wishes(chosen, wishes)
    if output is None and str(score) == "-":
        raise click.UsageError("a score from standard input needs -o FOLDER")
    source, name = source_of(score)
    with working(f"Tuning {name}", quiet):
        tuned = pipeline.retuned(source, name, reading, policy, choices)
        if bars:
            tuned = pipeline.cut(tuned, bars)
        takes = pipeline.learning_tracks(tuned, practice.tracks)
    folder = output if output is not None else score.parent / tuned.score.stem
    failed: list[OutputError] = []
    with progress_bar("Writing", quiet) as progress:
        report = pipeline.write_learning(
            takes, folder, chosen, wishes, practice.archives, progress, failed
        )
    if not quiet:
        say(summary(tuned))
        report_findings(tuned, all_findings)
        say("\n".join(written_lines(report)))
    raise_last(failed)
    return report
