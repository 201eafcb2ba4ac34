"""Cutting stretches out of a tuned score and setting them in a row.

One mechanism serves excerpts, loops, comparisons and the lead-in: stretches of bars of one or
more tuned scores of one piece, each with silent bars before it. Tuned pitches are never touched:
a stretch sounds as it does within the whole piece.

Conventions
-----------
* A note that sounds into a stretch begins at its start, one that sounds on ends at its end.
* In silent bars one chord without a root stands over one slice without notes.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from retune.harmony.model import Chord, Fragment, Harmony, Slice
from retune.score.model import Bar, ChordSymbol, Note, Score, SingerNote
from retune.score.tempo import TempoChange, TempoMap
from retune.tuning.model import Segment, TunedNote, TunedScore


@dataclass(frozen=True, slots=True)
class Silence:
    """Silent bars: the length of each in quarter notes, and the tempo."""

    bars: tuple[Fraction, ...]
    qpm: Fraction

    @property
    def duration(self) -> Fraction:
        """Quarter notes in all."""
        return sum(self.bars, Fraction(0))


@dataclass(frozen=True, slots=True)
class Stretch:
    """Bars `first` to `last` (last excluded, as played) of a tuned score, after a silence."""

    tuned: TunedScore
    first: int
    last: int
    before: Silence | None = None

    @property
    def start(self) -> Fraction:
        """Onset of the first bar."""
        return self.tuned.score.bars[self.first].onset

    @property
    def stop(self) -> Fraction:
        """Where the stretch ends; the whole of a last bar's notes belongs to it."""
        score = self.tuned.score
        return score.end if self.last >= len(score.bars) else score.bars[self.last].onset


def whole(tuned: TunedScore, before: Silence | None = None) -> Stretch:
    """A whole tuned score as one stretch."""
    return Stretch(tuned, 0, len(tuned.score.bars), before)


def stitched(stretches: Sequence[Stretch]) -> TunedScore:
    """Stretches in a row as one tuned score.

    Parts, titles, policy and figures are those of the first; all must have the same parts.
    """
    row = _Row()
    for stretch in stretches:
        if stretch.before is not None and stretch.before.bars:
            row.rest(stretch.before, stretch)
        row.add(stretch)
    return row.finished(stretches[0].tuned)


