"""A score as it is written: what every reader makes, before repeats are played out.

Conventions
-----------
* Times inside a bar are `Fraction` quarter notes from the start of that bar, in that part.
* Pitches are sounding pitches: transposition and octave signs are applied already.
* Chord symbols, cue notes and unpitched notes are never among `notes`.
* Values that belong to the whole score (metre, key, repeats, tempo) stand in the part that
  wrote them; the builder takes their union over the parts.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from fractions import Fraction

from retune.errors import Finding
from retune.pitch import Pitch, PitchClass


@dataclass(frozen=True, slots=True)
class WrittenLyric:
    """One syllable of one verse.

    `verse` is the number or name the file gives it ("1", "2", "chorus"); `syllabic` is one of
    single, begin, middle, end; `passes` limits it to some passes of a repeat, empty for all.
    """

    text: str
    syllabic: str = "single"
    verse: str = "1"
    passes: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class WrittenNote:
    """One notehead.

    Notes of one staff and voice with one onset form a chord. A grace note has duration 0 and
    stands at the onset of the note it leads to, in file order before it. `marks` holds signs on
    the note: fermata, staccato, staccatissimo, accent, marcato, tenuto, breath, caesura.
    `source` identifies the notehead in the file, for writing back; unique in the score.
    `dynamic` is a velocity that the file gives to this very note, 1 to 127.
    """

    onset: Fraction
    duration: Fraction
    pitch: Pitch
    staff: int = 1
    voice: str = "1"
    tie_start: bool = False
    tie_stop: bool = False
    grace: bool = False
    lyrics: tuple[WrittenLyric, ...] = ()
    marks: frozenset[str] = frozenset()
    source: str = ""
    dynamic: int | None = None


@dataclass(frozen=True, slots=True)
class WrittenRest:
    """A rest, printed or hidden; `marks` as for a note (a rest may bear a fermata)."""

    onset: Fraction
    duration: Fraction
    staff: int = 1
    voice: str = "1"
    hidden: bool = False
    marks: frozenset[str] = frozenset()


class MarkKind(StrEnum):
    """What a `Mark` says, and the type of its `value`."""

    TEMPO = "tempo"
    """Quarter notes a minute, Fraction > 0."""
    WORDS = "words"
    """Any text in the score: tempo words, dolce, div., unis., solo, D.C. al Fine. str."""
    DYNAMIC = "dynamic"
    """p, mf, sfz and so on (str), or a velocity 1 to 127 (int)."""
    HAIRPIN = "hairpin"
    """crescendo, diminuendo or stop. str."""
    CHORD_SYMBOL = "chord symbol"
    """A `WrittenChordSymbol`."""
    REHEARSAL = "rehearsal"
    """Rehearsal letter or number, str."""
    FERMATA = "fermata"
    """A fermata on the bar line at this onset; no value."""
    SEGNO = "segno"
    CODA = "coda"
    FINE = "fine"
    DA_CAPO = "da capo"
    """Jump to the start; value "", "fine" or "coda" where the words say how it ends."""
    DAL_SEGNO = "dal segno"
    TO_CODA = "to coda"


@dataclass(frozen=True, slots=True)
class WrittenChordSymbol:
    """A chord symbol: root, the kind as the file names it (MusicXML kind values), bass."""

    root: PitchClass
    kind: str
    bass: PitchClass | None = None


MarkValue = str | int | Fraction | WrittenChordSymbol | None
"""What a `Mark` may carry; `MarkKind` says which kind carries what."""


@dataclass(frozen=True, slots=True)
class Mark:
    """A sign of a part at an onset of its bar; `staff` 0 means all staves of the part."""

    kind: MarkKind
    onset: Fraction
    value: MarkValue = None
    staff: int = 0
    voice: str | None = None


@dataclass(frozen=True, slots=True)
class WrittenBar:
    """One bar of one part.

    `length` is how far notes, rests and forwards reach. `metre` is (beats, beat unit) where a
    time signature stands in this bar, composite ones added up: 3+2/8 is (5, 8). `key` is
    (fifths, mode or None) likewise. `repeat_end` counts how often the section is played in all
    (2 for a plain repeat), 0 where none ends here. `ending` holds the passes of the ending that
    this bar opens, `ending_stop` is True where an ending closes (printed with or without hook).
    """

    number: str
    length: Fraction
    notes: tuple[WrittenNote, ...] = ()
    rests: tuple[WrittenRest, ...] = ()
    marks: tuple[Mark, ...] = ()
    implicit: bool = False
    metre: tuple[int, int] | None = None
    key: tuple[int, str | None] | None = None
    repeat_start: bool = False
    repeat_end: int = 0
    ending: tuple[int, ...] = ()
    ending_stop: bool = False


@dataclass(frozen=True, slots=True)
class WrittenPart:
    """One part of the file, with all its staves and voices.

    `program` is the General MIDI program counting from 0, None where the file gives none.
    `instrument` is the sound or instrument name the file gives ("voice.soprano", "Organ").
    `unpitched` counts notes left out because they have no pitch; `clefs` holds the first clef
    of each staff: G, G8 (sounding an octave down), F, C; `group` is the bracket's name, if any.
    `pedals` are spans, in quarter notes from the start of the file, in which a sustain pedal that
    was played in is down.
    """

    id: str
    name: str
    bars: tuple[WrittenBar, ...]
    abbreviation: str = ""
    instrument: str = ""
    program: int | None = None
    staves: int = 1
    clefs: tuple[str, ...] = ()
    group: str = ""
    unpitched: int = 0
    pedals: tuple[tuple[Fraction, Fraction], ...] = ()


@dataclass(frozen=True, slots=True)
class WrittenScore:
    """A whole file: its words about itself, its parts, and what reading it left in doubt."""

    parts: tuple[WrittenPart, ...]
    title: str = ""
    composer: str = ""
    lyricist: str = ""
    copyright: str = ""
    format: str = ""
    """musicxml, midi, humdrum, abc or mei."""
    findings: tuple[Finding, ...] = ()
