"""Staves that both an octave clef and a transposition put an octave down.

By the standard the transposition sounds and the clef does not. Some exporters write both and
mean one octave; then the pitches in the file are the sounding ones already. A clef is chosen so
that the notes stand about its middle line, B3 for the treble clef of tenors; the reading that
brings them nearer to it is taken, one for the whole score.
"""

from __future__ import annotations

from dataclasses import replace
from statistics import fmean

from retune.errors import Place, Weight
from retune.score.musicxml.log import Log
from retune.score.musicxml.part import PartReading
from retune.written import WrittenBar, WrittenNote, WrittenPart

MIDDLE_LINE = 59
"""Key of B3, the middle line of a treble clef an octave down."""


def settle_octaves(readings: list[PartReading], log: Log) -> tuple[WrittenPart, ...]:
    """The parts with one reading chosen for such staves, and a finding for each."""
    keys = [
        note.pitch.key
        for reading in readings
        for bar in reading.part.bars
        for note in bar.notes
        if note.staff in reading.doubly_lowered
    ]
    if not keys:
        return tuple(reading.part for reading in readings)
    too_low = fmean(keys) < MIDDLE_LINE - 6
    for reading in readings:
        for staff in sorted(reading.doubly_lowered):
            log.add(
                Weight.DOUBT,
                f"clef and transposition both lower staff {staff} by an octave;"
                f" read as lowered {'once' if too_low else 'twice'}",
                Place(part=reading.part.name),
            )
    if not too_low:
        return tuple(reading.part for reading in readings)
    return tuple(_raised(reading.part, reading.doubly_lowered) for reading in readings)


def _raised(part: WrittenPart, staves: frozenset[int]) -> WrittenPart:
    return replace(part, bars=tuple(_raised_bar(bar, staves) for bar in part.bars))


def _raised_bar(bar: WrittenBar, staves: frozenset[int]) -> WrittenBar:
    notes = tuple(_octave_up(note) if note.staff in staves else note for note in bar.notes)
    return replace(bar, notes=notes)


def _octave_up(note: WrittenNote) -> WrittenNote:
    return replace(note, pitch=replace(note.pitch, octave=note.pitch.octave + 1))
