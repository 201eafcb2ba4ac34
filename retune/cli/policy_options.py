"""What the director asks of the tuning, as options."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from retune.cli.choices_option import from_file
from retune.cli.stacking import gathered, stacked
from retune.errors import UnreadableError, WishError
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


_POLICY = stacked(
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
    within = wishes["drift_within"]
    if within is not None and wishes["drift"] != Drift.WITHIN and not from_file("drift_within"):
        raise click.UsageError("--drift-within goes with --drift within")
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

policy_options = gathered(_POLICY, _POLICY_NAMES, "policy", _policy)
"""Options on the tuning; the command gets `policy`."""
