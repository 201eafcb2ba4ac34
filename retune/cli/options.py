"""Options that several commands share, defined once and handed on as one value each."""

from __future__ import annotations

import functools
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar

import click

from retune.errors import UnreadableError, WishError
from retune.limits import Limits
from retune.pitch import PitchClass
from retune.tuning.policy import (
    DEFAULT_DRIFT_WITHIN,
    DEFAULT_HELD_SHIFT,
    EQUAL_TUNING,
    NO_BOUND,
    Drift,
    FixedTuning,
    Policy,
    Pull,
    Temperament,
)
from retune.units import STANDARD_REFERENCE_HZ

Command = TypeVar("Command", bound=Callable[..., Any])
STDIN_NAME = "standard input"
_MEGABYTE = 1024 * 1024


_HELD_SHIFT_WORDS = {"none": 0.0, "any": NO_BOUND}


class HeldShift(click.ParamType[Any]):
    """Cents, or none (a sounding note never moves), or any (no bound)."""

    name = "cents|none|any"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> float:
        """The bound in cents."""
        if isinstance(value, float):
            return value
        try:
            cents = _HELD_SHIFT_WORDS[value] if value in _HELD_SHIFT_WORDS else float(value)
        except ValueError:
            cents = -1.0
        if not cents >= 0:
            self.fail(f"'{value}' is not a number of cents from 0 up, none or any", param, ctx)
        return cents


class Tonic(click.ParamType[Any]):
    """A spelled pitch class, such as D or Bb."""

    name = "pitch"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> PitchClass:
        """The pitch class."""
        if isinstance(value, PitchClass):
            return value
        try:
            return PitchClass.parse(value)
        except WishError as error:
            self.fail(f"{error.what}. {error.hint}", param, ctx)


def accompaniment_tuning(wish: str) -> FixedTuning | None:
    """equal, meantone (None: placed on the home tonic), or a .scl file of twelve notes."""
    if wish == "equal":
        return EQUAL_TUNING
    if wish == "meantone":
        return None
    path = Path(wish)
    if path.suffix.lower() != ".scl":
        raise click.BadParameter(
            f"'{wish}' is neither equal nor meantone nor a .scl file",
            param_hint="--accompaniment-tuning",
        )
    from retune.tuning.scl import fixed_tuning

    try:
        return fixed_tuning(path.read_bytes().decode("latin-1"), path.stem)
    except OSError as error:
        raise UnreadableError(f"cannot be read: {error.strerror}").in_file(wish) from error
    except UnreadableError as error:
        raise error.in_file(wish) from None


def _stacked(*decorators: Callable[[Command], Command]) -> Callable[[Command], Command]:
    """Apply click options so that help lists them in this order."""

    def apply(command: Command) -> Command:
        """The command with all of them."""
        for decorator in reversed(decorators):
            command = decorator(command)
        return command

    return apply


_POLICY = _stacked(
    click.option(
        "--prime-limit",
        type=click.Choice(["3", "5", "7"]),
        default="5",
        show_default=True,
        help="Largest prime in the ratios; 7 tunes dominant sevenths 4:5:6:7.",
    ),
    click.option(
        "--drift",
        type=click.Choice([one.value for one in Drift]),
        default=Drift.GENTLE.value,
        show_default=True,
        help="How the piece is kept from drifting.",
    ),
    click.option(
        "--drift-within",
        type=click.FloatRange(1, 200),
        metavar="CENTS",
        help=f"Bound for --drift within.  [default: {DEFAULT_DRIFT_WITHIN:g}]",
    ),
    click.option(
        "--held-shift",
        type=HeldShift(),
        default=f"{DEFAULT_HELD_SHIFT:g}",
        show_default=True,
        metavar="CENTS|none|any",
        help="The most a sounding note may move at a time.",
    ),
    click.option(
        "--reference",
        type=click.FloatRange(220, 880),
        default=f"{STANDARD_REFERENCE_HZ:g}",
        show_default=True,
        metavar="HZ",
        help="Frequency of A4.",
    ),
    click.option(
        "--tonic", type=Tonic(), metavar="PITCH", help="Home tonic, as D or Bb.  [default: found]"
    ),
    click.option("--melody", metavar="PART", help="The part whose line is kept smoothest."),
    click.option(
        "--accompaniment-tuning",
        default="equal",
        show_default=True,
        metavar="equal|meantone|FILE.scl",
        help="Tuning of the parts that cannot move.",
    ),
    click.option(
        "--accompaniment-pull",
        type=click.Choice([one.value for one in Pull]),
        default=Pull.ROOTS.value,
        show_default=True,
        help="Which notes of the voices they draw: roots and fifths, or all.",
    ),
    click.option(
        "--temperament",
        type=click.Choice([one.value for one in Temperament]),
        default=Temperament.JUST.value,
        show_default=True,
        help="Just, or a temperament to compare with.",
    ),
)


def _policy(wishes: dict[str, Any]) -> Policy:
    if wishes["drift_within"] is not None and wishes["drift"] != Drift.WITHIN:
        raise click.UsageError("--drift-within goes with --drift within")
    within = wishes["drift_within"]
    return Policy(
        prime_limit=int(wishes["prime_limit"]),
        drift=Drift(wishes["drift"]),
        drift_within=DEFAULT_DRIFT_WITHIN if within is None else within,
        held_shift=wishes["held_shift"],
        temperament=Temperament(wishes["temperament"]),
        reference_hz=wishes["reference"],
        tonic=wishes["tonic"],
        melody=wishes["melody"],
        accompaniment_tuning=accompaniment_tuning(wishes["accompaniment_tuning"]),
        accompaniment_pull=Pull(wishes["accompaniment_pull"]),
    )


_POLICY_NAMES = (
    "prime_limit",
    "drift",
    "drift_within",
    "held_shift",
    "reference",
    "tonic",
    "melody",
    "accompaniment_tuning",
    "accompaniment_pull",
    "temperament",
)

_READING = _stacked(
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
    "piece",
    "max_megabytes",
    "max_notes",
    "max_minutes",
)


def _reading(wishes: dict[str, Any]) -> Any:
    from retune.score.options import ReadOptions

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
        limits=limits,
    )


def tuning_options(command: Command) -> Command:
    """Options on reading and tuning; the command gets `reading` and `policy`."""

    @functools.wraps(command)
    def wrapped(**wishes: Any) -> Any:
        policy = _policy({name: wishes.pop(name) for name in _POLICY_NAMES})
        reading = _reading({name: wishes.pop(name) for name in _READING_NAMES})
        return command(**wishes, policy=policy, reading=reading)

    return _POLICY(_READING(wrapped))  # type: ignore[return-value]  # wraps keeps the signature


score_argument = click.argument("score", type=click.Path(path_type=Path, allow_dash=True))
"""SCORE: a file, or - for standard input."""

talk_options = _stacked(
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
