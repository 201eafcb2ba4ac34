"""How a score is read, as options."""

from __future__ import annotations

from typing import Any

import click

from retune.cli.stacking import gathered, stacked
from retune.errors import WishError
from retune.limits import Limits
from retune.score.options import ReadOptions
from retune.score.pace import Pace
from retune.score.transpose import FURTHEST

_MEGABYTE = 1024 * 1024


class SemitonesType(click.IntRange):
    """Semitones up or down."""

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> int:
        """A whole number in range."""
        try:
            return int(super().convert(value, param, ctx))
        except click.BadParameter:
            allowed = f"a whole number of semitones from {self.min} to {self.max}"
            self.fail(f"'{value}' is not {allowed}", param, ctx)


class PaceType(click.ParamType[Any]):
    """A share of the score's tempo, or beats a minute."""

    name = "tempo"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Pace:
        """A pace from its text."""
        if isinstance(value, Pace):
            return value
        try:
            return Pace.parse(value)
        except WishError as error:
            self.fail(f"{error.what}. {error.hint}.", param, ctx)


_READING = stacked(
    click.option(
        "--accompaniment",
        multiple=True,
        metavar="PART",
        help="A part whose pitch cannot move; may be repeated.",
    ),
    click.option(
        "--repeats/--no-repeats", default=True, show_default=True, help="Play repeats and jumps."
    ),
    click.option(
        "--fermatas/--no-fermatas", default=True, show_default=True, help="Hold the fermatas."
    ),
    click.option(
        "--transpose",
        type=SemitonesType(-FURTHEST, FURTHEST),
        metavar="SEMITONES",
        default=0,
        help="Move everything up, as 2, or down, as -2.",
    ),
    click.option(
        "--tempo",
        type=PaceType(),
        metavar="PERCENT%|BEATS",
        help="A share of the score's tempo, as 80%, or a steady one, as 92 beats a minute.",
    ),
    click.option(
        "--piece", type=click.IntRange(1), metavar="N", help="Which piece of a file with several."
    ),
    click.option(
        "--max-megabytes",
        type=click.FloatRange(0, min_open=True),
        metavar="N",
        default=f"{Limits().max_bytes / _MEGABYTE:g}",
        show_default=True,
        help="Largest score, unzipped.",
    ),
    click.option(
        "--max-notes",
        type=click.IntRange(1),
        metavar="N",
        default=Limits().max_notes,
        show_default=True,
        help="Most notes, repeats played out.",
    ),
    click.option(
        "--max-minutes",
        type=click.FloatRange(0, min_open=True),
        metavar="N",
        default=f"{Limits().max_seconds / 60:g}",
        show_default=True,
        help="Longest playing time.",
    ),
)

_READING_NAMES = (
    "accompaniment",
    "repeats",
    "fermatas",
    "transpose",
    "tempo",
    "piece",
    "max_megabytes",
    "max_notes",
    "max_minutes",
)


def _reading(wishes: dict[str, Any]) -> ReadOptions:
    limits = Limits(
        max_bytes=int(wishes["max_megabytes"] * _MEGABYTE),
        max_notes=wishes["max_notes"],
        max_seconds=wishes["max_minutes"] * 60,
    )
    return ReadOptions(
        repeats=wishes["repeats"],
        fermatas=wishes["fermatas"],
        accompaniment=wishes["accompaniment"],
        piece=wishes["piece"],
        transpose=wishes["transpose"],
        tempo=wishes["tempo"] or Pace(),
        limits=limits,
    )


reading_options = gathered(_READING, _READING_NAMES, "reading", _reading)
"""Options on reading; the command gets `reading`."""
