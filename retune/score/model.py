"""The score as played: parts of one line each, notes with exact times, bars, tempo.

Conventions
-----------
* Onsets and durations are `Fraction` quarter notes from the start as played; repeats are
  played out, ties joined.
* Beats count from 1 in the time signature's own beats.
"""

from __future__ import annotations

from bisect import bisect_right
from dataclasses import dataclass, field
from enum import StrEnum
from fractions import Fraction

from retune.errors import Finding, Place
from retune.pitch import Pitch, PitchClass
from retune.score.tempo import TempoMap


class PartKind(StrEnum):
    """What a part is to the tuning."""

    VOICE = "voice"
    ACCOMPANIMENT = "accompaniment"
    """Its pitch cannot move: piano, organ, pitched percussion."""
    GUIDE = "guide"
    """Starting notes or a drone, which learning tracks add; their pitch is given."""
    CLICK = "click"
    """Count-in and click, which learning tracks add; keys are those of the General MIDI
    percussion map."""


class VoiceType(StrEnum):
    """Which singers a part is for; used for ranges, vowels and names."""

    SOPRANO = "soprano"
    MEZZO = "mezzo-soprano"
    ALTO = "alto"
    TENOR = "tenor"
    BARITONE = "baritone"
    BASS = "bass"


@dataclass(frozen=True, slots=True)
class Part:
    """One line of singers, or one part of an accompaniment.

    `source`, `staff` and `voice` say where it stands in the file; `program` counts from 0.
    """

    index: int
    name: str
    kind: PartKind = PartKind.VOICE
    voice_type: VoiceType | None = None
    abbreviation: str = ""
    program: int | None = None
    source: str = ""
    staff: int = 1
    voice: str = "1"

    @property
    def tuned(self) -> bool:
        """Whether the part's pitch follows the just targets."""
        return self.kind is PartKind.VOICE

    @property
    def guides(self) -> bool:
        """Whether the part is no music of the piece but helps to practise it."""
        return self.kind in (PartKind.GUIDE, PartKind.CLICK)


@dataclass(frozen=True, slots=True)
class Note:
    """One sung or played note, ties joined.

    Parameters
    ----------
    part : int
        Index into `Score.parts`.
    onset, duration : Fraction
        Quarter notes as played; duration > 0.
    velocity : int
        1 to 127, from the dynamics.
    lyric : str
        The syllable sung here in this pass, with a trailing hyphen inside a word; else "".
    grace : bool
        Grace notes sound but are not analysed.
    stolen : Fraction
        Time at the end that grace notes after this note take; analysis counts it as held. In
        played-in music, time that a pedal holds it longer, or less than 0 where it overlaps.
    early : Fraction
        How much before its onset the analysis takes it to begin, in played-in music: with the
        first note of its chord.
    sources : tuple of str
        The noteheads joined in this note, as the file identifies them.
    """

    part: int
    onset: Fraction
    duration: Fraction
    pitch: Pitch
    velocity: int = 80
    lyric: str = ""
    grace: bool = False
    stolen: Fraction = Fraction(0)
    early: Fraction = Fraction(0)
    marks: frozenset[str] = frozenset()
    sources: tuple[str, ...] = ()

    @property
    def end(self) -> Fraction:
        """Where the note stops sounding."""
        return self.onset + self.duration

    @property
    def analysed_onset(self) -> Fraction:
        """Where it begins for the analysis."""
        return self.onset - self.early

    @property
    def analysed_end(self) -> Fraction:
        """Where it ends for the analysis: grace notes that follow take nothing from it."""
        return self.onset + self.duration + self.stolen


def counted_beat(metre: tuple[int, int]) -> Fraction:
    """One beat of a metre as it is counted aloud, in quarter notes: three eighths in 6/8.

    >>> counted_beat((6, 8)), counted_beat((3, 4))
    (Fraction(3, 2), Fraction(1, 1))
    """
    beats, unit = metre
    compound = unit >= 8 and beats % 3 == 0 and beats > 3
    return Fraction(12 if compound else 4, unit)


