"""Reading a written MIDI file back, and comparing all that sounds with the tuned pitches.

A note of the file is compared with the tuned note of its part that starts at its tick: its
pitch at the note-on, its pitch at the end of every segment, and that on the way from one to the
next it never leaves the span between the two.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Callable, Iterator, Mapping, Sequence
from fractions import Fraction

from retune.adapters.midi import RawMidi, read_midi_file
from retune.errors import OutputError, RetuneError
from retune.export.bend import nearest_key
from retune.export.midi_plan import pitch_of
from retune.export.midi_receiver import HeardNote, heard_notes
from retune.export.ticks import Ticks
from retune.limits import Limits
from retune.tuning.model import TunedNote, TunedScore

_SLACK = 1e-6
"""Cents of float noise that are no error."""

_FAULT = "This is a fault of retune; please report it with the score, if you may"

Receiver = Callable[[RawMidi], list[HeardNote]]
"""A synth: a file's notes as they sound."""

_Target = tuple[float, TunedNote]
"""Pitch at the onset as a float key number, and the note."""


def check_midi(
    data: bytes,
    tuned: TunedScore,
    step: float,
    parts: Sequence[int] | None = None,
    tracks: Mapping[int, int] | None = None,
    receive: Receiver = heard_notes,
) -> str:
    """Compare a file's bytes with a tuned score; `step` is that of its pitches in cents.

    `parts` are those that the file plays, in the order of its tracks after the conductor's; all
    of them by default. Where the order is another, `tracks` gives the track of each part played.
    `receive` is the synth: it makes of a file the notes that sound.

    Returns
    -------
    str
        A line with the greatest rounding error.

    Raises
    ------
    OutputError
        A note is missing, too many, never released or struck twice, or its pitch is off by
        more than half a step.
    """
    try:
        raw = read_midi_file(data, Limits(max_bytes=len(data), max_notes=len(data)))
        heard = receive(raw)
    except RetuneError as error:
        raise OutputError(f"the MIDI file reads back wrong: {error.what}", hint=_FAULT) from error
    if not isinstance(raw.division, int):
        raise OutputError("the MIDI file reads back without ticks a quarter note", hint=_FAULT)
    played = range(len(tuned.score.parts)) if parts is None else parts
    # The conductor track comes before the parts.
    if tracks is None:
        tracks = {part: track for track, part in enumerate(played, start=1)}
    comparison = _Comparison(tuned, tracks, Ticks(raw.division), step)
    worst = max((comparison.error(*pair) for pair in comparison.pairs(heard)), default=0.0)
    return f"read back: {len(heard):,} notes, greatest rounding error {worst:.4f} cents"


class _Comparison:
    """Compares notes heard with notes tuned; `step` is in cents."""

    def __init__(
        self, tuned: TunedScore, tracks: Mapping[int, int], ticks: Ticks, step: float
    ) -> None:
        self._tuned = tuned
        self._tracks = tracks
        self._ticks = ticks
        self._step = step
        self._bound = step / 2 + _SLACK

    def pairs(self, heard: list[HeardNote]) -> Iterator[tuple[HeardNote, TunedNote]]:
        """Every note heard with its tuned note: those of one part and onset, low to high."""
        targets: dict[tuple[int, int], list[_Target]] = defaultdict(list)
        for note in self._tuned.notes:
            track = self._tracks.get(note.note.part)
            if track is None:
                continue
            place = (track, self._ticks.at(note.note.onset))
            targets[place].append((pitch_of(self._tuned, note, note.segments[0]), note))
        found: dict[tuple[int, int], list[HeardNote]] = defaultdict(list)
        for one in heard:
            found[one.track, one.on].append(one)
        if extra := found.keys() - targets.keys():
            track, tick = min(extra, key=lambda place: place[1])
            raise OutputError(f"track {track + 1} plays a note at tick {tick} that no part has")
        for place, wanted in targets.items():
            wanted.sort(key=self._rank)
            there = sorted(found[place], key=lambda one: (one.key, one.off, one.pitch, one.last))
            if len(there) != len(wanted):
                raise self._fault(wanted[0][1], f"sounds {len(there)} times, not {len(wanted)}")
            yield from zip(there, (note for _, note in wanted), strict=True)

    def _rank(self, target: _Target) -> tuple[int, Fraction, int, float]:
        """Key, length, steps above the key, and last pitch: they tell two notes in unison apart,
        a hair from one another, in the order that they are heard in."""
        pitch, note = target
        key = nearest_key(pitch)
        steps = math.floor(100.0 * (pitch - key) / self._step + 0.5)
        last = pitch_of(self._tuned, note, note.segments[-1])
        return key, note.note.duration, steps, last

    def error(self, heard: HeardNote, tuned: TunedNote) -> float:
        """Greatest error in cents; raises `OutputError` beyond the bound."""
        self._require_length(heard, tuned)
        moves = iter(heard.moves)
        move = next(moves, None)
        before, pitch, worst = None, heard.pitch, 0.0
        for segment in tuned.segments:
            target = pitch_of(self._tuned, tuned, segment)
            low, high = sorted((target if before is None else before, target))
            end = self._ticks.at(segment.end)
            while move is not None and move[0] < end:
                pitch = move[1]
                self._require(tuned, 100.0 * max(low - pitch, pitch - high))
                move = next(moves, None)
            error = 100.0 * abs(pitch - target)
            self._require(tuned, error)
            worst, before = max(worst, error), target
        self._require(
            tuned, 100.0 * abs(heard.pitch - pitch_of(self._tuned, tuned, tuned.segments[0]))
        )
        return worst

    def _require(self, tuned: TunedNote, error: float) -> None:
        if error > self._bound:
            raise self._fault(tuned, f"is {error:.4f} cents off its tuned pitch")

    def _require_length(self, heard: HeardNote, tuned: TunedNote) -> None:
        """Released at its end; a tick early where parts share channels."""
        end = self._ticks.at(tuned.note.end)
        if heard.off not in (end, end - 1, heard.on + 1):
            raise self._fault(tuned, f"is released at tick {heard.off}, not {end}")

    def _fault(self, tuned: TunedNote, what: str) -> OutputError:
        note = tuned.note
        place = self._tuned.score.place(note.onset, note.part)
        return OutputError(f"the MIDI file reads back wrong: {note.pitch} {what}", place, _FAULT)
