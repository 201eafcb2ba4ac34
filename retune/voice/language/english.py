"""English as British choirs sing it: long vowels hold their first part, no r is sounded.

Three steps, the first that knows the word. The list of frequent sung words (`english_words.toml`),
also with an ending or in a compound; it is asked for a reading with as many vowels as the score
has syllables. Then letter-to-sound rules (`english_rules.toml`), whose vowels fall to the syllables
of the score by the letters they come from, so that any division works. Last, for a syllable that
the rules leave silent, the syllable by itself.

The tables are our own: the pronouncing dictionaries that install from PyPI are under the GPL, or do
not say where their data come from, or bring megabytes and other packages for the vowels alone.
"""

from __future__ import annotations

import re
import tomllib
from collections import defaultdict
from functools import lru_cache
from importlib.resources import files
from itertools import accumulate

from retune.voice.language.rules import Rules
from retune.voice.language.syllables import Word, plain

_HERE = files("retune.voice.language")
_WORDS_DATA = tomllib.loads(_HERE.joinpath("english_words.toml").read_text("utf-8"))
_RULES_DATA = tomllib.loads(_HERE.joinpath("english_rules.toml").read_text("utf-8"))

_READINGS: defaultdict[str, dict[int, tuple[str, ...]]] = defaultdict(dict)
for _vowels, _row in _WORDS_DATA["words"].items():
    _reading = tuple(_vowels.split())
    for _word in _row.split():
        _READINGS[_word][len(_reading)] = _reading
_ENDINGS = tuple(
    (ending, () if vowel == "-" else (vowel,))
    for vowel, row in _WORDS_DATA["endings"].items()
    for ending in row.split()
)
_NEVER_SECOND = frozenset(_WORDS_DATA["compounds"]["never-second"].split())
_RULES = Rules(_RULES_DATA["rules"])
_BY_SYLLABLE = sorted(
    ((ending, vowel) for vowel, row in _RULES_DATA["syllables"].items() for ending in row.split()),
    key=lambda pair: -len(pair[0]),
)
_VOWEL_LETTER = re.compile("[aeiouyè]")
_CLOSED = re.compile("[aeiouy][^aeiouy]+e$")  # "lone-some": a silent e inside a word
_AMERICAN = re.compile("or(s?)$")  # "harbor"
_SHORT_STEM = re.compile("[^aeiou][aeiou][^aeiouwxy]$")  # doubles its consonant: "not-ted"
_LEAST_HALF = 3


def word_vowels(word: Word, following: str) -> list[str | None]:
    """The vowel of each syllable of a word; None where a syllable has none.

    `following` is the next word: "the" is ði before a vowel.
    """
    if word.syllables == ("the",):
        return ["i" if plain(following)[:1] in tuple("aeiou") else "ə"]
    return list(_word_vowels(tuple(plain(syllable, keep="è") for syllable in word.syllables)))


@lru_cache(maxsize=4096)
def _word_vowels(syllables: tuple[str, ...]) -> tuple[str | None, ...]:
    text = "".join(syllables)
    count = len(syllables)
    known = _listed(text, count) or _with_ending(text, count) or _compound(syllables)
    if known is None and count == 1 and plain(text) in _READINGS:
        return (_undivided(plain(text)),)
    if not _VOWEL_LETTER.search(text):
        return (None,) * count
    return known or _by_rules(tuple(syllable.replace("'", "") for syllable in syllables))


def _listed(text: str, count: int) -> tuple[str, ...] | None:
    if text not in _READINGS:
        text = plain(text).strip("'")
        text = text if text in _READINGS else _AMERICAN.sub(r"our\1", text)
    return _READINGS[text].get(count) if text in _READINGS else None


def _undivided(text: str) -> str:
    """The vowel held where a listed word of several syllables has one note: the first full one."""
    reading = min(_READINGS[text].values(), key=len)
    return next((vowel for vowel in reading if vowel != "ə"), reading[0])


def _with_ending(text: str, count: int) -> tuple[str, ...] | None:
    """The reading of a listed word with an ending: "loving", "heaviest", "stopped"."""
    text = plain(text)
    for ending, added in _ENDINGS:
        if not text.endswith(ending):
            continue
        stem = text[: -len(ending)]
        left = count - len(added)
        stems = [stem + "e"]
        if left != 1 or ending[0] not in "ei" or not _SHORT_STEM.search(stem):
            stems.insert(0, stem)
        if len(stem) > 2 and stem[-1] == stem[-2]:
            stems.append(stem[:-1])
        if stem.endswith("i"):
            stems.append(stem[:-1] + "y")
        for candidate in stems:
            if len(candidate) >= _LEAST_HALF and (found := _listed(candidate, left)):
                return found + added
    return None


def _compound(syllables: tuple[str, ...]) -> tuple[str | None, ...] | None:
    """The readings of two words side by side, the first one listed: "moon-light", "snow-flake"."""
    for cut in range(1, len(syllables)):
        halves = "".join(syllables[:cut]), "".join(syllables[cut:])
        if min(map(len, halves)) < _LEAST_HALF or halves[1] in _NEVER_SECOND:
            continue
        first, second = _listed(halves[0], cut), _listed(halves[1], len(syllables) - cut)
        if first and second:
            return first + second
    head, *rest = syllables
    if rest and len(head) > _LEAST_HALF and (found := _listed(head, 1)):
        return *found, *_word_vowels(tuple(rest))
    return None


def _by_rules(syllables: tuple[str, ...]) -> tuple[str | None, ...]:
    """The vowels of the rules, each given to the syllable its first letter stands in."""
    cut = next((index for index, text in enumerate(syllables[:-1], 1) if _CLOSED.search(text)), 0)
    if cut:
        return *_by_rules(syllables[:cut]), *_by_rules(syllables[cut:])
    bare = [plain(syllable) for syllable in syllables]
    ends = list(accumulate(map(len, bare)))
    found: list[list[tuple[int, str]]] = [[] for _ in syllables]
    for place, vowel in _RULES.read("".join(bare)):
        found[next(index for index, end in enumerate(ends) if place < end)].append((place, vowel))
    return tuple(
        _of_syllable(own, index, syllable)
        for index, (own, syllable) in enumerate(zip(found, syllables, strict=True))
    )


def _of_syllable(own: list[tuple[int, str]], index: int, syllable: str) -> str | None:
    if not own:
        alone = _RULES.read(plain(syllable))
        known = (vowel for ending, vowel in _BY_SYLLABLE if syllable.endswith(ending))
        return next(known, None) or next((vowel for _, vowel in alone), None)
    # "glo-rious" in two syllables: the i is a glide.
    if index and len(own) > 1 and own[0][1] == "i" and own[1][0] == own[0][0] + 1:
        return own[1][1]
    return own[0][1]
