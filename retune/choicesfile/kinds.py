"""Kinds of values in a choices file: how each is read, and what is told where it is wrong."""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from retune.errors import WishError
from retune.pitch import Pitch, PitchClass
from retune.score.pace import Pace

_AT = re.compile(r"([^:\s][^:]{0,19}):\s*(\d{1,3}(?:[./]\d{1,4})?)", re.ASCII)
_RATIO = re.compile(r"(\d{1,6})\s*[/:]\s*(\d{1,6})", re.ASCII)
MOST_TEXT = 2000


class WrongValueError(ValueError):
    """A value that a setting cannot take; the text says what it can."""


@dataclass(frozen=True, slots=True)
class Kind:
    """How a value is read; `wanted` says in a few words what is allowed."""

    wanted: str
    read: Callable[[Any], Any]

    def __call__(self, value: Any) -> Any:
        """The value read; raises `WrongValueError`."""
        try:
            return self.read(value)
        except (ValueError, TypeError, WishError, ZeroDivisionError) as error:
            near = error.args[0] if isinstance(error, _NearError) else ""
            raise WrongValueError(f"{_shown(value)} is not {self.wanted}{near}") from None


class _NearError(ValueError):
    """Carries a guess at what was meant."""


def _shown(value: Any) -> str:
    text = f"'{value}'" if isinstance(value, str) else str(value).lower()
    return text if len(text) <= 60 else f"{text[:57]}…"


def meant(word: str, known: Iterable[str]) -> str:
    """', did you mean …?' for a word near to a known one; else ''."""
    by_case = {one.casefold(): one for one in known}
    near = difflib.get_close_matches(word.strip().casefold(), by_case, n=1, cutoff=0.6)
    return f"; did you mean '{by_case[near[0]]}'?" if near else ""


def number(least: float, most: float, unit: str) -> Kind:
    """A number in a range."""

    def read(value: Any) -> float:
        if isinstance(value, bool) or not isinstance(value, int | float):
            raise ValueError
        if not least <= value <= most or math.isnan(value):
            raise ValueError
        return float(value)

    return Kind(f"a number of {unit} from {least:g} to {most:g}", read)


def whole(least: int, most: int, unit: str) -> Kind:
    """A whole number in a range."""

    def read(value: Any) -> int:
        if isinstance(value, bool) or not isinstance(value, int) or not least <= value <= most:
            raise ValueError
        return value

    return Kind(f"a whole number of {unit} from {least} to {most}", read)


def one_of(*words: str | int) -> Kind:
    """One of a few words or numbers."""
    texts = {str(word): word for word in words}

    def read(value: Any) -> str | int:
        if isinstance(value, bool | float):
            raise ValueError
        found = texts.get(str(value).strip().lower())
        if found is None:
            raise _NearError(meant(str(value), texts))
        return found

    listed = ", ".join(str(word) for word in words[:-1])
    return Kind(f"{listed} or {words[-1]}" if listed else str(words[-1]), read)


def _text(value: Any) -> str:
    if not isinstance(value, str) or not value.strip() or len(value) > MOST_TEXT:
        raise ValueError
    return value.strip()


def _texts(value: Any) -> tuple[str, ...]:
    if isinstance(value, str):
        return (_text(value),)
    if not isinstance(value, list):
        raise TypeError
    return tuple(_text(one) for one in value)


def _names(value: Any) -> dict[str, str]:
    if not isinstance(value, dict):
        raise TypeError
    return {_text(key): _text(one) for key, one in value.items()}


def _flag(value: Any) -> bool:
    if not isinstance(value, bool):
        raise TypeError
    return value


def _at(value: Any) -> tuple[str, Fraction]:
    match = _AT.fullmatch(_text(value))
    if match is None or (beat := Fraction(match[2])) < 1:
        raise ValueError
    return match[1].strip(), beat


def _ratio(value: Any) -> Fraction:
    match = _RATIO.fullmatch(_text(value))
    if match is None:
        raise ValueError
    ratio = Fraction(int(match[1]), int(match[2]))
    if not ratio:
        raise ValueError
    while ratio >= 2:
        ratio /= 2
    while ratio < 1:
        ratio *= 2
    return ratio


def _held_shift(value: Any) -> float:
    if value in ("none", "any"):
        return 0.0 if value == "none" else math.inf
    return float(number(0, 1200, "cents")(value))


def _pace(value: Any) -> Pace:
    return Pace.parse(value if isinstance(value, str) else f"{number(10, 400, 'beats')(value):g}")


def _level(value: Any) -> float:
    return -math.inf if value == "none" else float(number(-60, 12, "dB")(value))


def read_moments(text: str) -> tuple[tuple[Pitch, ...], ...]:
    """What sounds before, at and after a place, as 'C3 G3 | D3 A3 | G3 B3'; '-' for silence."""
    moments = text.split("|")
    if len(moments) != 3:
        raise ValueError
    return tuple(
        () if moment.strip() == "-" else tuple(Pitch.parse(name) for name in moment.split())
        for moment in moments
    )


def _melody(value: Any) -> tuple[Pitch, ...]:
    return tuple(Pitch.parse(name) for name in _text(value).split())


def _begins(value: Any) -> dict[str, tuple[Pitch, ...]]:
    return {name: _melody(line) for name, line in _names(value).items()}


TEXT = Kind("a text in quotes, not empty", _text)
TEXTS = Kind("a text in quotes, or several in brackets", _texts)
NAMES = Kind('names in braces, as { "Tenor" = "Tenor 1" }', _names)
FLAG = Kind("true or false", _flag)
AT = Kind("a bar and beat, as '12:3'", _at)
BARS = Kind("bars or rehearsal letters, as '17-24' or 'B'", _text)
PITCH = Kind("a pitch name, as 'D', 'F#' or 'Bb'", lambda value: PitchClass.parse(_text(value)))
RATIO = Kind("a ratio, as '7/4'", _ratio)
HELD_SHIFT = Kind("cents from 0 up, 'none' or 'any'", _held_shift)
PACE = Kind("beats a minute from 10 to 400, or a share of the score's tempo, as '80%'", _pace)
LEVEL = Kind("dB from -60 to 12, or 'none'", _level)
SOUNDS = Kind(
    "what sounds before, here and after, as 'C3 G3 | D3 A3 | G3 B3'",
    lambda value: read_moments(_text(value)),
)
BEGINS = Kind('first notes by part, as { "Alto" = "E4 F4 G4" }', _begins)
