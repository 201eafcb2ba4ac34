"""A written score as MusicXML, written by music21: ties, tuplets, beams and rests are its own.

What it needs is a `WrittenScore` whose bars are filled or short, never too full, and whose notes
end inside their bar. Signs and lyrics of the notes, metres, keys and tempi are written.
"""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator, Sequence
from fractions import Fraction
from typing import Any, cast

from retune.adapters.music21_parsing import guarded
from retune.errors import OutputError, UnreadableError
from retune.pitch import Pitch
from retune.written import MarkKind, WrittenBar, WrittenNote, WrittenPart, WrittenScore

_DATE = re.compile(rb"\s*<encoding-date>[^<]*</encoding-date>")
# music21 says that it composed what has no composer.
_DATE_AND_COMPOSER = re.compile(_DATE.pattern + rb"|\s*<creator[^<]*</creator>")
_ALTERED = {-2: "--", -1: "-", 0: "", 1: "#", 2: "##"}


def write_musicxml(score: WrittenScore) -> bytes:
    """The bytes of an uncompressed MusicXML file, the same each time.

    Parts have the ids P1, P2 and so on. Raises `OutputError` where music21 cannot write it.
    """
    try:
        with guarded("MusicXML"):
            m21 = _music21()
            exporter = m21.musicxml.m21ToXml.GeneralObjectExporter(_stream(score))
            made: bytes = exporter.parse()
    except UnreadableError as fault:
        reason = str(fault.__cause__ or fault).split("\n")[0][:200]
        raise OutputError(f"it cannot be written as notation: {reason}") from fault
    return (_DATE if score.composer else _DATE_AND_COMPOSER).sub(b"", made)


def _stream(score: WrittenScore) -> Any:
    m21 = _music21()
    whole = m21.stream.Score()
    about = m21.metadata.Metadata()
    about.title = score.title or " "
    about.composer = score.composer or None
    about.lyricist = score.lyricist or None
    about.copyright = score.copyright or None
    whole.insert(0, about)
    for number, part in enumerate(score.parts, 1):
        whole.insert(0, _part(part, number))
    return whole


def _part(part: WrittenPart, number: int) -> Any:
    m21 = _music21()
    made = m21.stream.Part(id=f"P{number}")
    sound = m21.instrument.Instrument()
    sound.partId, sound.instrumentId = f"P{number}", f"P{number}-I1"
    sound.partName = part.name
    sound.partAbbreviation = part.abbreviation or None
    sound.instrumentName = part.instrument or part.name
    sound.midiProgram = part.program
    made.insert(0, sound)
    made.partName = part.name
    made.partAbbreviation = part.abbreviation
    start = Fraction(0)
    metre = (4, 4)
    for index, bar in enumerate(part.bars):
        measure = m21.stream.Measure(number=index + 1)
        if index == 0:
            kinds = {"F": m21.clef.BassClef, "G8": m21.clef.Treble8vbClef}
            measure.insert(0, kinds.get(part.clefs[0] if part.clefs else "", m21.clef.TrebleClef)())
        _head(bar, measure)
        metre = bar.metre or metre
        _fill(bar, measure)
        full = Fraction(4 * metre[0], metre[1])
        if bar.length < full:
            measure.paddingLeft = full - bar.length
            measure.showNumber = "never" if bar.implicit else "default"
        made.insert(start, measure)
        start += bar.length
    return made


def _head(bar: WrittenBar, measure: Any) -> None:
    m21 = _music21()
    measure.numberSuffix = None
    if bar.key is not None:
        measure.insert(0, m21.key.KeySignature(bar.key[0]))
    if bar.metre is not None:
        measure.insert(0, m21.meter.TimeSignature(f"{bar.metre[0]}/{bar.metre[1]}"))
    for mark in bar.marks:
        if mark.kind is MarkKind.TEMPO:
            quarters = round(float(cast(Fraction, mark.value)), 2)
            measure.insert(mark.onset, m21.tempo.MetronomeMark(number=quarters))


def _fill(bar: WrittenBar, measure: Any) -> None:
    """Notes and rests, in voices where the bar has several."""
    m21 = _music21()
    voices: dict[str, list[WrittenNote]] = defaultdict(list)
    for note in bar.notes:
        voices[note.voice].append(note)
    if len(voices) < 2:
        for onset, element in _elements(bar.notes, bar.length):
            measure.insert(onset, element)
        return
    for name in sorted(voices):
        voice = m21.stream.Voice(id=name)
        for onset, element in _elements(voices[name], bar.length):
            voice.insert(onset, element)
        measure.insert(0, voice)


def _elements(notes: Sequence[WrittenNote], length: Fraction) -> Iterator[tuple[Fraction, Any]]:
    """One voice: chords and notes, with rests where it is silent."""
    m21 = _music21()
    now = Fraction(0)
    together: dict[tuple[Fraction, bool], list[WrittenNote]] = defaultdict(list)
    for note in notes:
        together[note.onset, not note.grace].append(note)
    for onset, sounds in sorted(together):
        if onset > now:
            yield now, m21.note.Rest(quarterLength=onset - now)
            now = onset
        heads = together[onset, sounds]
        if sounds:
            yield onset, _element(heads)
            now = onset + heads[0].duration
        else:
            for grace in heads:
                yield onset, _element([grace]).getGrace()
    if now < length:
        yield now, m21.note.Rest(quarterLength=length - now)


def _element(heads: Sequence[WrittenNote]) -> Any:
    m21 = _music21()
    made = []
    for head in heads:
        one = m21.note.Note(_name(head.pitch), quarterLength=head.duration or Fraction(1, 2))
        if head.tie_start or head.tie_stop:
            both = head.tie_start and head.tie_stop
            one.tie = m21.tie.Tie("continue" if both else "start" if head.tie_start else "stop")
        made.append(one)
    whole = made[0] if len(made) == 1 else m21.chord.Chord(made)
    for lyric in next((head.lyrics for head in heads if head.lyrics), ()):
        whole.lyrics.append(
            m21.note.Lyric(text=lyric.text, number=1, syllabic=lyric.syllabic, applyRaw=True)
        )
    marks = heads[0].marks
    if "fermata" in marks:
        whole.expressions.append(m21.expressions.Fermata())
    if "breath" in marks:
        whole.articulations.append(m21.articulations.BreathMark())
    return whole


def _name(pitch: Pitch) -> str:
    """A pitch as music21 names it."""
    return f"{pitch.step}{_ALTERED[max(-2, min(pitch.alter, 2))]}{pitch.octave}"


def _music21() -> Any:
    """The library, untyped as its parts are."""
    import music21
    import music21.musicxml.m21ToXml

    return music21