@dataclass(frozen=True, slots=True)
class Bar:
    """One bar as played.

    `index` counts bars as played, `written` bars of the file, both from 0. `begins` is where in
    its metre the bar starts, in quarter notes: 3 for a one-beat pick-up in 4/4, else 0.
    `run` is the pass of the repeated section this bar is played in, from 1.
    """

    index: int
    written: int
    number: str
    onset: Fraction
    duration: Fraction
    metre: tuple[int, int] = (4, 4)
    key: tuple[int, str | None] = (0, None)
    begins: Fraction = Fraction(0)
    run: int = 1
    rehearsal: str = ""

    @property
    def end(self) -> Fraction:
        """Onset of what follows the bar."""
        return self.onset + self.duration

    @property
    def beat_length(self) -> Fraction:
        """One beat of the time signature, in quarter notes."""
        return Fraction(4, self.metre[1])

    @property
    def counted_beat(self) -> Fraction:
        """One beat as it is counted aloud, in quarter notes: three eighths in 6/8."""
        return counted_beat(self.metre)

    @property
    def full_length(self) -> Fraction:
        """A full bar of this metre, in quarter notes, however long this one is."""
        return self.beat_length * self.metre[0]


@dataclass(frozen=True, slots=True)
class Transposition:
    """An interval: semitones, and its place on the line of fifths, which spells it."""

    semitones: int = 0
    fifths: int = 0

    def pitch_class(self, pitch: PitchClass) -> PitchClass:
        """A pitch class moved by the interval."""
        return PitchClass.from_fifths(pitch.fifths + self.fifths)


@dataclass(frozen=True, slots=True)
class ChordSymbol:
    """A chord symbol of the score, as evidence for the analysis; it never sounds."""

    onset: Fraction
    root: PitchClass
    kind: str
    bass: PitchClass | None = None


@dataclass(frozen=True, slots=True)
class SingerNote:
    """What the director tells singers about a stretch of bars; `parts` are indices."""

    onset: Fraction
    end: Fraction
    parts: tuple[int, ...]
    text: str


@dataclass(frozen=True)
class Score:
    """A piece as played.

    Notes are sorted by onset, then part, then key. `stem` is the file's name without its
    ending, the NAME of all outputs; `left_out` names parts of the file that do not sound.
    `transposition` is how far all of it was moved from where the file has it. `source` is the
    file as it was read, for writing back into it.
    """

    stem: str
    title: str
    parts: tuple[Part, ...]
    notes: tuple[Note, ...]
    bars: tuple[Bar, ...]
    tempo: TempoMap = field(default_factory=TempoMap)
    composer: str = ""
    lyricist: str = ""
    copyright: str = ""
    format: str = ""
    file: str | None = None
    chord_symbols: tuple[ChordSymbol, ...] = ()
    left_out: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()
    transposition: Transposition = Transposition()
    singer_notes: tuple[SingerNote, ...] = ()
    source: bytes = field(default=b"", repr=False, compare=False)
    _bar_onsets: tuple[Fraction, ...] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "_bar_onsets", tuple(bar.onset for bar in self.bars))

    @property
    def end(self) -> Fraction:
        """End of the last bar or the last note, whichever is later."""
        last_bar = self.bars[-1].end if self.bars else Fraction(0)
        return max([last_bar, *(note.end for note in self.notes[-64:])], default=last_bar)

    def bar_at(self, onset: Fraction) -> Bar:
        """The bar that sounds at an onset; the last bar for anything after it."""
        return self.bars[max(bisect_right(self._bar_onsets, onset) - 1, 0)]

    def beat_at(self, onset: Fraction) -> Fraction:
        """The beat at an onset, from 1, in beats of the time signature."""
        bar = self.bar_at(onset)
        return 1 + (onset - bar.onset + bar.begins) / bar.beat_length

    def place(self, onset: Fraction, part: int | None = None) -> Place:
        """File, part, bar and beat of an onset, for errors and findings."""
        name = self.parts[part].name if part is not None else None
        return Place(self.file, name, self.bar_at(onset).number, str(self.beat_at(onset)))
