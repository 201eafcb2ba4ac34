"""One note element: a notehead, a rest, or time that passes without either."""

from __future__ import annotations

from dataclasses import dataclass, replace

from retune.adapters.xml import Element
from retune.errors import Weight
from retune.score.musicxml.draft import BarDraft, Slot
from retune.score.musicxml.durations import Fields, note_duration
from retune.score.musicxml.lyrics import read_lyrics
from retune.score.musicxml.pitches import read_pitch
from retune.score.musicxml.values import MAX_STAVES, decimal, velocity, whole, words
from retune.written import MarkKind, WrittenNote, WrittenRest

NO_MARKS: frozenset[str] = frozenset()

# Signs on a note, by their MusicXML names.
ARTICULATIONS = {
    "accent": ("accent",),
    "strong-accent": ("marcato",),
    "staccato": ("staccato",),
    "staccatissimo": ("staccatissimo",),
    "spiccato": ("staccatissimo",),
    "tenuto": ("tenuto",),
    "detached-legato": ("tenuto", "staccato"),
    "breath-mark": ("breath",),
    "caesura": ("caesura",),
}
# Semitones that printed accidentals raise a note by; others are left to the pitch.
ACCIDENTALS = {
    "flat-flat": -2,
    "flat": -1,
    "natural-flat": -1,
    "natural": 0,
    "sharp": 1,
    "natural-sharp": 1,
    "double-sharp": 2,
    "sharp-sharp": 2,
}
_TIED = {"start": ("start",), "stop": ("stop",), "continue": ("start", "stop")}
DOUBLED = "+8"
"""What follows the identity of a notehead in that of its octave doubling."""
# Noteheads that some composers use for speech.
_CROSSED = ("x", "cross", "circle-x")


@dataclass(frozen=True, slots=True)
class Notations:
    """What the notations of a note say of its sound."""

    marks: frozenset[str] = NO_MARKS
    tied: frozenset[str] = NO_MARKS


NO_NOTATIONS = Notations()


def read_note(element: Element, bar: BarDraft) -> None:
    """Read one note element into the bar and move on past it."""
    part = bar.part
    source = part.identities.name(element, part.heading.id, bar.index, bar.note_count)
    bar.note_count += 1
    fields = {child.tag: child for child in element}
    slot = _slot(element, fields, bar)
    if "cue" in fields:
        return
    if "rest" in fields:
        _read_rest(element, fields, slot, bar)
    elif "unpitched" in fields:
        part.unpitched += 1
    elif part.clefs.get(slot.staff) == "percussion":
        part.unpitched += 1
        bar.remark(Weight.DOUBT, "a note on a percussion staff is read as unpitched", slot.onset)
    elif slot.duration or "grace" in fields:
        _read_notehead(element, fields, slot, source, bar)


def _slot(element: Element, fields: Fields, bar: BarDraft) -> Slot:
    """Onset, duration, staff and voice; a chord's further notes take them from its first."""
    duration = note_duration(element, fields, bar)
    in_chord = "chord" in fields
    if in_chord and bar.chord is None:
        bar.remark(Weight.DOUBT, "a chord note follows no note; read as a note of its own")
    chord = bar.chord if in_chord else None
    staff = whole(fields["staff"].text, 1, MAX_STAVES) if "staff" in fields else None
    voice = words(fields["voice"]) if "voice" in fields else ""
    if chord is not None:
        bar.reach = max(bar.reach, chord.onset + duration)
        return Slot(chord.onset, duration, staff or chord.staff, voice or chord.voice)
    bar.chord = Slot(bar.now, duration, staff or 1, voice or "1")
    bar.advance(duration)
    return bar.chord


def _read_rest(element: Element, fields: Fields, slot: Slot, bar: BarDraft) -> None:
    if slot.duration:
        notations = _read_notations(element, slot, bar) if "notations" in fields else NO_NOTATIONS
        hidden = element.get("print-object") == "no"
        bar.rests.append(
            WrittenRest(slot.onset, slot.duration, slot.staff, slot.voice, hidden, notations.marks)
        )


def _read_notehead(
    element: Element, fields: Fields, slot: Slot, source: str, bar: BarDraft
) -> None:
    if "pitch" not in fields:
        bar.remark(Weight.LOSS, "a note has no pitch; it is left out", slot.onset)
        return
    reading = read_pitch(fields["pitch"], slot.staff, bar.part)
    if reading.pitch is None:
        bar.remark(Weight.LOSS, f"{reading.fault}; it is left out", slot.onset)
        return
    if reading.rounded:
        bar.remark(
            Weight.LOSS, "a note lies between two keys; the nearest key is taken", slot.onset
        )
    _remark_oddities(element, fields, slot, bar)
    notations = _read_notations(element, slot, bar) if "notations" in fields else NO_NOTATIONS
    tied = notations.tied
    if "tie" in fields:
        tied = frozenset(tie.get("type") or "" for tie in element.iterchildren("tie"))
    note = WrittenNote(
        slot.onset,
        slot.duration,
        reading.pitch,
        slot.staff,
        slot.voice,
        tie_start="start" in tied,
        tie_stop="stop" in tied,
        grace="grace" in fields,
        lyrics=read_lyrics(element) if "lyric" in fields else (),
        marks=notations.marks,
        source=source,
        dynamic=velocity(element.get("dynamics")),
    )
    sounding = [note, _doubled(note, reading.doubling)] if reading.doubling else [note]
    bar.notes += sounding
    if element.get("print-object") == "no":
        bar.hidden += [each.source for each in sounding]


def _doubled(note: WrittenNote, octaves: int) -> WrittenNote:
    """The note that sounds with another by an octave doubling; it has no notehead of its own."""
    pitch = replace(note.pitch, octave=note.pitch.octave + octaves)
    return replace(note, pitch=pitch, lyrics=(), source=f"{note.source}{DOUBLED}")


def _remark_oddities(element: Element, fields: Fields, slot: Slot, bar: BarDraft) -> None:
    """Name what the page or the playback data might mean otherwise than it is read here."""
    if "notehead" in fields and words(fields["notehead"]) in _CROSSED:
        bar.remark(Weight.DOUBT, "a crossed notehead is read as sung", slot.onset)
    if "accidental" in fields and not _fits_accidental(fields):
        bar.remark(
            Weight.DOUBT,
            "a printed accidental and its pitch disagree; the pitch counts",
            slot.onset,
        )
    if element.get("time-only"):
        bar.remark(
            Weight.DOUBT, "a note meant for some passes of a repeat sounds in each", slot.onset
        )


def _fits_accidental(fields: Fields) -> bool:
    printed = ACCIDENTALS.get(words(fields["accidental"]))
    given = decimal(fields["pitch"].findtext("alter") or "0")
    return printed is None or given is None or given == printed


def _read_notations(element: Element, slot: Slot, bar: BarDraft) -> Notations:
    marks: set[str] = set()
    tied: set[str] = set()
    for notations in element.iterchildren("notations"):
        for child in notations:
            if child.tag == "fermata":
                marks.add("fermata")
            elif child.tag == "articulations":
                for sign in child:
                    marks.update(ARTICULATIONS.get(sign.tag, ()))
            elif child.tag == "tied":
                tied.update(_TIED.get(child.get("type") or "", ()))
            elif child.tag == "dynamics":
                for sign in child:
                    bar.mark(
                        MarkKind.DYNAMIC,
                        slot.onset,
                        words(sign) if sign.tag == "other-dynamics" else sign.tag,
                        slot.staff,
                        slot.voice,
                    )
    if not marks and not tied:
        return NO_NOTATIONS
    return Notations(frozenset(marks), frozenset(tied))
