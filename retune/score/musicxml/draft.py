"""What is gathered while a part is read bar by bar."""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction

from retune.errors import Place, Weight
from retune.pitch import Pitch
from retune.score.musicxml.identity import Identities
from retune.score.musicxml.log import Log
from retune.score.musicxml.partlist import Heading
from retune.score.musicxml.transposition import Transposition
from retune.written import Mark, MarkKind, WrittenChordSymbol, WrittenNote, WrittenRest

NO_TRANSPOSITION = Transposition()
ZERO = Fraction(0)


@dataclass(frozen=True, slots=True)
class PitchReading:
    """A sounding pitch, or None with the reason.

    `rounded` where it lay between two keys; `doubling` in octaves where it sounds there too.
    """

    pitch: Pitch | None
    fault: str = ""
    rounded: bool = False
    doubling: int = 0


@dataclass(frozen=True, slots=True)
class Slot:
    """Where a note element stands."""

    onset: Fraction
    duration: Fraction
    staff: int
    voice: str


@dataclass(slots=True)
class PartState:
    """What carries over from one bar of a part to the next."""

    heading: Heading
    log: Log
    identities: Identities
    divisions: Fraction | None = None
    metre: tuple[int, int] = (4, 4)
    key_fifths: int = 0
    transpositions: dict[int, Transposition] = field(default_factory=dict)
    clefs: dict[int, str] = field(default_factory=dict)
    first_clefs: dict[int, str] = field(default_factory=dict)
    staves: int = 1
    tempo: Fraction | None = None
    unpitched: int = 0
    last_pass: int = 0
    in_measure_repeat: bool = False
    doubly_lowered: set[int] = field(default_factory=set)
    pitches: dict[tuple[str | None, ...], PitchReading] = field(default_factory=dict)
    shared_denominator: int = 1
    lengths: dict[str | None, Fraction | None] = field(default_factory=dict)
    fitting: dict[tuple[str | None, str | None, int], bool] = field(default_factory=dict)

    def transposition(self, staff: int) -> Transposition:
        """The interval in force on a staff; an entry for staff 0 holds for all others."""
        found = self.transpositions.get(staff) or self.transpositions.get(0)
        return NO_TRANSPOSITION if found is None else found.within(self.key_fifths)

    @property
    def bar_length(self) -> Fraction:
        """A full bar of the metre in force, in quarter notes."""
        return Fraction(4 * self.metre[0], self.metre[1])


@dataclass(frozen=True, slots=True)
class Jump:
    """A sign or word that sends the player elsewhere, before doubles are settled.

    `rank` is how plainly the file says it: 2 by its playback data, 1 in words, 0 by a sign.
    """

    kind: MarkKind
    onset: Fraction
    rank: int
    value: str | None = None


@dataclass(slots=True)
class BarDraft:
    """One bar while it is read; times in quarter notes from its start.

    `hidden` holds the identities of noteheads that are not printed.
    """

    part: PartState
    index: int
    number: str
    implicit: bool
    now: Fraction = ZERO
    reach: Fraction = ZERO
    chord: Slot | None = None
    note_count: int = 0
    notes: list[WrittenNote] = field(default_factory=list)
    hidden: list[str] = field(default_factory=list)
    rests: list[WrittenRest] = field(default_factory=list)
    marks: list[Mark] = field(default_factory=list)
    jumps: list[Jump] = field(default_factory=list)
    tempi: list[tuple[Fraction, Fraction, bool]] = field(default_factory=list)
    doubts: list[tuple[Weight, str, Fraction]] = field(default_factory=list)
    metres: list[tuple[Fraction, tuple[int, int]]] = field(default_factory=list)
    keys: list[tuple[Fraction, tuple[int, str | None]]] = field(default_factory=list)
    repeat_start: bool = False
    repeat_end: int = 0
    ending: tuple[int, ...] = ()
    ending_stop: bool = False
    repeat_starts_after: bool = False
    repeat_ended_before: int = 0
    ending_after: tuple[int, ...] = ()
    ending_stopped_before: bool = False

    def advance(self, duration: Fraction) -> None:
        """Move on; the bar reaches at least this far."""
        self.now += duration
        if self.now > self.reach:
            self.reach = self.now

    def mark(
        self,
        kind: MarkKind,
        onset: Fraction,
        value: str | int | Fraction | WrittenChordSymbol | None = None,
        staff: int = 0,
        voice: str | None = None,
    ) -> None:
        """Add a mark."""
        self.marks.append(Mark(kind, onset, value, staff, voice))

    def remark(self, weight: Weight, what: str, onset: Fraction | None = None) -> None:
        """Note a finding at an onset of this bar, by default where the reader stands."""
        self.doubts.append((weight, what, self.now if onset is None else onset))

    def report(self) -> None:
        """Hand the findings on with bar and beat; a first bar that is short is a pick-up."""
        begins = ZERO
        if self.index == 0 and self.metres:
            begins = max(self.part.bar_length - self.reach, ZERO)
        beat = Fraction(4, self.part.metre[1])
        for weight, what, onset in self.doubts:
            place = str(1 + (onset + begins) / beat)
            where = Place(part=self.part.heading.name, bar=self.number, beat=place)
            self.part.log.add(weight, what, where)
