"""TOML changed in place by tomlkit: comments, order and spacing stay as they are."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import tomlkit


class EditedToml:
    """A TOML text whose values can be set; `text` is the result."""

    def __init__(self, text: str) -> None:
        self._document = tomlkit.parse(text)

    @property
    def text(self) -> str:
        """The text as it is now; the same as it was where nothing was set."""
        return tomlkit.dumps(self._document)

    def set_in_array(self, table: str, index: int, values: Mapping[str, str | int | float]) -> None:
        """Set values of one of the tables in double brackets."""
        self._set(self._document[table][index], values)

    def set_in_table(self, path: tuple[str, ...], values: Mapping[str, Any]) -> None:
        """Set values of a table, which is made at the end where there is none."""
        here: Any = self._document
        for key in path:
            if key not in here:
                here[key] = tomlkit.table()
            here = here[key]
        self._set(here, values)

    def drop(self, path: tuple[str, ...], key: str) -> None:
        """Take a key out of a table."""
        here: Any = self._document
        for step in path:
            here = here[step]
        del here[key]

    @staticmethod
    def _set(table: Any, values: Mapping[str, Any]) -> None:
        for key, value in values.items():
            if key in table and table[key] == value:
                continue
            # A value written anew would lose the comment behind it.
            comment = table[key].trivia if key in table and hasattr(table[key], "trivia") else None
            item = tomlkit.item(value)
            if comment is not None and comment.comment:
                item.comment(comment.comment)
                item.trivia.comment_ws = comment.comment_ws
            table[key] = item
