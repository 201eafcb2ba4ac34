"""German as it is sung: long vowels close, short ones open.

A vowel is long where it is doubled, before h, as ie, before one consonant (or a stop with l, n or
r) and a vowel, before one consonant that ends the word, before ß, and where a list of stems says
so; else short. ä is ɛ in both lengths, ü is y in both (the inventory has no short one), ei and ai
hold a, au holds a, eu and äu hold ɔ. e without stress is ə: in endings, and in be- and ge-.
"""

from __future__ import annotations

import re
import tomllib
from importlib.resources import files

from retune.voice.language.syllables import Word, plain

_DATA = tomllib.loads(files("retune.voice.language").joinpath("german.toml").read_text("utf-8"))
_SHORT = frozenset(_DATA["short"]["words"].split())
_UNSTRESSED = frozenset(_DATA["short"]["prefixes"].split())
_STEMS = tuple(_DATA["long"]["stems"].split())
_WORDS = {word: vowels.split() for vowels, row in _DATA["words"].items() for word in row.split()}

_DIPHTHONGS = {
    **dict.fromkeys(("ei", "ai", "ey", "ay", "au"), "a"),
    **dict.fromkeys(("eu", "äu", "oi", "oy"), "ɔ"),
}
_DOUBLED = {"aa": "a", "ee": "e", "oo": "o", "ie": "i"}
_LONG = {"a": "a", "e": "e", "i": "i", "o": "o", "u": "u", "ä": "ɛ", "ö": "ø", "ü": "y", "y": "y"}
_CHECKED = {**_LONG, "e": "ɛ", "i": "ɪ", "o": "ɔ", "u": "ʊ", "ö": "œ"}
_NUCLEUS = re.compile("|".join([*_DIPHTHONGS, *_DOUBLED]) + "|(?<=q)u|[aeiouäöüy]")
_GLIDE = re.compile("(?<=q)u(?=[aeiouäöü])|^y(?=[aeiou])")
_LONG_BEFORE = re.compile(
    "h|ß|[bdgkptfhlmnrsvwzj]?([aeiouäöüy']|$)|th([aeiouäöü']|$)"
    "|([bdgkpt][lnr]|[fv]r)[aeiouäöüy']|[bdglmnrsfv](lich|los|bar|sam|nis|lein|chen|wärts)"
    "|[bdg]'?s?t?$"
)
_SCHWA_BEFORE = re.compile("(|[nlrmst]|st|nd|ns|rn|ln|nt|ls|rs|lt|rt|nds)$")
_IG = re.compile("g|ch?$")
_PREFIXES = ("be", "ge", "ver", "er", "zer", "ent")
_BEFORE_PREFIXES = ("un", "an", "ab", "auf", "aus", "ein", "vor", "zu")
_OLD_SPELLING = re.compile(
    "(be|ge|ver|er|ent|zer|un)?(" + "|".join(_DATA["short"]["old-spelling"].split()) + ")"
)
_WORDLESS = re.compile("[^aeiou]?oo+h?")


def word_vowels(word: Word, following: str) -> list[str | None]:
    """The vowel of each syllable of a word; None where a syllable has none."""
    syllables = [plain(syllable, keep="äöüß") for syllable in word.syllables]
    text = "".join(syllables)
    if _WORDLESS.fullmatch(text):
        return ["u" for _ in syllables]
    known = _WORDS.get(text.replace("'", ""))
    if known and len(known) == len(syllables):
        return list(known)
    found: list[str | None] = []
    start = 0
    for index, syllable in enumerate(syllables):
        found.append(_vowel(syllables, index, text, start))
        start += len(syllable)
    return found


def _vowel(syllables: list[str], index: int, text: str, start: int) -> str | None:
    syllable = syllables[index]
    skip = _GLIDE.search(syllable)
    match = _NUCLEUS.search(syllable, skip.end() if skip else 0)
    if match is None:
        return None
    nucleus = match[0]
    coda = syllable[match.end() :].rstrip("'")
    if nucleus in _DIPHTHONGS:
        return _DIPHTHONGS[nucleus]
    if nucleus in _DOUBLED:
        return _DOUBLED[nucleus]
    if nucleus == "e" and _is_weak(syllables, index, coda):
        return "ə"
    if _is_checked(syllables, index, text, nucleus, coda):
        return _CHECKED[nucleus]
    long = _LONG_BEFORE.match(text, start + match.end()) or _in_long_stem(text, start, match.end())
    return (_LONG if long else _CHECKED)[nucleus]


def _is_checked(syllables: list[str], index: int, text: str, nucleus: str, coda: str) -> bool:
    """Whether a vowel is short although one consonant, or none, follows."""
    if index == 0 and len(syllables) > 1 and syllables[0] in _UNSTRESSED:
        return len(syllables) > 2 or not _looks_weak(syllables[1])
    if index == len(syllables) - 1 and text.replace("'", "") in _SHORT:
        return True
    if (
        index
        and nucleus == "i"
        and _IG.match(text, len("".join(syllables[: index + 1])) - len(coda))
    ):
        return True
    if index and nucleus == "u" and coda in ("m", "s") and not syllables[index].startswith("t"):
        return True
    return index == 0 and bool(_OLD_SPELLING.match(text)) and text != "muße"


def _is_weak(syllables: list[str], index: int, coda: str) -> bool:
    """Whether an e has no stress: in an ending, or in be- or ge- before a stem."""
    before, syllable, rest = syllables[:index], syllables[index], syllables[index + 1 :]
    if syllable in ("be", "ge") and (not before or before[-1] in _BEFORE_PREFIXES):
        # "ge-ben" is a stem and its ending; in "ge-gen-wart" the stem is not seen as one.
        opens = rest and (len(rest) > 1 or not _looks_weak(rest[0]))
        return bool(opens) and not "".join([syllable, *rest]).startswith("gegen")
    if not before:
        return False
    if before == ["un"] and syllable.startswith("e"):
        return False
    if before[-1] in _PREFIXES and index == 1 and rest:
        return False
    return bool(_SCHWA_BEFORE.match(coda))


def _looks_weak(syllable: str) -> bool:
    match = re.search("[aeiouäöüy]+", syllable)
    if match is None or match[0] != "e":
        return False
    return bool(_SCHWA_BEFORE.match(syllable[match.end() :]))


def _in_long_stem(text: str, start: int, end: int) -> bool:
    """Whether the vowel that ends at start + end lies in a stem listed as long."""
    at = start + end - 1
    return any(
        place <= at < place + len(stem) and not any(mark in "aeiouäöüy" for mark in text[place:at])
        for stem in _STEMS
        for place in [text.find(stem)]
        if place >= 0
    )
