"""What a part's name says: which singers, which kind of instrument, or nothing at all."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass
from enum import StrEnum

from retune.score.model import VoiceType
from retune.score.voicewords import (
    ABBREVIATIONS,
    CONNECTORS,
    COUPLES,
    FIXED_PITCH,
    FULL_WORDS,
    GENERIC,
    INSTRUMENTS,
    KEYBOARDS,
    LETTERS,
    ORDINALS,
    REDUCTIONS,
    SINGERS,
    STANDARD_NAMES,
)


class Role(StrEnum):
    """Who plays or sings a part, by its name."""

    SINGERS = "singers"
    INSTRUMENT = "instrument"
    """An instrument whose pitch can move."""
    KEYBOARD = "keyboard"
    FIXED = "fixed pitch"
    """Plucked strings, bells, timpani: cannot move, and never a mere reduction."""
    UNKNOWN = "unknown"


@dataclass(frozen=True, slots=True)
class Label:
    """One line that a name speaks of, such as Tenor 2."""

    name: str
    voice_type: VoiceType | None = None
    ordinal: int | None = None


@dataclass(frozen=True, slots=True)
class NameReading:
    """What a name says. `labels` has one entry for each line it speaks of."""

    role: Role
    labels: tuple[Label, ...] = ()
    reduction: bool = False
    generic: bool = False
    """Nothing but what programs write by default, such as "Part 1"."""


def read_name(name: str) -> NameReading:
    """Understand a part's name.

    >>> [label.name for label in read_name("Sopran und Alt").labels]
    ['Soprano', 'Alto']
    >>> read_name("Orgel").role.value
    'keyboard'
    """
    words = _words(name)
    plain = _plain(name)
    reduction = any(stem in plain for stem in REDUCTIONS)
    if reduction or any(word in KEYBOARDS for word in words):
        return NameReading(Role.KEYBOARD, reduction=reduction)
    if any(word in FIXED_PITCH for word in words):
        return NameReading(Role.FIXED)
    if any(word in INSTRUMENTS for word in words):
        return NameReading(Role.INSTRUMENT)
    labels = _labels(name)
    if labels:
        return NameReading(Role.SINGERS, labels)
    if all(word in GENERIC or word.isdigit() or len(word) == 1 for word in words):
        return NameReading(Role.UNKNOWN, generic=True)
    if any(word in SINGERS for word in words):
        return NameReading(Role.SINGERS)
    return NameReading(Role.UNKNOWN)


def singers_named(text: str) -> tuple[Label, ...]:
    """The singers that a short text in the score names, and nothing but them; else empty.

    >>> [label.name for label in singers_named("S. & A.")]
    ['Soprano', 'Alto']
    >>> singers_named("a tempo")
    ()
    """
    known = {*FULL_WORDS, *ABBREVIATIONS, *ORDINALS, *CONNECTORS, *COUPLES, "solo", "only", "nur"}
    words = _words(text)
    if not words or not all(word in known or _initials(word.upper()) for word in words):
        return ()
    return _labels(text)


def plain_label(label: Label) -> Label:
    """A label under the standard name of its voice."""
    if label.voice_type is None:
        return label
    return Label(_standard(label.voice_type, label.ordinal), label.voice_type, label.ordinal)


def tidy(name: str) -> str:
    """A name on one line, without the dots and blanks at its ends."""
    return " ".join(name.split()).strip(" .,:;")


def _plain(text: str) -> str:
    """Lower case, without accents."""
    decomposed = unicodedata.normalize("NFKD", text.replace("♯", "#").replace("ß", "ss"))
    return "".join(char for char in decomposed if not unicodedata.combining(char)).lower()


def _words(text: str) -> list[str]:
    return re.findall(r"[^\W\d_]+|\d+", _plain(text))


def _initials(word: str) -> tuple[VoiceType, ...]:
    """The voices of a word such as SATB; empty for any other word."""
    if len(word) > 1 and all(letter in LETTERS for letter in word):
        return tuple(LETTERS[letter] for letter in word)
    return ()


def _labels(name: str) -> tuple[Label, ...]:
    found, whole_words = _walk(name)
    if len(found) == 1 and whole_words:
        voice_type, ordinal = found[0]
        return (Label(tidy(name), voice_type, ordinal),)
    return tuple(Label(_standard(*entry), *entry) for entry in found)


def _standard(voice_type: VoiceType, ordinal: int | None) -> str:
    name = STANDARD_NAMES[voice_type]
    return name if ordinal is None else f"{name} {ordinal}"


def _walk(name: str) -> tuple[list[tuple[VoiceType, int | None]], bool]:
    """Voices and ordinals of a name in order, and whether it is written in whole words."""
    found: list[tuple[VoiceType, int | None]] = []
    whole_words = True
    after_choir = False
    abbreviated = all(_known(word) for word in _words(name))
    for raw in re.findall(r"[^\W\d_]+|\d+", name):
        word = _plain(raw)
        initials = _initials(raw) if raw.isupper() and word not in FULL_WORDS else ()
        kind = FULL_WORDS.get(word)
        if kind is not None:
            _add_voice(found, kind)
        elif initials or word in COUPLES:
            found.extend((voice, None) for voice in initials or COUPLES[word])
            whole_words = False
        elif word in ORDINALS and (found or not word.isalpha() or len(word) > 3):
            if not after_choir:
                _add_ordinal(found, ORDINALS[word])
        elif abbreviated and word in ABBREVIATIONS:
            _add_voice(found, ABBREVIATIONS[word])
            whole_words = False
        after_choir = word in SINGERS and kind is None
    return found, whole_words


def _known(word: str) -> bool:
    """Whether a word belongs to the language of part names, so that letters may be voices."""
    tables = (FULL_WORDS, ABBREVIATIONS, ORDINALS, CONNECTORS, COUPLES, SINGERS, GENERIC)
    return any(word in table for table in tables)


def _add_voice(found: list[tuple[VoiceType, int | None]], kind: VoiceType) -> None:
    """Add a voice; the halves of mezzo-soprano and bass-baritone make one."""
    last = found[-1] if found else None
    if last == (VoiceType.MEZZO, None) and kind is VoiceType.SOPRANO:
        return
    if last == (VoiceType.BASS, None) and kind is VoiceType.BARITONE:
        found[-1] = (VoiceType.BARITONE, None)
        return
    found.append((kind, None))


def _add_ordinal(found: list[tuple[VoiceType, int | None]], ordinal: int) -> None:
    if not found:
        return
    kind, known = found[-1]
    if known is None:
        found[-1] = (kind, ordinal)
    else:
        found.append((kind, ordinal))
