"""Italian as it is sung: a e ɛ i o ɔ u.

Which syllable is stressed comes from a written accent, the ending and a list; the stress of a word
cut short before a consonant ("amor") is on its last syllable. A stressed e or o is open or close
by the accent (è, é), by the word, by its ending, and else open; an unstressed one is close, as is
usual in singing's grammar books (common practice, no source). ie and uo are jɛ and wɔ. i is silent
in cia, gio, scie, glia; u is a glide in qua, gua. Two vowels in one syllable hold the first
("au", "poi", "mio").
"""

from __future__ import annotations

import re
import tomllib
import unicodedata
from importlib.resources import files

from retune.voice.language.syllables import Word, plain

_DATA = tomllib.loads(files("retune.voice.language").joinpath("italian.toml").read_text("utf-8"))
_WORDS: dict[str, str] = {
    word: vowel for vowel, row in _DATA["words"].items() for word in row.split()
}
_ENDINGS: list[tuple[str, str]] = sorted(
    ((ending, vowel) for vowel, row in _DATA["endings"].items() for ending in row.split()),
    key=lambda pair: -len(pair[0]),
)
_THIRD_LAST = frozenset(_DATA["stress"]["third-last"].split())
_THIRD_LAST_ENDINGS = tuple(_DATA["stress"]["endings"].split())
_HELD: dict[str, str] = {
    word: vowel for vowel, row in _DATA["held"].items() for word in row.split()
}

_ACCENTED = {"è": "ɛ", "é": "e", "ê": "ɛ", "ò": "ɔ", "ó": "o", "ô": "ɔ"}
_GLIDE = re.compile("[ij](?=[aeiou])|(?<=[qg])u(?=[aeiou])|u(?=[aeo])")
_WORDLESS = re.compile("[^aeiou]?oo+h?")
_CLOSE = {"ɛ": "e", "ɔ": "o"}


def word_vowels(word: Word, following: str) -> list[str | None]:
    """The vowel of each syllable of a word; None where a syllable has none."""
    bare = plain(word.text).strip("'").rpartition("'")[2]
    if _WORDLESS.fullmatch(bare):
        return ["u" for _ in word.syllables]
    nuclei = [_nucleus(syllable, bare) for syllable in word.syllables]
    stressed = _stressed(word, nuclei, bare)
    return [
        _vowel(nucleus, index == stressed, glide, bare)
        for index, (nucleus, glide) in enumerate(nuclei)
    ]


def _nucleus(syllable: str, word: str) -> tuple[str, str]:
    """The held letter of a syllable with its accent ("" for none), and the glide before it."""
    if word in _HELD and _HELD[word] in syllable:
        return _HELD[word], ""
    text = unicodedata.normalize("NFC", syllable)
    accented = next((mark for mark in text if mark in _ACCENTED), "")
    base = plain(text)
    glides = [match.start() for match in _GLIDE.finditer(base)]
    for index, mark in enumerate(base):
        if mark in "aeiouy" and index not in glides:
            glide = base[index - 1] if index and index - 1 in glides else ""
            before = base[index - 2 : index - 1]
            silent = before in ("c", "g", "l", "q") if glide else False
            return accented or mark, "" if silent else glide
    return "", ""


def _stressed(word: Word, nuclei: list[tuple[str, str]], bare: str) -> int:
    """The index of the stressed syllable."""
    sung = [index for index, (nucleus, _) in enumerate(nuclei) if nucleus]
    marked = [
        index
        for index, syllable in enumerate(word.syllables)
        if any(mark != plain(mark) for mark in syllable)
    ]
    if marked or not sung:
        return marked[-1] if marked else 0
    if len(sung) == 1:
        return sung[0]
    if bare[-1:] not in "aeiou":
        return sung[-2] if bare + "e" in _THIRD_LAST else sung[-1]
    third = bare in _THIRD_LAST or (len(sung) > 2 and bare.endswith(_THIRD_LAST_ENDINGS))
    return sung[-3] if third and len(sung) > 2 else sung[-2]


def _vowel(nucleus: str, stressed: bool, glide: str, word: str) -> str | None:
    if nucleus in _ACCENTED:
        return _ACCENTED[nucleus]
    if nucleus not in ("e", "o"):
        return {"y": "i"}.get(nucleus, nucleus) or None
    if not stressed:
        return nucleus
    known = _listed(word)
    if known and _CLOSE.get(known, known) == nucleus:
        return known
    if (glide, nucleus) in (("i", "e"), ("u", "o")):
        return "ɛ" if nucleus == "e" else "ɔ"
    for ending, vowel in _ENDINGS:
        if word.endswith(ending) and _CLOSE.get(vowel, vowel) == nucleus:
            return vowel
    return "ɛ" if nucleus == "e" else "ɔ"


def _listed(word: str) -> str | None:
    """The stressed vowel that the list gives a word, or another form of it."""
    if word in _WORDS:
        return _WORDS[word]
    if len(word) < 4 or word[-1] not in "aeiou":
        return None
    return next((_WORDS[word[:-1] + last] for last in "oaei" if word[:-1] + last in _WORDS), None)
