"""Arguments and options that several commands share, defined once."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

import click

from retune.cli.choices_option import choices_option
from retune.cli.policy_options import policy_options
from retune.cli.reading_options import reading_options
from retune.cli.stacking import Command, stacked

STDIN_NAME = "standard input"


def tuning_options(command: Command) -> Command:
    """Options on reading and tuning; the command gets `reading`, `policy` and `choices`."""
    return choices_option(policy_options(reading_options(command)))


score_argument = click.argument(
    "score", type=click.Path(path_type=Path, allow_dash=True), is_eager=True
)
"""SCORE: a file, or - for standard input."""

folder_option = click.option(
    "-o",
    "--output",
    type=click.Path(path_type=Path),
    metavar="FOLDER",
    help="Folder to write to.  [default: named after the score, beside it]",
)

bars_option = click.option(
    "--bars", metavar="A-B", help="Only these bars: printed numbers or rehearsal letters."
)

talk_options = stacked(
    click.option("--findings", "all_findings", is_flag=True, help="List every remark."),
    click.option("-q", "--quiet", is_flag=True, help="Say nothing but errors."),
    click.option(
        "--debug", is_flag=True, help="Show the traceback of a fault.", expose_value=False
    ),
)


def source_of(score: Path) -> tuple[Path | bytes, str]:
    """What to read, and its name in messages: a path, or the bytes of standard input."""
    if str(score) == "-":
        return sys.stdin.buffer.read(), STDIN_NAME
    return score, str(score)


class SettingType(click.ParamType[Any]):
    """EXPORTER.OPTION=VALUE."""

    name = "exporter.option=value"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> tuple[str, str, str]:
        """Exporter, option and value as text."""
        if isinstance(value, tuple):
            return value
        key, equals, setting = value.partition("=")
        exporter, dot, option = key.partition(".")
        if not (equals and dot and exporter and option):
            self.fail(f"'{value}' is not of the form EXPORTER.OPTION=VALUE", param, ctx)
        return exporter, option.replace("-", "_"), setting


settings_option = click.option(
    "--set",
    "settings",
    type=SettingType(),
    multiple=True,
    metavar="EXPORTER.OPTION=VALUE",
    help="An option of one output, as midi.channels=one; see retune exporters.",
)


def grouped(settings: tuple[tuple[str, str, str], ...]) -> dict[str, dict[str, str]]:
    """Settings by exporter."""
    found: dict[str, dict[str, str]] = {}
    for exporter, option, value in settings:
        found.setdefault(exporter, {})[option] = value
    return found


def examples(*lines: str) -> str:
    """An epilog of real commands, kept as they are in the help."""
    return "\b\nExamples:\n" + "\n".join(f"  {line}" for line in lines)
