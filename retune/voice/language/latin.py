"""Latin as choirs sing it in the Italian manner.

Five vowels: a, ɛ, i, ɔ, u, with e and o always open, as the preface of the Liber Usualis has
them ("e" as in "Fred", "o" as in "for"; from memory). ae and oe are e, y is i; au, eu and ei in
one syllable hold their first vowel. i before a vowel of the same syllable is a glide, and so is u
after q and ng and before a, e, o. The score's own syllables decide everything else.
"""

from __future__ import annotations

import re

from retune.voice.language.syllables import Word, plain

_VOWELS = {"a": "a", "e": "ɛ", "i": "i", "y": "i", "o": "ɔ", "u": "u"}
_DIGRAPH = re.compile("[ao]e")
_GLIDE = re.compile("[iyj](?=[aeiouy])|(?<=q)u(?=[aeiouy])|(?<=ng)u(?=[aeiouy])|u(?=[aeo])")
_WORDLESS = re.compile("[^aeiouy]?oo+h?")
_DIAERESIS = "ëï"


def word_vowels(word: Word, following: str) -> list[str | None]:
    """The vowel of each syllable of a word; None where a syllable has none."""
    return [_vowel(syllable, word.text) for syllable in word.syllables]


def _vowel(syllable: str, word: str) -> str | None:
    if _WORDLESS.fullmatch(word):
        return "u"
    text = _DIGRAPH.sub("e", plain(syllable, keep=_DIAERESIS))
    # "sanguis" is commonly divided after the n, which leaves gu at the start of the syllable.
    if "ng" in word and text.startswith("gu") and len(text) > 2:
        text = "n" + text
    found = next((mark for mark in _GLIDE.sub("", plain(text)) if mark in _VOWELS), None)
    return _VOWELS[found] if found else None
