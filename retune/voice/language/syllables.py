"""Lyrics as words: what is left of a syllable without its punctuation, and which belong together.

A note's lyric is one syllable, or several that are elided; a hyphen at its end (or at the start of
the next) joins it to the word. Words are needed whole, since a vowel depends on what follows it.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass

_HYPHENS = "\u2010\u2011\u00ad\u2013-"
_APOSTROPHES = str.maketrans(dict.fromkeys("’ʼ‘`´′", "'"))
_LIGATURES = str.maketrans({"æ": "ae", "ǽ": "ae", "œ": "oe", "ﬁ": "fi", "ﬂ": "fl"})
_ELISIONS = re.compile(r"[\s_\u203f\u2040\u035c]+")  # \s holds the no-break spaces
_MOST_SYLLABLES = 24  # no word has more; a part with a hyphen after every note is cut there
_MOST_LETTERS = 40  # of one syllable, or of a word set whole to one note
_LOOSE_HYPHEN = re.compile(rf"\s+([{_HYPHENS}]+)$")
_CLOSING = ".,;:!?\"'”’»)"
_ELIDED = re.compile(r"\w['’]\W*$")  # a letter left out inside a word: "ew'-ge"
_NOT_WORD = re.compile(r"[^\w'\u0300-\u0308]|[\d_]")


@dataclass(frozen=True, slots=True)
class Word:
    """The syllables of one word, lower case and in NFC, and the note that each is sung on."""

    syllables: tuple[str, ...]
    notes: tuple[int, ...]

    @property
    def text(self) -> str:
        """The whole word."""
        return "".join(self.syllables)


def words_of(lyrics: Sequence[str]) -> list[Word]:
    """The words of a part's lyrics, one lyric a note.

    Lyrics without a letter ("", "-", "1.") belong to no word. An elided lyric ends one word and
    starts the next.

    >>> words_of(["1. Glo-", "ri-", "a_e", ""])[0]
    Word(syllables=('glo', 'ri', 'a'), notes=(0, 1, 2))
    """
    words: list[Word] = []
    joined = False
    for note, lyric in enumerate(lyrics):
        tight = _LOOSE_HYPHEN.sub(r"\1", unicodedata.normalize("NFC", lyric))
        for piece in _ELISIONS.split(tight):
            text = letters(piece)[:_MOST_LETTERS]
            if not text:
                continue
            hyphened = piece.rstrip(_CLOSING).endswith(tuple(_HYPHENS))
            if hyphened and _ELIDED.search(piece):
                text += "'"
            last = words[-1] if words else None
            goes_on = joined or piece[0] in _HYPHENS
            if last and goes_on and len(last.notes) < _MOST_SYLLABLES:
                words[-1] = Word((*last.syllables, text), (*last.notes, note))
            else:
                words.append(Word((text,), (note,)))
            joined = hyphened
    return words


def letters(piece: str) -> str:
    """A lyric's letters and inner apostrophes, lower case; "" where it has no letter.

    >>> letters("“Heav’n,”"), letters("2)"), letters("cæ-")
    ("heav'n", '', 'cae')
    """
    text = unicodedata.normalize("NFC", piece.translate(_APOSTROPHES).lower())
    return _NOT_WORD.sub("", text.translate(_LIGATURES)).strip("'")


def plain(text: str, keep: str = "") -> str:
    """A text without accents, but for the letters to keep.

    >>> plain("glória"), plain("für é", keep="ü")
    ('gloria', 'für e')
    """
    return "".join(
        mark if mark in keep else _base(mark) for mark in unicodedata.normalize("NFC", text)
    )


def _base(letter: str) -> str:
    decomposed = unicodedata.normalize("NFD", letter)
    return "".join(mark for mark in decomposed if not unicodedata.combining(mark))
