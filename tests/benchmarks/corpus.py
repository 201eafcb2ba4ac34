"""Pieces with human analyses in music21's corpus, and the split that keeps a check set unseen.

The development set (even-numbered chorales of Riemenschneider's first twenty, Monteverdi's
third book) is for fitting and choosing. The check set (odd-numbered chorales, books four and
five) is for one reading of the figures at the end.

Conventions
-----------
* Labels are aligned by bar number and place in the bar's metre, never by absolute offset: the
  analyses and the scores split bars differently at repeats.
* Label times are quarter notes as played, like those of `Score`.
"""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

from music21 import converter
from music21 import corpus as music21_corpus
from music21.corpus import chorales as music21_chorales

from retune.harmony.model import Quality
from retune.harmony.states import TONES
from retune.score.model import Bar, Score

LEADING_NUMBER = re.compile(r"\d+")
"""Bars 4 and 4a are the two halves of the analysis's measure 4."""
QUALITY_OF_TONES = {frozenset(tones): quality for quality, tones in TONES.items()}
TRANSPOSED = {14: 5, 17: -2}
"""Semitones from the score in the corpus to the analysis, by Riemenschneider number."""
UNALIGNED = frozenset({11, 15})
"""BWV 41.6, whose score has trumpets and other bars than the analysis, and BWV 277, whose score
writes out the repeat that the analysis leaves folded."""


@dataclass(frozen=True)
class Piece:
    """A score with a human analysis: its group, files, and semitones from score to analysis."""

    name: str
    group: str
    score: Path
    analysis: Path
    transposed: int = 0


@dataclass(frozen=True)
class Label:
    """One chord of a human analysis; quality None for what the ten qualities do not hold."""

    onset: Fraction
    end: Fraction
    root: int
    quality: Quality | None
    tones: frozenset[int]
    figure: str


def _first_musicxml(found: Any) -> Path:
    paths = found if isinstance(found, list) else [found]
    return next(Path(path) for path in paths if Path(path).suffix in {".mxl", ".xml"})


def chorales(numbers: range) -> Iterator[Piece]:
    """Chorales by Riemenschneider number, those that align."""
    names = list(
        music21_chorales.Iterator(1, 20, numberingSystem="riemenschneider", returnType="filename")
    )
    for number in numbers:
        if number not in UNALIGNED:
            yield Piece(
                f"R{number:03d}",
                "chorales",
                _first_musicxml(music21_corpus.getWork(names[number - 1])),
                Path(
                    str(
                        music21_corpus.getWork(
                            f"bach/choraleAnalyses/riemenschneider{number:03d}.rntxt"
                        )
                    )
                ),
                TRANSPOSED.get(number, 0),
            )


def madrigals(books: tuple[int, ...]) -> Iterator[Piece]:
    """Madrigals of Monteverdi's books that have both score and analysis."""
    folder = Path(str(music21_corpus.getWork("monteverdi/madrigal.3.1.rntxt"))).parent
    for book in books:
        found = sorted(
            folder.glob(f"madrigal.{book}.*.rntxt"), key=lambda path: int(path.stem.split(".")[-1])
        )
        for analysis in found:
            score = analysis.with_suffix(".mxl")
            if score.exists():
                yield Piece(analysis.stem, "madrigals", score, analysis)


def development() -> list[Piece]:
    """The pieces to fit and choose on."""
    return [*chorales(range(2, 21, 2)), *madrigals((3,))]


def check() -> list[Piece]:
    """The unseen pieces: never fit, tune or choose on these."""
    return [*chorales(range(1, 21, 2)), *madrigals((4, 5))]


def read_labels(piece: Piece, score: Score) -> list[Label]:
    """The human analysis laid on the bars of a score as played, gaps left out."""
    parsed = converter.parse(
        str(piece.analysis), format="romanText", forceSource=True, storePickle=False
    )
    bars: dict[int, list[Bar]] = defaultdict(list)
    for bar in score.bars:
        number = LEADING_NUMBER.match(bar.number)
        if number is not None:
            bars[int(number[0])].append(bar)
    found: list[tuple[Fraction, Any]] = []
    for numeral in parsed.recurse().getElementsByClass("RomanNumeral"):
        measure = numeral.getContextByClass("Measure")
        place = Fraction(numeral.getOffsetInHierarchy(measure)) + Fraction(measure.paddingLeft)
        for bar in bars.get(measure.number, []):
            onset = bar.onset + place - bar.begins
            if bar.onset <= onset < bar.end:
                found.append((onset, numeral))
    found.sort(key=lambda pair: pair[0])
    labels = []
    for place, (onset, numeral) in enumerate(found):
        end = found[place + 1][0] if place + 1 < len(found) else score.end
        if end > onset:
            labels.append(_label(onset, end, numeral, piece.transposed))
    return labels


def _label(onset: Fraction, end: Fraction, numeral: Any, transposed: int) -> Label:
    root = (numeral.root().pitchClass - transposed) % 12
    tones = frozenset((pitch.pitchClass - transposed) % 12 for pitch in numeral.pitches)
    above = frozenset((tone - root) % 12 for tone in tones)
    return Label(onset, end, root, QUALITY_OF_TONES.get(above), tones, str(numeral.figure))
