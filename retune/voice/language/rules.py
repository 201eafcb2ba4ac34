"""Letter-to-sound rules in the form of NRL Report 7948 (Elovitz and others 1976), for vowels.

A rule is `left [letters] right = vowel`; `english_rules.toml` lists the signs of its contexts.
"""

from __future__ import annotations

import re
from typing import NamedTuple

_VOWEL_LETTERS = "aeiouy"
_SIGNS = {
    "#": "[aeiouy]+",
    ":": "[^aeiouy|]*",
    "^": "[^aeiouy|]",
    ".": "[bdvgjlmnrwz]",
    "+": "[eiy]",
    "%": r"(?:ers?|e[sd]?|ing|ely|eth|est)\|",
    "&": "(?:ch|sh|[scgzxj])",
    "@": "(?:th|ch|sh|[tsrdlznj])",
    "|": r"\|",
}
# Left contexts are matched backwards, from the letter outwards.
_BACKWARDS = {**_SIGNS, "&": "(?:hc|hs|[scgzxj])", "@": "(?:ht|hc|hs|[tsrdlznj])"}
_RULE = re.compile(r"(\S*)\[(\S+?)\](\S*) = (\S+)")
_SILENT = "-"


class _Rule(NamedTuple):
    left: re.Pattern[str]
    letters: str
    right: re.Pattern[str]
    vowel: str


class Rules:
    """A table of rules, compiled.

    >>> Rules("#:[e]| = -\\n[a]^+ = e").read("lame")
    [(1, 'e')]
    """

    def __init__(self, table: str) -> None:
        self._by_letter: dict[str, list[_Rule]] = {letter: [] for letter in _VOWEL_LETTERS}
        for line in table.strip().splitlines():
            match = _RULE.fullmatch(line)
            if match is None:
                raise ValueError(f"not a rule: {line!r}")
            left, letters, right, vowel = match.groups()
            self._by_letter[letters[0]].append(
                _Rule(
                    re.compile("".join(_BACKWARDS.get(sign, sign) for sign in reversed(left))),
                    letters,
                    re.compile("".join(_SIGNS.get(sign, sign) for sign in right)),
                    vowel,
                )
            )

    def read(self, word: str) -> list[tuple[int, str]]:
        """The vowels of a lower-case word, each with the index of the letter it comes from."""
        text = f"|{word}|"
        backwards = text[::-1]
        found = []
        place = 1
        while place < len(text) - 1:
            rule = self._rule_at(text, backwards, place)
            if rule is not None and rule.vowel != _SILENT:
                found.append((place - 1, rule.vowel))
            place += len(rule.letters) if rule else 1
        return found

    def _rule_at(self, text: str, backwards: str, place: int) -> _Rule | None:
        for rule in self._by_letter.get(text[place], ()):
            end = place + len(rule.letters)
            if (
                text.startswith(rule.letters, place)
                and rule.right.match(text, end)
                and rule.left.match(backwards, len(text) - place)
            ):
                return rule
        return None
