"""One part of a MIDI file, written into bars.

Conventions
-----------
* Onsets and ends are `Fraction` quarter notes from the start of the piece.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

from retune.pitch import Pitch
from retune.score.midi.bars import BarGrid, Piece, rests_between
from retune.score.midi.notes import PlayedNote, in_voices
from retune.score.midi.streams import Stream
from retune.written import Mark, WrittenBar, WrittenLyric, WrittenNote, WrittenPart, WrittenRest

LEGATO_QUARTERS = Fraction(1, 12)
"""How far a note played legato may reach into the next (our choice)."""


@dataclass(frozen=True, slots=True)
class LineNote:
    """A note in quarter notes; `source` is its track and event."""

    onset: Fraction
    end: Fraction
    key: int
    velocity: int
    source: str


@dataclass(frozen=True, slots=True)
class Line:
    """A part of the file with its voices, the highest first."""

    stream: Stream
    voices: tuple[tuple[LineNote, ...], ...]

    @property
    def notes(self) -> Iterator[LineNote]:
        """All notes, voice by voice."""
        return (note for voice in self.voices for note in voice)


def line_of(stream: Stream, ticks_per_quarter: Fraction) -> Line:
    """The voices of a stream; notes without length are left out."""
    sounding = [note for note in stream.notes if note.end > note.onset]
    voices = in_voices(sounding, int(ticks_per_quarter * LEGATO_QUARTERS))
    return Line(stream, tuple(tuple(_in_quarters(voice, ticks_per_quarter)) for voice in voices))


def _in_quarters(voice: Sequence[PlayedNote], ticks_per_quarter: Fraction) -> Iterator[LineNote]:
    """A voice's notes, each ending where the next one begins at the latest."""
    onsets = sorted({note.onset for note in voice})
    following = dict(pairwise([*onsets, None]))
    for note in voice:
        after = following[note.onset]
        end = note.end if after is None else min(note.end, after)
        yield LineNote(
            note.onset / ticks_per_quarter,
            end / ticks_per_quarter,
            note.key,
            note.velocity,
            note.source,
        )


@dataclass(frozen=True, slots=True)
class Words:
    """What a part's notes are called and sing, by the notes' `source`."""

    pitches: Mapping[str, Pitch]
    lyrics: Mapping[str, tuple[WrittenLyric, ...]]


def written_part(
    line: Line,
    grid: BarGrid,
    words: Words,
    keys: Mapping[int, tuple[int, str | None]],
    marks: Mapping[int, Sequence[Mark]],
    pedals: Sequence[tuple[Fraction, Fraction]] = (),
) -> WrittenPart:
    """Write a line into bars; `keys` and `marks` go by bar index."""
    notes: defaultdict[int, list[WrittenNote]] = defaultdict(list)
    rests: defaultdict[int, list[WrittenRest]] = defaultdict(list)
    for number, voice in enumerate(line.voices, start=1):
        pieces = [(note, piece) for note in voice for piece in grid.cut(note.onset, note.end)]
        for note, piece in pieces:
            notes[piece.bar].append(_notehead(note, piece, str(number), words))
        for bar, silence in rests_between([piece for _, piece in pieces], grid).items():
            rests[bar].extend(
                WrittenRest(onset, duration, voice=str(number)) for onset, duration in silence
            )
    return WrittenPart(
        id=line.stream.id,
        name=line.stream.name,
        instrument=line.stream.instrument,
        program=line.stream.program,
        pedals=tuple(pedals),
        bars=tuple(
            WrittenBar(
                number=str(index + 1),
                length=span.length,
                notes=tuple(notes[index]),
                rests=tuple(rests[index]),
                marks=tuple(marks.get(index, ())),
                metre=span.metre if span.changes else None,
                key=keys.get(index),
            )
            for index, span in enumerate(grid.spans)
        ),
    )


def _notehead(note: LineNote, piece: Piece, voice: str, words: Words) -> WrittenNote:
    return WrittenNote(
        piece.onset,
        piece.duration,
        words.pitches[note.source],
        voice=voice,
        tie_start=not piece.last,
        tie_stop=not piece.first,
        lyrics=words.lyrics.get(note.source, ()) if piece.first else (),
        source=note.source,
        dynamic=note.velocity,
    )
