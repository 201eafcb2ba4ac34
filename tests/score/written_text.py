"""Written scores in a terse notation, for the tests of the builder.

A voice is a text of tokens "PITCH/LENGTH": "C5/1 D5+F5/1/2 r/2". Pitches joined by + are a chord,
r is a rest, h a hidden rest, s a skip. Before the pitch: ~ the end of a tie, ' a grace note
(which takes no length). After the length: ~ the start of a tie, ^ a fermata, > an accent,
=word a syllable (word- goes on), several verses parted by |.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import replace
from fractions import Fraction
from typing import Any

from retune.pitch import Pitch
from retune.score.build import build_score
from retune.score.model import Score
from retune.score.options import ReadOptions
from retune.written import (
    Mark,
    MarkKind,
    WrittenBar,
    WrittenLyric,
    WrittenNote,
    WrittenPart,
    WrittenRest,
    WrittenScore,
)

_TOKEN = re.compile(
    r"(?P<stop>~)?(?P<grace>')?(?P<what>[^/=]+)(/(?P<length>\d+(/\d+)?))?(?P<signs>[~^>]*)(=(?P<words>.*))?"
)
_SIGNS = {"^": "fermata", ">": "accent"}


def _lyrics(words: str | None) -> tuple[WrittenLyric, ...]:
    if not words:
        return ()
    return tuple(
        WrittenLyric(text.rstrip("-"), "begin" if text.endswith("-") else "single", str(verse))
        for verse, text in enumerate(words.split("|"), 1)
        if text
    )


class _Reader:
    def __init__(self, staff: int, voice: str, label: str) -> None:
        self.staff, self.voice, self.label = staff, voice, label
        self.now = Fraction(0)
        self.notes: list[WrittenNote] = []
        self.rests: list[WrittenRest] = []

    def read(self, token: str) -> None:
        match = _TOKEN.fullmatch(token)
        assert match is not None, token
        length = Fraction(match["length"] or 0)
        marks = frozenset(_SIGNS[sign] for sign in match["signs"] if sign in _SIGNS)
        if match["what"] in ("r", "h"):
            hidden = match["what"] == "h"
            self.rests.append(WrittenRest(self.now, length, self.staff, self.voice, hidden, marks))
        elif match["what"] != "s":
            for name in match["what"].split("+"):
                self.notes.append(
                    WrittenNote(
                        self.now,
                        length,
                        Pitch.parse(name),
                        self.staff,
                        self.voice,
                        tie_start="~" in match["signs"],
                        tie_stop=match["stop"] is not None,
                        grace=match["grace"] is not None,
                        lyrics=_lyrics(match["words"]),
                        marks=marks,
                        source=f"{self.label}.{len(self.notes)}",
                    )
                )
        self.now += length


def bar(*voices: str, staff: int = 1, **fields: Any) -> WrittenBar:
    """A bar with voices "1", "2" and so on; a voice may begin with its own "staff.voice:"."""
    notes: list[WrittenNote] = []
    rests: list[WrittenRest] = []
    length = Fraction(0)
    for index, text in enumerate(voices, 1):
        place, colon, rest = text.partition(":")
        staff_text, _, voice = place.partition(".") if colon else (str(staff), "", str(index))
        reader = _Reader(int(staff_text), voice, f"v{voice}s{staff_text}")
        for token in (rest if colon else text).split():
            reader.read(token)
        notes += reader.notes
        rests += reader.rests
        length = max(length, reader.now)
    return WrittenBar(
        fields.pop("number", ""), fields.pop("length", length), tuple(notes), tuple(rests), **fields
    )


def part(name: str, *bars: WrittenBar | str, **fields: Any) -> WrittenPart:
    """A part in 4/4 with bars numbered from 1 where they have no number."""
    made = [one if isinstance(one, WrittenBar) else bar(one) for one in bars]
    made = [
        replace(
            one,
            number=one.number or str(index),
            metre=one.metre or (fields.get("metre", (4, 4)) if index == 1 else None),
            notes=tuple(
                replace(note, source=f"{name}.{index}.{note.source}") for note in one.notes
            ),
        )
        for index, one in enumerate(made, 1)
    ]
    fields.pop("metre", None)
    return WrittenPart(fields.pop("id", name or "P"), name, tuple(made), **fields)


def words(text: str, onset: int | Fraction = 0, staff: int = 0) -> Mark:
    """Words in the score."""
    return Mark(MarkKind.WORDS, Fraction(onset), text, staff)


def mark(kind: MarkKind, value: Any = None, onset: int | Fraction = 0, staff: int = 0) -> Mark:
    """Any mark."""
    return Mark(kind, Fraction(onset), value, staff)


def play(*parts: WrittenPart, **options: Any) -> Score:
    """The parts as played."""
    return build_score(
        WrittenScore(tuple(parts)), stem="piece", file="piece.xml", options=ReadOptions(**options)
    )


def sung(score: Score, name: str | None = None) -> list[str]:
    """A part's notes as "PITCH@ONSET+DURATION"; the first part's without a name."""
    index = 0 if name is None else [part.name for part in score.parts].index(name)
    return [
        f"{note.pitch}@{note.onset}+{note.duration}" for note in score.notes if note.part == index
    ]


def names(score: Score) -> list[str]:
    """The names of the parts."""
    return [part.name for part in score.parts]


def bar_numbers(score: Score) -> str:
    """The printed numbers of the bars as played."""
    return " ".join(one.number for one in score.bars)


def remarks(score: Score, text: str = "") -> list[str]:
    """The findings whose text holds a piece of text."""
    return [str(finding) for finding in score.findings if text in str(finding)]


def sources(notes: Iterable[WrittenNote]) -> Sequence[str]:
    """The identities of noteheads."""
    return [note.source for note in notes]
