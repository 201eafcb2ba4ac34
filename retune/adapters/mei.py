"""What music21 leaves out of an MEI file: title, composer, fermatas, tempi in figures."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

from retune.adapters.xml import Element

_ID = "{http://www.w3.org/XML/1998/namespace}id"
_FIGURE = re.compile(r"\d{1,4}(\.\d{1,4})?")
_SIGNED = ("note", "chord", "rest")


def add_title_signs_and_tempi(root: Element, score: Any) -> None:
    """Put on a parsed score what its MEI tree says besides; `root` has no namespaces.

    Fermatas go to the notes they name by xml:id. Figures of tempo (`midi.bpm`, quarter notes a
    minute) go to the first part: a score definition's at the start, a tempo's at its beat.
    """
    from music21 import expressions

    _add_titles(root, score)
    held = set(_held(root))
    fermata: Any = expressions.Fermata
    for element in score.recurse().notesAndRests:
        if element.id in held and not any("Fermata" in e.classes for e in element.expressions):
            element.expressions.append(fermata())
    _add_tempi(root, score)


def _held(root: Element) -> Iterator[str]:
    """Identities of the notes and rests under a fermata."""
    for kind in _SIGNED:
        for element in root.findall(f".//{kind}"):
            if element.get("fermata") and element.get(_ID):
                yield element.get(_ID) or ""
    for fermata in root.findall(".//fermata"):
        yield (fermata.get("startid") or "").removeprefix("#")


def _add_titles(root: Element, score: Any) -> None:
    from music21 import metadata

    if score.metadata is None:
        score.insert(0, metadata.Metadata())
    head = root.find(".//meiHead")
    if head is None:
        return
    title = head.findtext(".//titleStmt/title")
    composer = head.findtext(".//composer") or head.findtext(".//persName[@role='composer']")
    if title and not score.metadata.title:
        score.metadata.title = title
    if composer and not score.metadata.composer:
        score.metadata.composer = composer


def _add_tempi(root: Element, score: Any) -> None:
    part = next(iter(score.parts), None)
    measures = list(part.getElementsByClass("Measure")) if part is not None else []
    if not measures:
        return
    start = root.find(".//scoreDef")
    if start is not None:
        _add_tempo(start, measures[0], 0.0)
    for measure, element in zip(measures, root.findall(".//measure"), strict=False):
        for tempo in element.findall("tempo"):
            beat = tempo.get("tstamp") or "1"
            if _FIGURE.fullmatch(beat):
                quarters = measure.barDuration.quarterLength / (_beats(measure) or 1)
                _add_tempo(tempo, measure, (float(beat) - 1) * quarters)


def _beats(measure: Any) -> int:
    metre = measure.getContextByClass("TimeSignature")
    return int(metre.numerator) if metre is not None else 4


def _add_tempo(element: Element, measure: Any, offset: float) -> None:
    from music21 import tempo

    figure = element.get("midi.bpm") or ""
    if _FIGURE.fullmatch(figure) and float(figure) > 0 and offset >= 0:
        measure.insert(offset, tempo.MetronomeMark(number=float(figure)))
