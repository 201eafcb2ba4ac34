"""`retune choices`: the choices file of a score, proposed or brought up to date."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from retune.cli.choices_option import choices_beside
from retune.cli.console import say, working
from retune.cli.options import examples, score_argument, source_of, talk_options, tuning_options
from retune.cli.report import counted, report_findings
from retune.errors import OutputError, Place

if TYPE_CHECKING:
    from retune.choicesfile.model import ChoicesFile
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy


@click.command(
    "choices",
    short_help="The director's decisions, to edit and to keep.",
    epilog=examples(
        "retune choices hymn.musicxml",
        "retune choices hymn.musicxml --update",
        "retune choices hymn.musicxml -o - | less",
    ),
)
@score_argument
@click.option(
    "-o",
    "--output",
    metavar="FILE",
    help="Where to write it, or - for standard output.  [default: beside SCORE]",
)
@click.option("--update", is_flag=True, help="Bring the file that is there up to date with SCORE.")
@click.option("--overwrite", is_flag=True, help="Replace a file that is there by new proposals.")
@tuning_options
@talk_options
def command(
    score: Path,
    output: str | None,
    update: bool,
    overwrite: bool,
    policy: Policy,
    reading: ReadOptions,
    choices: ChoicesFile | None,
    all_findings: bool,
    quiet: bool,
) -> None:
    """Write NAME.choices.toml beside SCORE: the present analysis as proposals, chords in doubt
    first, and every setting with what it means. As written it changes nothing.

    With --update, the decisions in the file stay, and each is written anew where its music is
    now: after bars were inserted, parts renamed, or the piece transposed.
    """
    from retune import pipeline

    if update and overwrite:
        raise click.UsageError("--update keeps what is there, --overwrite replaces it")
    if output is None and str(score) == "-":
        raise click.UsageError("a score from standard input needs -o FILE")
    path = None if output == "-" else Path(output) if output else choices_beside(score)
    source, name = source_of(score)
    if update:
        if choices is None:
            raise OutputError(
                "there are no choices to update",
                Place(str(choices_beside(score))),
                "Write them with retune choices, or name a file with --choices",
            )
        with working(f"Reading {name}", quiet):
            tuned, fresh = pipeline.updated_choices(source, name, reading, policy, choices)
        path = None if output == "-" else Path(output) if output else choices.path
        text, what = fresh.text, f"{counted(fresh.changed, 'decision')} written anew"
    else:
        _refuse(path, overwrite)
        with working(f"Tuning {name}", quiet):
            tuned, text = pipeline.proposed_choices(source, name, reading, policy)
        doubtful = sum(chord.doubtful for chord in tuned.harmony.chords)
        what = f"{counted(doubtful, 'chord')} in doubt"
    if path is None:
        sys.stdout.write(text)
    else:
        pipeline.write_text(path, text)
    if not quiet:
        report_findings(tuned, all_findings)
        say(f"{what}" if path is None else f"Wrote {path}: {what}")


def _refuse(path: Path | None, overwrite: bool) -> None:
    """Raise `OutputError` where decisions would be lost."""
    if path is not None and path.exists() and not overwrite:
        raise OutputError(
            "this file is there already and was left as it is",
            Place(str(path)),
            "Bring it up to date with --update, print new proposals with -o -, or replace it "
            "with --overwrite",
        )
