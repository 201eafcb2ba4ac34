"""The words of `part_names.toml`, as the tables that `names` looks things up in."""

from __future__ import annotations

import tomllib
from importlib.resources import files

from retune.score.model import VoiceType

_DATA = tomllib.loads(files("retune.score").joinpath("part_names.toml").read_text("utf-8"))


def _by_word(table: dict[str, str]) -> dict[str, str]:
    """Each word of a table with the name of the row it stands in."""
    return {word: row for row, words in table.items() for word in words.split()}


def _voices(table: dict[str, str]) -> dict[str, VoiceType]:
    return {word: VoiceType(row) for word, row in _by_word(table).items()}


FULL_WORDS = _voices(_DATA["voices"])
ABBREVIATIONS = _voices(_DATA["abbreviations"])
COUPLES = {
    word: tuple(VoiceType(name) for name in row.split("-"))
    for word, row in _by_word(_DATA["couples"]).items()
}
ORDINALS = {word: int(row) for word, row in _by_word(_DATA["ordinals"]).items()}

_WORDS: dict[str, frozenset[str]] = {
    name: frozenset(words.split()) for name, words in _DATA["words"].items()
}
CONNECTORS = _WORDS["connectors"]
SINGERS = _WORDS["singers"]
KEYBOARDS = _WORDS["keyboards"]
FIXED_PITCH = _WORDS["fixed-pitch"]
INSTRUMENTS = _WORDS["instruments"]
GENERIC = _WORDS["generic"]
REDUCTIONS = tuple(_DATA["reductions"]["stems"].split())

STANDARD_NAMES = {kind: str(kind.value).capitalize() for kind in VoiceType}
"""Soprano, Mezzo-soprano and so on."""

LETTERS = {
    "S": VoiceType.SOPRANO,
    "A": VoiceType.ALTO,
    "T": VoiceType.TENOR,
    "B": VoiceType.BASS,
}
