"""One part of a music21 score as a `WrittenPart`: bars, notes, rests, signs.

Conventions
-----------
* The music21 score is at sounding pitch already.
* Onsets are `Fraction` quarter notes from the start of the bar.
* music21 carries no types: `Any` stands for its streams and elements.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

from retune.adapters.notation_marks import bar_line_marks, marks_of, note_marks
from retune.pitch import Pitch
from retune.written import (
    Mark,
    MarkKind,
    WrittenBar,
    WrittenLyric,
    WrittenNote,
    WrittenPart,
    WrittenRest,
)

_SYLLABICS = frozenset(("single", "begin", "middle", "end"))


@dataclass
class _Contents:
    """What is found in one bar while it is read."""

    notes: list[WrittenNote] = field(default_factory=list)
    rests: list[WrittenRest] = field(default_factory=list)
    marks: list[Mark] = field(default_factory=list)
    reach: Fraction = Fraction(0)
    unpitched: int = 0


class PartReader:
    """Reads one music21 part that has measures.

    `number` makes the sources of its notes unique in the score.
    """

    def __init__(self, part: Any, number: int) -> None:
        self._part = part
        self._number = number
        self._heads = 0
        self._where: dict[int, tuple[int, Fraction, Fraction]] = {}

    def read(self) -> WrittenPart:
        """The part with all its bars."""
        measures = _measures(self._part)
        contents = [self._contents(measure, index) for index, measure in enumerate(measures)]
        for index, mark in self._hairpins():
            contents[index].marks.append(mark)
        opens, closes = _endings(self._part, measures)
        instrument = self._part["Instrument"].first()
        return WrittenPart(
            id=str(self._part.id),
            name=_text(self._part.partName) or _text(getattr(instrument, "partName", "")),
            abbreviation=_text(self._part.partAbbreviation),
            instrument=_text(getattr(instrument, "instrumentName", "")),
            program=getattr(instrument, "midiProgram", None),
            clefs=_first_clef(self._part),
            unpitched=sum(found.unpitched for found in contents),
            bars=tuple(
                _bar(measure, number, found, opens.get(index, ()), index in closes)
                for index, (measure, number, found) in enumerate(
                    zip(measures, _numbers(measures), contents, strict=True)
                )
            ),
        )

    def _contents(self, measure: Any, index: int) -> _Contents:
        found = _Contents()
        for element, onset, voice in _elements(measure):
            if "GeneralNote" in element.classes and "ChordSymbol" not in element.classes:
                length = _duration(element)
                found.reach = max(found.reach, onset + length)
                self._where[id(element)] = (index, onset, length)
                self._add(element, onset, length, voice, found)
            else:
                found.marks.extend(marks_of(element, onset))
        return found

    def _add(
        self, element: Any, onset: Fraction, length: Fraction, voice: str, found: _Contents
    ) -> None:
        if element.isRest:
            hidden = bool(element.style.hideObjectOnPrint)
            signs = note_marks(element)
            found.rests.append(WrittenRest(onset, length, voice=voice, hidden=hidden, marks=signs))
            return
        heads = [head for head in _heads(element) if hasattr(head, "pitch")]
        found.unpitched += len(_heads(element)) - len(heads)
        for place, head in enumerate(heads):
            self._heads += 1
            tie = "" if head.tie is None else head.tie.type
            found.notes.append(
                WrittenNote(
                    onset,
                    length,
                    _pitch(head.pitch),
                    voice=voice,
                    tie_start=tie in ("start", "continue"),
                    tie_stop=tie in ("stop", "continue"),
                    grace=bool(element.duration.isGrace),
                    lyrics=() if place else tuple(_lyrics(element)),
                    marks=note_marks(element),
                    source=f"{self._number}.{self._heads}",
                )
            )

    def _hairpins(self) -> Iterator[tuple[int, Mark]]:
        """The ends of hairpins, each with the bar it stands in."""
        for spanner in self._part["DynamicWedge"]:
            first = self._where.get(id(spanner.getFirst()))
            last = self._where.get(id(spanner.getLast()))
            if first is None or last is None:
                continue
            kind = "crescendo" if "Crescendo" in spanner.classes else "diminuendo"
            yield first[0], Mark(MarkKind.HAIRPIN, first[1], kind)
            yield last[0], Mark(MarkKind.HAIRPIN, last[1] + last[2], "stop")


def _measures(part: Any) -> list[Any]:
    """The measures of a part, without an empty one that a last repeat sign leaves behind."""
    measures = list(part.getElementsByClass("Measure"))
    while len(measures) > 1 and not measures[-1]["GeneralNote"]:
        measures.pop()
    return measures


def _elements(measure: Any) -> Iterator[tuple[Any, Fraction, str]]:
    """Everything in a measure with its onset and voice, voices one after another."""
    for element in measure:
        if "Voice" not in element.classes:
            yield element, Fraction(element.offset), "1"
    for number, voice in enumerate(measure.voices, start=1):
        start = Fraction(voice.offset)
        for element in voice:
            yield element, start + Fraction(element.offset), str(number)


def _heads(element: Any) -> Sequence[Any]:
    """The noteheads of a note or chord."""
    return tuple(element.notes) if hasattr(element, "notes") else (element,)


def _duration(element: Any) -> Fraction:
    return Fraction(0) if element.duration.isGrace else Fraction(element.duration.quarterLength)


def _pitch(pitch: Any) -> Pitch:
    return Pitch(pitch.step, round(pitch.alter), pitch.implicitOctave)


def _lyrics(element: Any) -> Iterator[WrittenLyric]:
    for lyric in element.lyrics:
        text = _text(lyric.text)
        if text:
            syllabic = lyric.syllabic if lyric.syllabic in _SYLLABICS else "single"
            if syllabic in ("begin", "middle"):
                text = text.removesuffix("-") or text
            yield WrittenLyric(text, syllabic, str(lyric.identifier or lyric.number))


def _text(value: object) -> str:
    return " ".join(str(value).split()) if value else ""


def _numbers(measures: Sequence[Any]) -> Iterator[str]:
    """Bar numbers; a bar without one goes on with the number before it."""
    number = "0"
    for measure in measures:
        if measure.number:
            number = f"{measure.number}{measure.numberSuffix or ''}"
        yield number


def _bar(
    measure: Any, number: str, found: _Contents, ending: tuple[int, ...], ending_stop: bool
) -> WrittenBar:
    length = found.reach or Fraction(measure.barDuration.quarterLength)
    metre = measure["TimeSignature"].first()
    left, right = measure.leftBarline, measure.rightBarline
    return WrittenBar(
        number=number,
        length=length,
        notes=tuple(found.notes),
        rests=tuple(found.rests),
        marks=(*found.marks, *bar_line_marks(measure, length)),
        implicit=not measure.number,
        metre=(metre.numerator, metre.denominator) if metre is not None else None,
        key=_key(measure),
        repeat_start=getattr(left, "direction", "") == "start",
        repeat_end=(right.times or 2) if getattr(right, "direction", "") == "end" else 0,
        ending=ending,
        ending_stop=ending_stop,
    )


def _key(measure: Any) -> tuple[int, str | None] | None:
    """The key signature of a measure; a key named beside a bare signature gives its mode."""
    signatures = list(measure["KeySignature"])
    if not signatures:
        return None
    modes = [one.mode for one in signatures if "Key" in one.classes]
    bare = [one.sharps for one in signatures if "Key" not in one.classes]
    return (bare or [signatures[-1].sharps])[-1], modes[-1] if modes else None


def _endings(
    part: Any, measures: Sequence[Any]
) -> tuple[dict[int, tuple[int, ...]], frozenset[int]]:
    """The passes of the endings that bars open, and the bars that close one."""
    place = {id(measure): index for index, measure in enumerate(measures)}
    opens: dict[int, tuple[int, ...]] = {}
    closes: set[int] = set()
    for bracket in part["RepeatBracket"]:
        spanned = [place[id(m)] for m in bracket.getSpannedElements() if id(m) in place]
        if spanned:
            opens[min(spanned)] = tuple(int(number) for number in bracket.numberRange)
            closes.add(max(spanned))
    return opens, frozenset(closes)


def _first_clef(part: Any) -> tuple[str, ...]:
    clef = part["Clef"].first()
    if clef is None or clef.sign not in ("G", "F", "C"):
        return ()
    return ("G8",) if clef.sign == "G" and clef.octaveChange == -1 else (clef.sign,)