class _Row:
    """What has been set in the row so far; `end` is its length in quarter notes."""

    def __init__(self) -> None:
        self.end = Fraction(0)
        self.bars: list[Bar] = []
        self.tempi: list[TempoChange] = []
        self.notes: list[TunedNote] = []
        self.slices: list[Slice] = []
        self.chords: list[Chord] = []
        self.roots: list[float | None] = []
        self.fragments: list[Fragment] = []
        self.symbols: list[ChordSymbol] = []
        self.told: list[SingerNote] = []

    def rest(self, silence: Silence, following: Stretch) -> None:
        """Silent bars, in the metre and key of the bar that follows."""
        like = following.tuned.score.bars[following.first]
        self._tempo(self.end, silence.qpm)
        begins = self.end
        for duration in silence.bars:
            bar = replace(
                like,
                index=len(self.bars),
                number="",
                onset=self.end,
                duration=duration,
                begins=Fraction(0),
                rehearsal="",
            )
            self.bars.append(bar)
            self.end += duration
        self._silent_chord(begins)

    def _silent_chord(self, begins: Fraction) -> None:
        index, count = len(self.slices), len(self.chords)
        length = self.end - begins
        self.slices.append(Slice(index, begins, length, ()))
        self.chords.append(Chord(count, begins, length, index, index + 1, None, None, 0.0))
        self.roots.append(None)

    def add(self, stretch: Stretch) -> None:
        """The music of a stretch."""
        start, stop = stretch.start, stretch.stop
        shift = self.end - start
        score, harmony = stretch.tuned.score, stretch.tuned.harmony
        for bar in score.bars[stretch.first : stretch.last]:
            self.bars.append(replace(bar, index=len(self.bars), onset=bar.onset + shift))
        self._tempo_of(score.tempo, start, stop, shift)
        slices = self._slices(harmony, start, stop, shift)
        chords = self._chords(stretch.tuned, slices, start, stop, shift)
        notes = self._notes(stretch.tuned, chords, start, stop, shift)
        self._fragments(harmony, notes, chords, slices)
        self._note_slices(harmony, notes, slices)
        self.symbols += [
            replace(one, onset=one.onset + shift)
            for one in score.chord_symbols
            if start <= one.onset < stop
        ]
        self.told += [
            replace(one, onset=max(one.onset, start) + shift, end=min(one.end, stop) + shift)
            for one in score.singer_notes
            if one.onset < stop and one.end > start
        ]
        self.end += stop - start

    def _tempo(self, onset: Fraction, qpm: Fraction) -> None:
        if not self.tempi or self.tempi[-1].qpm != qpm:
            self.tempi.append(TempoChange(onset, qpm))

    def _tempo_of(self, tempo: TempoMap, start: Fraction, stop: Fraction, shift: Fraction) -> None:
        before = [change for change in tempo.changes if change.onset <= start]
        self._tempo(start + shift, before[-1].qpm)
        for change in tempo.changes[len(before) :]:
            if change.onset < stop:
                self._tempo(change.onset + shift, change.qpm)

    def _slices(
        self, harmony: Harmony, start: Fraction, stop: Fraction, shift: Fraction
    ) -> dict[int, int]:
        """Adds the slices, notes still missing; returns new numbers by old ones."""
        found: dict[int, int] = {}
        for one in harmony.slices:
            onset, end = max(one.onset, start), min(one.onset + one.duration, stop)
            if onset < end:
                found[one.index] = len(self.slices)
                self.slices.append(Slice(len(self.slices), onset + shift, end - onset, ()))
        return found

    def _chords(
        self,
        tuned: TunedScore,
        slices: dict[int, int],
        start: Fraction,
        stop: Fraction,
        shift: Fraction,
    ) -> dict[int, int]:
        found: dict[int, int] = {}
        for chord, root in zip(tuned.harmony.chords, tuned.root_cents, strict=True):
            own = [slices[i] for i in range(chord.first, chord.last) if i in slices]
            onset, end = max(chord.onset, start), min(chord.end, stop)
            if not own or onset >= end:
                continue
            found[chord.index] = len(self.chords)
            self.chords.append(
                replace(
                    chord,
                    index=len(self.chords),
                    onset=onset + shift,
                    duration=end - onset,
                    first=own[0],
                    last=own[-1] + 1,
                )
            )
            self.roots.append(root)
        return found

    def _notes(
        self,
        tuned: TunedScore,
        chords: dict[int, int],
        start: Fraction,
        stop: Fraction,
        shift: Fraction,
    ) -> dict[int, int]:
        cut: list[tuple[int, TunedNote]] = []
        for index, one in enumerate(tuned.notes):
            note = _cut_note(one.note, start, stop, shift)
            if note is not None and chords:
                segments = tuple(_cut_segments(one.segments, chords, start, stop, shift))
                cut.append((index, TunedNote(note, segments)))
        # Notes cut at the start begin together, whatever their order was.
        cut.sort(key=lambda one: _order(one[1].note))
        found = {index: len(self.notes) + place for place, (index, _) in enumerate(cut)}
        self.notes += [note for _, note in cut]
        return found

    def _fragments(
        self,
        harmony: Harmony,
        notes: dict[int, int],
        chords: dict[int, int],
        slices: dict[int, int],
    ) -> None:
        added: list[Fragment] = []
        for one in harmony.fragments:
            own = [slices[i] for i in range(one.first, one.last) if i in slices]
            if own and one.note in notes and one.chord in chords:
                added.append(
                    replace(
                        one,
                        note=notes[one.note],
                        chord=chords[one.chord],
                        first=own[0],
                        last=own[-1] + 1,
                    )
                )

        self.fragments += sorted(added, key=lambda one: (one.note, one.chord))

    def _note_slices(self, harmony: Harmony, notes: dict[int, int], slices: dict[int, int]) -> None:
        for old, new in slices.items():
            own = tuple(notes[i] for i in harmony.slices[old].notes if i in notes)
            self.slices[new] = replace(self.slices[new], notes=own)

    def finished(self, first: TunedScore) -> TunedScore:
        """The row as one tuned score."""
        score: Score = replace(
            first.score,
            notes=tuple(one.note for one in self.notes),
            bars=tuple(self.bars),
            tempo=TempoMap(tuple(self.tempi)),
            chord_symbols=tuple(self.symbols),
            singer_notes=tuple(self.told),
        )
        harmony = replace(
            first.harmony,
            slices=tuple(self.slices),
            chords=tuple(self.chords),
            fragments=tuple(self.fragments),
        )
        return replace(
            first,
            score=score,
            harmony=harmony,
            notes=tuple(self.notes),
            root_cents=tuple(self.roots),
        )


def _cut_note(note: Note, start: Fraction, stop: Fraction, shift: Fraction) -> Note | None:
    """What of a note lies in a stretch, moved to its place in the row."""
    onset, end = max(note.onset, start), min(note.end, stop)
    if onset >= end:
        return None
    whole_end = end == note.end and note.analysed_end <= stop
    return replace(
        note,
        onset=onset + shift,
        duration=end - onset,
        stolen=note.stolen if whole_end else Fraction(0),
        early=note.early if note.analysed_onset >= start else Fraction(0),
    )


def _order(note: Note) -> tuple[Fraction, int, int]:
    return note.onset, note.part, note.pitch.key


def _cut_segments(
    segments: Sequence[Segment],
    chords: dict[int, int],
    start: Fraction,
    stop: Fraction,
    shift: Fraction,
) -> list[Segment]:
    """What of a note's segments lies in a stretch; a grace note's chord may begin after it."""
    last = max(chords.values())
    return [
        replace(
            one,
            onset=max(one.onset, start) + shift,
            duration=min(one.end, stop) - max(one.onset, start),
            chord=chords.get(one.chord, last),
        )
        for one in segments
        if one.onset < stop and one.end > start
    ]
