"""Which verse is sung in which pass, and whose words a voice without words sings.

Conventions
-----------
* A turn is the pass of a repeated bar, from 1; it asks for the verse of that number.
* Where a verse is missing in a bar, the nearest lower one that stands there is sung again
  (a refrain is printed once), else the lowest, else a named one such as "chorus".
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction
from functools import lru_cache

from retune.errors import Weight
from retune.score.ledger import Ledger
from retune.score.lines import Line, LineBars
from retune.score.model import PartKind
from retune.written import WrittenLyric, WrittenNote

NAMED = 0
"""Stands for a verse whose name holds no number."""

_LAST_NUMBER = re.compile(r"(\d+)\D*$")


@lru_cache(maxsize=1024)
def verse_number(name: str) -> int:
    """The number in a verse's name, 0 where it holds none.

    >>> verse_number("part1verse2"), verse_number("chorus")
    (2, 0)
    """
    found = _LAST_NUMBER.search(name)
    return int(found[1]) if found else NAMED


def syllable(lyric: WrittenLyric) -> str:
    """A syllable as it is shown, with a hyphen where the word goes on."""
    return lyric.text + "-" if lyric.syllabic in ("begin", "middle") else lyric.text


def report_unsung(verses: Sequence[Verses], ledger: Ledger) -> None:
    """Note the verses of a score that no pass reaches."""
    printed = frozenset().union(*(line.printed for line in verses))
    unsung = printed.difference(*(line.sung for line in verses))
    numbers = sorted(unsung - {NAMED})
    if numbers:
        which = ", ".join(map(str, numbers))
        what = f"verse {which} is printed, but no repeat leads to it; not sung"
        ledger.add(Weight.LOSS, what)


class Verses:
    """The verses of one line, bar by bar."""

    def __init__(self, bars: LineBars) -> None:
        printed = [
            frozenset(verse_number(lyric.verse) for note in bar for lyric in note.lyrics)
            for bar in bars
        ]
        none: frozenset[int] = frozenset()
        # A bar-long melisma of one verse stands between two bars that have that verse.
        self._verses = [
            here | (before & after)
            for before, here, after in zip(
                [none, *printed], printed, [*printed[1:], none], strict=False
            )
        ]
        self.printed = frozenset().union(*printed)
        self.sung: set[int] = set()
        self._chosen: dict[tuple[int, int], int] = {}

    def words(self, note: WrittenNote, bar: int, turn: int) -> str:
        """The syllable that a note of a written bar gets in a turn; "" for none."""
        lyrics = [lyric for lyric in note.lyrics if not lyric.passes or turn in lyric.passes]
        if not lyrics:
            return ""
        limited = [lyric for lyric in lyrics if lyric.passes]
        verse = self._verse(bar, turn)
        for lyric in limited or lyrics:
            number = verse_number(lyric.verse)
            if limited or number == verse or (number == NAMED and len(lyrics) == 1):
                self.sung.add(number)
                return syllable(lyric)
        return ""

    def _verse(self, bar: int, turn: int) -> int:
        known = self._chosen.get((bar, turn))
        if known is None:
            numbers = self._verses[bar] - {NAMED}
            lower = [number for number in numbers if number <= turn]
            known = max(lower) if lower else min(numbers, default=NAMED)
            self._chosen[(bar, turn)] = known
        return known


def with_shared_words(lines: Sequence[Line], ledger: Ledger) -> list[Line]:
    """Lines in which singers without words of their own read those of their neighbours.

    On one staff bar by bar; a line without any words takes those of the nearest line, the one
    above first. Only notes that begin together with a syllable get it.
    """
    singing = [
        place for place, line in enumerate(lines) if line.kind is PartKind.VOICE and line.singers
    ]
    result = list(lines)
    for place in singing:
        line = lines[place]
        others = [lines[other] for other in singing if other != place]
        result[place] = _reading(
            line, [o for o in others if (o.written, o.staff) == (line.written, line.staff)]
        )
    with_words = [place for place in singing if _has_words(lines[place])]
    borrowers: dict[str, list[str]] = {}
    for place in singing if with_words else ():
        if not _has_words(result[place]):
            nearest = result[min(with_words, key=lambda other: (abs(other - place), other))]
            result[place] = _reading(result[place], [nearest])
            borrowers.setdefault(nearest.label.name, []).append(lines[place].label.name)
    for lender, names in borrowers.items():
        what = f"no words of their own in {', '.join(names)}: they sing those of {lender}"
        ledger.add(Weight.NOTE, f"{what} where both begin together")
    return result


def _has_words(line: Line) -> bool:
    return any(note.lyrics for bar in line.bars for note in bar)


def _reading(line: Line, others: Sequence[Line]) -> Line:
    """A line with words from others in the bars where it has none."""
    bars = list(line.bars)
    changed = False
    for index, bar in enumerate(bars):
        if not bar or any(note.lyrics for note in bar):
            continue
        words: dict[Fraction, tuple[WrittenLyric, ...]] = {
            note.onset: note.lyrics for other in others for note in other.bars[index] if note.lyrics
        }
        if words:
            bars[index] = tuple(_with_words(note, words) for note in bar)
            changed = True
    return replace(line, bars=tuple(bars)) if changed else line


def _with_words(note: WrittenNote, words: dict[Fraction, tuple[WrittenLyric, ...]]) -> WrittenNote:
    lyrics = words.get(note.onset)
    if lyrics is None or note.grace or note.tie_stop:
        return note
    return replace(note, lyrics=lyrics)
