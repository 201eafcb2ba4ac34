"""A tuned score seen note by note: where each stands in its chord, and whom it can tune to."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property

from retune.harmony.model import Chord, Degree, Role
from retune.harmony.symbols import chord_symbol
from retune.tuning.home import home_scale, tonic_path
from retune.tuning.model import Segment, TunedNote, TunedScore
from retune.tuning.sounding import Row, sung_by_chord
from retune.units import hz_of, ratio_to_cents
from retune.voice.beats import Pair, SoundingTone, pairs
from retune.voice.partials import ordinal

_SIMPLE = 11
"""Numbers of the partials that meet, together: 6 and 5 for a minor third. Higher ones are faint."""

_ROUGH_HZ = 15.0
"""From about here on beats are heard as roughness (Zwicker and Fastl, from memory)."""

_STILL_HZ = 0.5
"""Slower beats go unheard in a chord of usual length."""


@dataclass(frozen=True, slots=True)
class Sung:
    """A stretch of one note in one chord, whose tone it is: what it is there, and how long.

    `off` are the cents above the root against equal temperament that its ratio asks for.
    """

    note: TunedNote
    segment: Segment
    chord: Chord
    degree: Degree
    off: float
    seconds: float

    @property
    def name(self) -> str:
        """The pitch."""
        return self.note.note.pitch.name

    @property
    def symbol(self) -> str:
        """The chord's symbol."""
        return chord_symbol(self.chord)


class View:
    """What the reasons ask of a tuned score."""

    def __init__(self, tuned: TunedScore) -> None:
        self.tuned = tuned
        self.rows: list[Row] = sung_by_chord(tuned)
        self._scale = home_scale(tuned)
        self._onsets = [one.onset for one in tuned.harmony.slices]
        self._degrees = {(f.note, f.chord): f.degree for f in tuned.harmony.fragments}
        self.lines: dict[int, list[int]] = {p.index: [] for p in tuned.score.parts if p.tuned}
        for index, one in enumerate(tuned.notes):
            if one.note.part in self.lines and not one.note.grace:
                self.lines[one.note.part].append(index)

    @cached_property
    def _path(self) -> tuple[tuple[Fraction, float], ...]:
        return tonic_path(self.tuned)

    def tonic_at(self, onset: Fraction) -> float:
        """Cents at which the home tonic stands at a time."""
        return self._path[bisect_right(self._path, onset, key=lambda point: point[0]) - 1][1]

    def sung(self, index: int, segment: Segment) -> Sung | None:
        """A stretch of a note, by the note's index; None where it is no just tone of its chord."""
        chord = self.tuned.harmony.chords[segment.chord]
        degree = self._degrees.get((index, segment.chord))
        if segment.ratio is None or segment.role is not Role.CHORD_TONE:
            return None
        if chord.root is None or degree is None:
            return None
        one = self.tuned.notes[index]
        apart = (one.note.pitch.key - chord.root.chroma) % 12
        off = (ratio_to_cents(segment.ratio) - 100.0 * apart + 600.0) % 1200.0 - 600.0
        seconds = self.tuned.seconds(segment.end) - self.tuned.seconds(segment.onset)
        return Sung(one, segment, chord, degree, off, seconds)

    def place(self, sung: Sung) -> float:
        """Cents that the note would have if its chord stood at its place in the home scale."""
        assert sung.chord.root is not None
        return self._scale(sung.chord.root) + sung.off

    def beside(self, sung: Sung) -> dict[int, tuple[TunedNote, Segment]]:
        """The just tones of other parts that sound where a stretch begins, by part."""
        onset = sung.segment.onset
        here = self.tuned.harmony.slices[max(bisect_right(self._onsets, onset) - 1, 0)]
        found = {}
        for index in here.notes:
            one = self.tuned.notes[index]
            if one.note.part == sung.note.note.part:
                continue
            segment = next((s for s in one.segments if s.onset <= onset < s.end), None)
            if segment is not None and self.sung(index, segment) is not None:
                found[one.note.part] = (one, segment)
        return found

    def reference(self, sung: Sung) -> str:
        """Whom to tune to, by the partials that meet: a sentence, "" for who sings alone."""
        beside = self.beside(sung)
        others = sorted(beside)
        tones = [self.tone(sung.note, sung.segment), *(self.tone(*beside[p]) for p in others)]
        if not beside:
            return ""
        with_me = [pair for pair in pairs(tones, self.limit) if 0 in (pair.low, pair.high)]
        if not with_me:
            return "No low partial of another voice meets yours: take it from your own line."
        best = min(with_me, key=lambda pair: _worth(pair, tones))
        other = others[max(best.low, best.high) - 1]
        whom = f"{self.part(other)}'s {beside[other][0].note.pitch.name}"
        if _octave(best):
            return f"Tune to {whom}, in octaves with you."
        theirs, own = best.ratio.numerator, best.ratio.denominator
        if best.low == 0:
            theirs, own = own, theirs
        mine = f"the {ordinal(own)} partial of your" if own > 1 else "your"
        meets = f"its {ordinal(theirs)}" if theirs > 1 else "it"
        meet = f"Tune to {whom}: {mine} {sung.name} meets {meets}"
        meet += " partial" * (own == 1 < theirs)
        if best.equal_hz < _STILL_HZ:
            return f"{meet}."
        here = "" if best.beat_hz < _STILL_HZ else f" (here {_beats(best.beat_hz)})"
        return f"{meet}, without beats when in tune{here}; {_beats(best.equal_hz)} as on a piano."

    def tone(self, note: TunedNote, segment: Segment) -> SoundingTone:
        """A tone as beats are counted from."""
        equal = hz_of(note.note.pitch.key, 0.0, self.tuned.policy.reference_hz)
        return SoundingTone(self.tuned.hz(note, segment), equal, segment.ratio)

    @property
    def limit(self) -> int:
        """The prime limit in force."""
        return self.tuned.policy.prime_limit

    def part(self, index: int) -> str:
        """A part's name."""
        return self.tuned.score.parts[index].name or f"part {index + 1}"

    def seconds(self, note: TunedNote) -> float:
        """How long a note lasts."""
        return self.tuned.seconds(note.note.end) - self.tuned.seconds(note.note.onset)


def _worth(pair: Pair, tones: Sequence[SoundingTone]) -> tuple[bool, bool, bool, int, int]:
    """Roots help most, if their partials meet low; octaves tell nothing new."""
    other = max(pair.low, pair.high)
    simple = pair.ratio.numerator + pair.ratio.denominator
    return (_octave(pair), simple > _SIMPLE, tones[other].ratio != 1, simple, other)


def _octave(pair: Pair) -> bool:
    size = pair.ratio.numerator
    return pair.ratio.denominator == 1 and size & (size - 1) == 0


def _beats(hz: float) -> str:
    rough = "rough, " if hz >= _ROUGH_HZ else ""
    return f"{rough}{hz:.1f} beats a second"
