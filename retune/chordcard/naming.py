"""Pitches as people type them."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import replace

from retune.errors import WishError
from retune.pitch import Pitch, PitchClass

MOST_PITCHES = 12
LOWEST, HIGHEST = 24, 108
"""Keys of C1 and C8."""

_FIRST_OCTAVE = 3
_PRINTED = str.maketrans({"♯": "#", "♭": "b", "♮": "", "𝄪": "##", "𝄫": "bb"})
_HINT = "Write letter, signs and octave: D3, F#4, Bb3, with C4 for middle C"
_OTHER_WORDS = (
    (re.compile(r"sharp", re.IGNORECASE), "#"),
    (re.compile(r"flat", re.IGNORECASE), "b"),
    (re.compile(r"^(es|as)(?=\d|$)", re.IGNORECASE), lambda m: f"{m[0][0]}b"),
    (re.compile(r"^([a-g])(is|s)(?=\d|$)", re.IGNORECASE), r"\1#"),
    (re.compile(r"^([a-g])es(?=\d|$)", re.IGNORECASE), r"\1b"),
    (re.compile(r"^h(?=[#b\d]|$)", re.IGNORECASE), "B"),
    (re.compile(r"^([#b]+)([a-g])(?=\d|$)", re.IGNORECASE), r"\2\1"),
    (re.compile(r"^([a-g])(\d)([#b]+)$", re.IGNORECASE), r"\1\3\2"),
    (re.compile(r"^(\d)([a-g][#b]*)$", re.IGNORECASE), r"\2\1"),
    (re.compile(r"[\s_'.-]+"), ""),
)
"""Other ways to write a pitch, to guess what was meant; never taken without being asked."""


def parse_pitches(words: Iterable[str]) -> tuple[Pitch, ...]:
    """Pitches from words or lists of them, in the order given.

    A pitch without an octave is the next one above the pitch before it; the first of them is
    in the octave of C3.

    Raises
    ------
    WishError
        A word that is no pitch, one that is too high or low, none or too many.

    >>> [pitch.name for pitch in parse_pitches(["d3,F♯4", "A", "D"])]
    ['D3', 'F#4', 'A4', 'D5']
    """
    texts = [text for word in words for text in re.split(r"[,;\s]+", word) if text]
    if not texts:
        raise WishError("no pitch is given", hint=_HINT)
    if len(texts) > MOST_PITCHES:
        raise WishError(
            f"{len(texts)} pitches are more than a chord of at most {MOST_PITCHES}",
            hint="Leave out doublings",
        )
    found: list[Pitch] = []
    for text in texts:
        pitch = _parsed(text, found)
        if not LOWEST <= pitch.key <= HIGHEST:
            raise WishError(f"'{text}' is out of reach", hint="Pitches are from C1 to C8")
        found.append(pitch)
    return tuple(found)


def _parsed(text: str, before: Sequence[Pitch]) -> Pitch:
    plain = text.translate(_PRINTED)
    try:
        return Pitch.parse(plain)
    except WishError:
        pass
    try:
        return _next_above(PitchClass.parse(plain), before)
    except WishError:
        guess = _guess(plain)
        meant = f"Did you mean {guess}? " if guess else ""
        raise WishError(f"'{text}' is not a pitch", hint=meant + _HINT) from None


def _next_above(name: PitchClass, before: Sequence[Pitch]) -> Pitch:
    pitch = Pitch(name.step, name.alter, _FIRST_OCTAVE)
    if before:
        pitch = replace(pitch, octave=before[-1].octave)
        while pitch.key <= before[-1].key:
            pitch = replace(pitch, octave=pitch.octave + 1)
    return pitch


def _guess(text: str) -> str:
    """What may have been meant; "" where nothing comes to mind.

    >>> [_guess(text) for text in ("Fis4", "H3", "4F#", "es4", "F-sharp4", "qq")]
    ['F#4', 'B3', 'F#4', 'Eb4', 'F#4', '']
    """
    for pattern, meant in (*_OTHER_WORDS[-1:], *_OTHER_WORDS[:-1]):
        text = pattern.sub(meant, text)
    try:
        return Pitch.parse(text).name
    except WishError:
        try:
            return PitchClass.parse(text).name
        except WishError:
            return ""
