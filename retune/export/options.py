"""Options of an exporter: what a plug-in may declare, and reading them from text.

An exporter declares a frozen dataclass. Each field has a default, one of the types bool, int,
float, str or a `StrEnum`, and in its metadata a one-line "help"; numbers may have a "least"
and a "most".
"""

from __future__ import annotations

import dataclasses
import difflib
import re
import typing
from collections.abc import Iterable, Mapping
from enum import StrEnum
from typing import Any

from retune.errors import WishError

_TRUE = ("true", "yes", "on", "1")
_FALSE = ("false", "no", "off", "0")
_INT = re.compile(r"[+-]?\d{1,15}")
_FLOAT = re.compile(r"[+-]?(\d{1,15}(\.\d{0,15})?|\.\d{1,15})")


def option_types(options: type[Any]) -> dict[str, type[Any]]:
    """Types of an options class by field name; raises `TypeError` where it breaks the contract."""
    if not dataclasses.is_dataclass(options):
        raise TypeError("its Options is no dataclass")
    if not options.__dataclass_params__.frozen:  # type: ignore[attr-defined]  # set by dataclass
        raise TypeError("its Options is not frozen")
    types = typing.get_type_hints(options)
    for field in dataclasses.fields(options):
        if field.default is dataclasses.MISSING and field.default_factory is dataclasses.MISSING:
            raise TypeError(f"its option {field.name} has no default")
        kind = types[field.name]
        if kind not in (bool, int, float, str) and not _is_choice(kind):
            raise TypeError(f"its option {field.name} has a type that text cannot set")
    return {field.name: types[field.name] for field in dataclasses.fields(options)}


def read_options(exporter: str, options: type[Any], texts: Mapping[str, str]) -> Any:
    """An options value from texts by field name, such as {"channels": "one"}.

    Raises
    ------
    WishError
        No such option, or a value it does not take; the message lists what is allowed.
    """
    types = option_types(options)
    values = {}
    for name, text in texts.items():
        if name not in types:
            raise WishError(
                f"the output {exporter} has no option '{name}'",
                hint=did_you_mean(name, types) + _there_is(exporter, types),
            )
        values[name] = _value(exporter, name, types[name], text.strip())
    found = options(**values)
    require_allowed(exporter, found)
    return found


def require_allowed(exporter: str, options: Any) -> None:
    """Raise `WishError` where a number is outside the bounds its field declares."""
    for field in dataclasses.fields(options):
        value = getattr(options, field.name)
        least, most = field.metadata.get("least"), field.metadata.get("most")
        if (least is not None and not value >= least) or (most is not None and not value <= most):
            bounds = f"from {least:g}" if most is None else f"from {least:g} to {most:g}"
            raise WishError(f"{exporter}.{field.name} cannot be {value}: it goes {bounds}")


def did_you_mean(word: str, known: Iterable[str]) -> str:
    """A question that offers the nearest known word, to stand before a list of all; or nothing.

    >>> did_you_mean("chanels", ["channels", "glide_ms"])
    'Did you mean channels? '
    """
    near = difflib.get_close_matches(word, list(known), n=1)
    return f"Did you mean {near[0]}? " if near else ""


def _there_is(exporter: str, names: Iterable[str]) -> str:
    listed = ", ".join(names)
    return f"It has {listed}" if listed else f"{exporter} has no options"


def _is_choice(kind: Any) -> bool:
    return isinstance(kind, type) and issubclass(kind, StrEnum)


def _choices(kind: type[Any]) -> list[str]:
    return [str(member) for member in kind.__members__.values()]


def _value(exporter: str, name: str, kind: type[Any], text: str) -> Any:
    if kind is str:
        return text
    if kind is bool and text.lower() in _TRUE + _FALSE:
        return text.lower() in _TRUE
    if kind is int and _INT.fullmatch(text):
        return int(text)
    if kind is float and _FLOAT.fullmatch(text):
        return float(text)
    if _is_choice(kind) and text.lower() in _choices(kind):
        return kind(text.lower())
    raise WishError(f"{exporter}.{name} cannot be '{text}'", hint=_allowed(kind, text))


def _allowed(kind: type[Any], text: str) -> str:
    if kind is bool:
        return "It is true or false"
    if kind is int:
        return "It is a whole number"
    if kind is float:
        return "It is a number, such as 2.5"
    choices = _choices(kind)
    return did_you_mean(text, choices) + f"It is one of {', '.join(choices)}"
