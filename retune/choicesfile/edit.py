"""A choices file changed in place: values are replaced and lines added, all else stays as it is.

General TOML libraries gather tables of one name that stand apart, which would move the blocks of
a director's file; here the text is spliced at the places that `positions` tells.
"""

from __future__ import annotations

import json
import tomllib
from collections.abc import Mapping
from typing import Any

from retune.choicesfile.positions import Path, Statement, statements


class EditedToml:
    """A TOML text whose values can be set; `text` is the result.

    A change that would leave no valid TOML, as in a table that is written in an unusual form, is
    not made.
    """

    def __init__(self, text: str) -> None:
        self.text = text

    def set_values(self, path: Path, values: Mapping[str, Any]) -> None:
        """Set values of one table; one that is not there is put at the end."""
        for key, value in values.items():
            self._set(path, key, value)

    def set_table(self, path: tuple[str, ...], values: Mapping[str, Any]) -> None:
        """Make a table hold these values and no others."""
        own = self._own(path)
        inline = next((s for s in self._own(path[:-1]) if s.keys == path[-1:]), None)
        if not own and inline is not None:
            self._splice(inline.value, inline.end, _text(values))
            return
        for key in [one.keys[0] for one in own if one.keys and one.keys[0] not in values]:
            gone = next(one for one in self._own(path) if one.keys[:1] == (key,))
            self._splice(gone.start, gone.line_end + 1, "")
        self.set_values(path, values)

    def _own(self, path: Path) -> list[Statement]:
        """The header and the keys of a table."""
        return [one for one in statements(self.text) if one.path == path]

    def _set(self, path: Path, key: str, value: Any) -> None:
        own = self._own(path)
        here = next((one for one in own if one.keys == (key,)), None)
        line = f"{_key(key)} = {_text(value)}"
        if here is not None:
            if _value(self.text[here.value : here.end]) != value:
                self._splice(here.value, here.end, _text(value))
        elif own:
            self._splice(own[-1].line_end, own[-1].line_end, f"{self._break(own[-1])}{line}")
        else:
            names = ".".join(_key(str(step)) for step in path)
            gap = "" if not self.text or self.text.endswith("\n") else self._line
            header = f"{gap}{self._line}[{names}]{self._line}" if path else gap
            self._splice(len(self.text), len(self.text), f"{header}{line}{self._line}")

    @property
    def _line(self) -> str:
        return "\r\n" if "\r\n" in self.text else "\n"

    def _break(self, before: Statement) -> str:
        """The line break before an added line; the one behind it is that of the line before."""
        return "\n" if self.text[: before.line_end].endswith("\r") else self._line

    def _splice(self, start: int, stop: int, text: str) -> None:
        added = text
        if start == stop and self.text[:start].endswith("\r"):
            # Between the two signs of a line break: the added line ends as the one before did.
            added = f"{text}\r"
        changed = self.text[:start] + added + self.text[stop:]
        try:
            tomllib.loads(changed)
        except tomllib.TOMLDecodeError:
            return
        self.text = changed


def _value(text: str) -> Any:
    return tomllib.loads(f"value = {text}")["value"]


def _key(key: str) -> str:
    plain = key.isascii() and key.replace("-", "").replace("_", "").isalnum()
    return key if plain else json.dumps(key, ensure_ascii=False)


def _text(value: Any) -> str:
    """A value as TOML; texts are written as JSON has them, which TOML reads the same."""
    if isinstance(value, Mapping):
        inside = ", ".join(f"{_key(key)} = {_text(one)}" for key, one in value.items())
        return f"{{ {inside} }}" if inside else "{}"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(_text(one) for one in value) + "]"
    return json.dumps(value, ensure_ascii=False)
