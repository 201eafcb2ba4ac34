"""Signs of a music21 score as `Mark`s, and signs on notes, by tables of class names."""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from typing import Any

from retune.pitch import PitchClass
from retune.written import Mark, MarkKind, WrittenChordSymbol

# Class of an articulation or expression -> sign on a note.
NOTE_MARKS = {
    "Fermata": "fermata",
    "Staccato": "staccato",
    "Staccatissimo": "staccatissimo",
    "Accent": "accent",
    "StrongAccent": "marcato",
    "Tenuto": "tenuto",
    "BreathMark": "breath",
    "Caesura": "caesura",
}

# Class of a repeat sign -> kind of mark and how the jump ends.
_JUMPS = {
    "Segno": (MarkKind.SEGNO, None),
    "Coda": (MarkKind.CODA, None),
    "Fine": (MarkKind.FINE, None),
    "DaCapo": (MarkKind.DA_CAPO, ""),
    "DaCapoAlFine": (MarkKind.DA_CAPO, "fine"),
    "DaCapoAlCoda": (MarkKind.DA_CAPO, "coda"),
    "DalSegno": (MarkKind.DAL_SEGNO, ""),
    "DalSegnoAlFine": (MarkKind.DAL_SEGNO, "fine"),
    "DalSegnoAlCoda": (MarkKind.DAL_SEGNO, "coda"),
}


def note_marks(element: Any) -> frozenset[str]:
    """The signs on a note, chord or rest."""
    signs = (*element.expressions, *element.articulations)
    names = (type(sign).__name__ for sign in signs)
    return frozenset(NOTE_MARKS[name] for name in names if name in NOTE_MARKS)


def marks_of(element: Any, onset: Fraction) -> Iterator[Mark]:
    """The marks that a music21 element in a bar stands for; none for most classes."""
    name = type(element).__name__
    if name in _JUMPS:
        yield Mark(_JUMPS[name][0], onset, _JUMPS[name][1])
    elif name == "MetronomeMark":
        yield from _tempo(element, onset)
    elif name in ("TempoText", "TextExpression", "RehearsalMark"):
        kind = MarkKind.REHEARSAL if name == "RehearsalMark" else MarkKind.WORDS
        text = str(getattr(element, "content", None) or getattr(element, "text", "")).strip()
        if text:
            yield Mark(kind, onset, text)
    elif name == "Dynamic":
        yield Mark(MarkKind.DYNAMIC, onset, str(element.value))
    elif "ChordSymbol" in element.classes:
        yield from _chord_symbol(element, onset)


def _tempo(element: Any, onset: Fraction) -> Iterator[Mark]:
    if element.text and not element.textImplicit:
        yield Mark(MarkKind.WORDS, onset, str(element.text))
    quarters = None if element.numberImplicit else element.getQuarterBPM()
    if quarters is not None and quarters > 0:
        yield Mark(MarkKind.TEMPO, onset, Fraction(quarters).limit_denominator(1000))


def _chord_symbol(element: Any, onset: Fraction) -> Iterator[Mark]:
    root, bass = element.root(), element.bass()
    if root is not None and element.chordKind:
        below = pitch_class(bass) if bass is not None and bass.name != root.name else None
        symbol = WrittenChordSymbol(pitch_class(root), str(element.chordKind), below)
        yield Mark(MarkKind.CHORD_SYMBOL, onset, symbol)


def pitch_class(pitch: Any) -> PitchClass:
    """A music21 pitch without its octave."""
    return PitchClass(pitch.step, round(pitch.alter))


def bar_line_marks(measure: Any, length: Fraction) -> Iterator[Mark]:
    """Fermatas on the bar lines of a measure."""
    for line, onset in ((measure.leftBarline, Fraction(0)), (measure.rightBarline, length)):
        if line is not None and getattr(line, "pause", None) is not None:
            yield Mark(MarkKind.FERMATA, onset)
