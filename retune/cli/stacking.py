"""Several click options as one decorator that hands one value to the command."""

from __future__ import annotations

import functools
from collections.abc import Callable, Sequence
from typing import Any, TypeVar

Command = TypeVar("Command", bound=Callable[..., Any])


def stacked(*decorators: Callable[[Command], Command]) -> Callable[[Command], Command]:
    """Apply click options so that help lists them in this order."""

    def apply(command: Command) -> Command:
        """The command with all of them."""
        for decorator in reversed(decorators):
            command = decorator(command)
        return command

    return apply


def gathered(
    options: Callable[[Command], Command],
    names: Sequence[str],
    as_name: str,
    build: Callable[[dict[str, Any]], object],
) -> Callable[[Command], Command]:
    """Options whose values, called `names`, reach the command as one value called `as_name`."""

    def apply(command: Command) -> Command:
        """The command with these options."""

        @functools.wraps(command)
        def wrapped(**wishes: Any) -> Any:
            value = build({name: wishes.pop(name) for name in names})
            return command(**wishes, **{as_name: value})

        return options(wrapped)  # type: ignore[arg-type]  # wraps keeps the signature

    return apply
