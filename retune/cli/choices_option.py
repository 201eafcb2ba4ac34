"""`--choices`: the director's decisions, whose settings stand in for the options' defaults."""

from __future__ import annotations

import math
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

if TYPE_CHECKING:
    from retune.choicesfile.model import ChoicesFile

NO_FILE = "none"

_OPTION_OF = {"others": "others_db", "accompaniment_level": "accompaniment_db"}
"""Settings whose option has another name inside."""
_NOT_OPTIONS = ("tonic",)
"""Settings that follow a piece which was transposed, and so are not options' defaults."""


def choices_beside(score: Path) -> Path:
    """Where the choices of a score are looked for."""
    from retune.choicesfile.read import ENDING
    from retune.score.read import stem_of

    return score.with_name(f"{stem_of(score.name)}{ENDING}")


def chosen_file(ctx: click.Context, param: click.Parameter, value: str | None) -> Any:
    """The choices of the score; their settings become the defaults of the other options."""
    if value == NO_FILE:
        return None
    if value is not None:
        path = Path(value)
    else:
        score = ctx.params.get("score")
        if score is None or str(score) == "-" or not choices_beside(score).is_file():
            return None
        path = choices_beside(score)
    from retune.choicesfile.read import load

    file = load(path)
    ctx.default_map = {**(ctx.default_map or {}), **defaults_of(file)}
    return file


def defaults_of(file: ChoicesFile) -> Mapping[str, Any]:
    """What a file sets, by the names that the options have inside."""
    found: dict[str, Any] = {}
    for section in ("tuning", "playing", "tracks"):
        for name, value in file.section(section).items():
            if name not in _NOT_OPTIONS:
                found[_OPTION_OF.get(name, name)] = _as_option(file, name, value)
    if "reference" in file.piece:
        found["reference"] = file.piece["reference"]
    return found


def _as_option(file: ChoicesFile, name: str, value: Any) -> Any:
    if name == "held_shift":
        return {0.0: "none", math.inf: "any"}.get(value, f"{value:g}")
    if name == "accompaniment_tuning" and value.lower().endswith(".scl"):
        return str(file.path.parent / value)
    return str(value) if name == "prime_limit" else value


def from_file(name: str) -> bool:
    """Whether an option has its value from the choices, not from the command line."""
    source = click.get_current_context().get_parameter_source(name)
    return source is click.core.ParameterSource.DEFAULT_MAP


choices_option = click.option(
    "--choices",
    metavar="FILE|none",
    is_eager=True,
    expose_value=True,
    callback=chosen_file,
    help="The director's decisions.  [default: NAME.choices.toml beside the score]",
)
