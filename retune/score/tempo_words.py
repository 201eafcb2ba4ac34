"""What words say about the tempo; the words themselves stand in `tempo_words.toml`."""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass
from enum import StrEnum
from fractions import Fraction
from importlib.resources import files

LONGEST = 80
"""Characters beyond which a text is no tempo mark."""


class Turn(StrEnum):
    """What a tempo word does."""

    SET = "set"
    """A tempo of its own: `value` beats a minute."""
    RAMP = "ramp"
    """Ever slower or faster, by the factor `value` in the end."""
    SHIFT = "shift"
    """At once slower or faster, by the factor `value`."""
    RETURN = "return"
    """A tempo: what held before."""
    FIRST = "first"
    """Tempo I: the first tempo of the piece."""


@dataclass(frozen=True, slots=True)
class TempoWord:
    """What a text in the score does to the tempo."""

    turn: Turn
    value: Fraction = Fraction(1)


_DATA = tomllib.loads(files("retune.score").joinpath("tempo_words.toml").read_text("utf-8"))
_TURNS = tuple(
    (
        re.compile(row["pattern"].replace("\\\n", "").strip()),
        TempoWord(Turn(row["turn"]), Fraction(row.get("factor", "1"))),
    )
    for row in _DATA["turns"]
)
_BEATS: dict[str, int] = _DATA["beats"]
_TEMPO_NAME = re.compile(rf"\b({'|'.join(sorted(map(re.escape, _BEATS), key=len)[::-1])})\b")
_METRONOME = re.compile(r"(?:♩|\bm\.? ?m\.?|\bquarter)\s*=\s*(?:ca?\.?\s*)?(\d{2,3})\b")


def tempo_word(text: str) -> TempoWord | None:
    """What a text says about the tempo; None where it says nothing.

    >>> tempo_word("Allegro ma non troppo")
    TempoWord(turn=<Turn.SET: 'set'>, value=Fraction(120, 1))
    >>> tempo_word("dolce") is None
    True
    """
    plain = " ".join(text.lower().replace("’", "'").split())
    if len(plain) > LONGEST:
        return None
    for pattern, word in _TURNS:
        if pattern.search(plain):
            return word
    names = _TEMPO_NAME.findall(plain)
    return TempoWord(Turn.SET, Fraction(_BEATS[max(names, key=len)])) if names else None


def metronome_in(text: str) -> Fraction | None:
    """Quarter notes a minute in a text such as "♩ = 72"."""
    found = _METRONOME.search(text.lower())
    return Fraction(int(found[1])) if found else None
