"""Which vowel is sung on each note, from the words.

The vowels are those that singers hold: the first part of a diphthong, the vowel after a glide.
Each language has its module; `latin`, `italian`, `german` and `english` say what they assume.
"""

from __future__ import annotations

import difflib
from collections.abc import Callable, Sequence

from retune.errors import WishError
from retune.voice.language import english, german, italian, latin
from retune.voice.language.syllables import Word, words_of

_Reader = Callable[[Word, str], Sequence[str | None]]

_READERS: dict[str, _Reader] = {
    "latin": latin.word_vowels,
    "italian": italian.word_vowels,
    "german": german.word_vowels,
    "english": english.word_vowels,
}
LANGUAGES = ("latin", "italian", "german", "english")
NEUTRAL = "neutral"
VOWELS = (*"aeɛiɪoɔuʊyøœæʌəɜ", NEUTRAL)
"""Every name that `vowels` may give, in the letters of the International Phonetic Alphabet."""

_OPENNESS = dict.fromkeys("ɛɔæʌœɜ", 2) | dict.fromkeys("eoøə", 1) | {"a": 3, NEUTRAL: -1}


def vowels(syllables: Sequence[str], language: str) -> list[str]:
    """One vowel name per note of a part, in order.

    Where a lyric elides several vowels on one note, the most open one is held, and of two that
    are equally open the last: the usual nucleus of such a merger (common practice, no source).

    Parameters
    ----------
    syllables : sequence of str
        `Note.lyric` of each note: a trailing hyphen inside a word ("Glo-", "ri-", "a"), and ""
        on a note that continues the syllable before.
    language : str
        One of `LANGUAGES`.

    Returns
    -------
    list of str
        Names out of `VOWELS`, as many as there are syllables. Notes before any word, and words
        without a vowel ("Mm"), are "neutral".

    Raises
    ------
    WishError
        No such language.

    >>> vowels(["Glo-", "", "ri-", "a"], "latin")
    ['ɔ', 'ɔ', 'i', 'a']
    """
    if language not in _READERS:
        near = difflib.get_close_matches(language.strip().lower(), LANGUAGES, n=1)
        ask = f"Did you mean {near[0]}? " if near else ""
        hint = f"{ask}The languages are {', '.join(LANGUAGES)}"
        raise WishError(f"no language is called '{language}'", hint=hint)
    read = _READERS[language]
    words = words_of(syllables)
    sung: dict[int, str] = {}
    for index, word in enumerate(words):
        following = words[index + 1].text if index + 1 < len(words) else ""
        for note, vowel in zip(word.notes, _without_gaps(read(word, following)), strict=True):
            before = sung.get(note)
            if before is None or _openness(vowel) >= _openness(before):
                sung[note] = vowel
    held, result = NEUTRAL, []
    for note in range(len(syllables)):
        held = sung.get(note, held)
        result.append(held)
    return result


def _openness(vowel: str) -> int:
    return _OPENNESS.get(vowel, 0)


def _without_gaps(found: Sequence[str | None]) -> list[str]:
    """A syllable without a vowel of its own is sung on the one before it in the word."""
    held = next((vowel for vowel in found if vowel), NEUTRAL)
    result = []
    for vowel in found:
        held = vowel or held
        result.append(held)
    return result
