"""What each note of a take becomes in MIDI: key, ticks and the bends it needs, no channel yet.

Conventions
-----------
* `on` and `off` are ticks; `start` and `stop` are seconds by the tempo map.
* A pitch is a float key number on the grid of A4 = 440 Hz, the reference pitch included.
* `bends` are (tick, value) with ascending ticks; the first stands at `on`. What a value says of
  the pitch is the planner's `Scale`: a pitch bend, or part of a semitone.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Container, Iterator
from dataclasses import dataclass, replace
from itertools import pairwise

from retune.errors import OutputError
from retune.export.bend import bend_step, bend_value, nearest_key
from retune.export.ticks import Ticks
from retune.score.model import PartKind
from retune.score.tempo import TempoMap
from retune.tuning.model import Segment, TunedNote, TunedScore
from retune.units import reference_offset

_GLIDE_STEP_CENTS = 0.5
_GLIDE_STEP_SECONDS = 0.004
"""A glide moves in steps of half a cent, but no faster than every four milliseconds: finer
steps are not heard, faster ones crowd a MIDI cable (about one message a millisecond)."""


@dataclass(frozen=True, slots=True)
class PlannedNote:
    """One note on its way to a track; `part` is its index in the score, as `note` is its own."""

    note: int
    part: int
    on: int
    off: int
    start: float
    stop: float
    key: int
    velocity: int
    lyric: str
    bends: tuple[tuple[int, int], ...]

    def shortened(self) -> PlannedNote:
        """The note released a tick early, so that another may take its channel at its end."""
        return replace(self, off=max(self.on + 1, self.off - 1))


def pitch_of(tuned: TunedScore, note: TunedNote, segment: Segment) -> float:
    """Pitch of a segment as a float key number on the grid of A4 = 440 Hz.

    A click's is its key in the percussion map, whatever the reference pitch.
    """
    if tuned.score.parts[note.note.part].kind is PartKind.CLICK:
        return float(note.note.pitch.key)
    offset = reference_offset(tuned.policy.reference_hz)
    return note.note.pitch.key + (segment.cents + offset) / 100.0


@dataclass(frozen=True, slots=True)
class Scale:
    """How a file says how far a pitch is from its note's key.

    Parameters
    ----------
    value : callable
        The number for a distance in cents.
    lowest, highest : float
        The farthest it reaches, in cents.
    bound : str
        What sets the reach, for messages.
    hint : str
        How to reach farther.
    pace : float
        The least time between two steps of a glide, in seconds.
    """

    value: Callable[[float], int]
    lowest: float
    highest: float
    bound: str
    hint: str
    pace: float = _GLIDE_STEP_SECONDS


def bend_scale(bend_range: int, wider: str) -> Scale:
    """Pitch bends with a range in semitones; `wider` is the option for a wider one."""
    reach = 100.0 * bend_range
    return Scale(
        lambda cents: bend_value(cents, bend_range),
        -reach,
        reach - bend_step(bend_range) / 2,
        f"the bend range is {bend_range} semitones",
        f"Widen it with --set {wider}",
    )


@dataclass(frozen=True, slots=True)
class Planner:
    """Plans the notes of one score; a glide is in seconds."""

    tuned: TunedScore
    ticks: Ticks
    scale: Scale
    glide: float

    def notes(self, parts: Container[int]) -> list[PlannedNote]:
        """All notes of these parts by onset, then part, then key.

        Raises `OutputError` for a pitch that no MIDI key and bend reaches.
        """
        planned = [
            self._planned(index, note)
            for index, note in enumerate(self.tuned.notes)
            if note.note.part in parts
        ]
        planned.sort(key=lambda note: (note.on, note.part, note.key))
        return planned

    def _planned(self, index: int, tuned_note: TunedNote) -> PlannedNote:
        note, segments = tuned_note.note, tuned_note.segments
        tempo = self.tuned.score.tempo
        on = self.ticks.at(note.onset)
        pitches = [pitch_of(self.tuned, tuned_note, segment) for segment in segments]
        key = nearest_key(pitches[0])
        self._require_reach(tuned_note, key, pitches)
        bends = [(on, self.scale.value(100.0 * (pitches[0] - key)))]
        for (before, after), segment in zip(pairwise(pitches), segments[1:], strict=True):
            if before != after:
                cents = (100.0 * (before - key), 100.0 * (after - key))
                bends.extend(self._glide(segment, cents, tempo))
        return PlannedNote(
            index,
            note.part,
            on,
            max(self.ticks.at(note.end), on + 1),
            tempo.seconds(note.onset),
            tempo.seconds(note.end),
            key,
            note.velocity,
            note.lyric,
            tuple(_thinned(bends)),
        )

    def _glide(
        self, segment: Segment, cents: tuple[float, float], tempo: TempoMap
    ) -> Iterator[tuple[int, int]]:
        """Bends from one pitch to the next: the first step at the segment's onset, the last
        after the glide time or half the segment, whichever is shorter."""
        start = self.ticks.at(segment.onset)
        begins, ends = tempo.seconds(segment.onset), tempo.seconds(segment.end)
        span = min(self.glide, (ends - begins) / 2)
        last = math.floor(tempo.quarters(begins + span) * self.ticks.division)
        length = max(last - start, 0)
        before, after = cents
        steps = min(
            math.ceil(abs(after - before) / _GLIDE_STEP_CENTS),
            math.floor(span / self.scale.pace),
        )
        for step in range(1, steps):
            tick = start + length * (step - 1) // (steps - 1)
            value = before + (after - before) * step / steps
            yield tick, self.scale.value(value)
        yield start + (length if steps > 1 else 0), self.scale.value(after)

    def _require_reach(self, tuned_note: TunedNote, key: int, pitches: list[float]) -> None:
        """Raise `OutputError` for a key that MIDI lacks or a pitch beyond the reach."""
        note = tuned_note.note
        if not 0 <= key <= 127:
            raise OutputError(
                f"{note.pitch.name} is beyond the keys of MIDI, which go from C-1 to G9",
                self.tuned.score.place(note.onset, note.part),
                "Transpose the score, or leave the part out",
            )
        farthest = max((100.0 * (pitch - key) for pitch in pitches), key=abs)
        if not self.scale.lowest <= farthest <= self.scale.highest:
            raise OutputError(
                f"{note.pitch.name} moves {farthest:+.1f} cents from its key while it sounds, "
                f"and {self.scale.bound}",
                self.tuned.score.place(note.onset, note.part),
                self.scale.hint,
            )


def _thinned(bends: list[tuple[int, int]]) -> Iterator[tuple[int, int]]:
    """One bend a tick, the last one; none that repeats the value before it."""
    last = dict(bends)
    value = None
    for tick, following in last.items():
        if following != value:
            value = following
            yield tick, following
