"""One track of a MIDI file, written again with its notes on their channels and bent.

Order at one tick: what the file has there keeps its order; set-up and bends are put in before the
first note-on of the tick, or after all where none is.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import groupby
from operator import itemgetter

from retune.adapters.midi import (
    Bend,
    ChannelPressure,
    Control,
    Event,
    KeyPressure,
    NoteOff,
    NoteOn,
    Program,
    RawTrack,
)
from retune.adapters.midi_marker import Lanes, Share, marker_of, range_setup
from retune.export.bend import MIDDLE, bend_value
from retune.export.midi_plan import PlannedNote
from retune.score.midi.notes import played_notes

_FINE = 1000.0
_RPN_MSB, _RPN_LSB, _DATA = 101, 100, (6, 38, 96, 97)

Timed = tuple[int, Event]


@dataclass(slots=True)
class Knob:
    """A channel's own bends as (tick, cents), ascending, and their range; 0 for none."""

    bends: list[tuple[int, float]]
    semitones: int

    @property
    def own(self) -> bool:
        """Whether it is ever bent."""
        return any(cents for _, cents in self.bends)


@dataclass(frozen=True, slots=True)
class Instrument:
    """One channel of one track, and its notes on the channels they take; home is the first
    unless another track has it."""

    track: int
    home: int
    channels: tuple[int, ...]
    lanes: tuple[tuple[PlannedNote, ...], ...]
    knob: Knob

    @property
    def tuned(self) -> bool:
        """Whether any note is off its key."""
        return any(value for lane in self.lanes for note in lane for _, value in note.bends)

    @property
    def farthest(self) -> float:
        """The greatest bend in cents, its own and the tuning's together."""
        own = max((abs(cents) for _, cents in self.knob.bends), default=0.0)
        values = (abs(value) for lane in self.lanes for note in lane for _, value in note.bends)
        return own + max(values, default=0) / _FINE


def retuned_track(
    track: RawTrack,
    instruments: Sequence[Instrument],
    shared: Mapping[int, Sequence[int]],
    bend_range: int,
    shift: int,
) -> RawTrack:
    """A track with its instruments retuned.

    Parameters
    ----------
    shared : mapping
        All channels that hear what a channel of the file is told, by that channel.
    bend_range : int
        Semitones.
    shift : int
        Semitones by which all pitched notes are moved.
    """
    writer = _Writer(track, instruments, shared, bend_range, shift)
    return RawTrack(tuple(writer.events()), track.end)


class _Writer:
    def __init__(
        self,
        track: RawTrack,
        instruments: Sequence[Instrument],
        shared: Mapping[int, Sequence[int]],
        bend_range: int,
        shift: int,
    ) -> None:
        self._track = track
        self._bent = {one.home: one for one in instruments if one.tuned or one.knob.own}
        self._shared = shared
        self._range = bend_range
        self._shift = shift
        self._selected: dict[int, tuple[int, int]] = {}
        self._channel_of: dict[int, int] = {}
        self._latest: dict[tuple[int, int], int] = {}
        for one in instruments:
            for channel, lane in zip(one.channels, one.lanes, strict=True):
                self._channel_of |= {note.note: channel for note in lane}
        number = instruments[0].track if instruments else 0
        for note in played_notes(track, number, track.end):
            place = int(note.source.split(".")[1])
            if place in self._channel_of and note.released is not None:
                self._channel_of[note.released] = self._channel_of[place]

    def events(self) -> Iterator[Timed]:
        """All events of the track."""
        for one in self._bent.values():
            own = max(one.knob.semitones, 1) if one.knob.own else 0
            yield 0, marker_of(Lanes(_home_first(one), own))
        added = self._added()
        place = 0
        for tick, group in groupby(self._track.events, key=itemgetter(0)):
            while added and added[0][0] < tick:
                yield added.pop(0)
            now = []
            while added and added[0][0] == tick:
                now.append(added.pop(0))
            events = list(group)
            yield from self._tick(events, place, now)
            place += len(events)
        yield from added

    def _tick(self, group: list[Timed], place: int, added: list[Timed]) -> Iterator[Timed]:
        waiting = added
        for tick, event in group:
            if isinstance(event, NoteOn) and event.velocity:
                yield from waiting
                waiting = []
            for one in self._written(event, place):
                yield tick, one
            place += 1
        yield from waiting

    def _written(self, event: Event, place: int) -> Iterator[Event]:
        """What an event of the file becomes."""
        match event:
            case NoteOn(channel, key, _) | NoteOff(channel, key, _):
                if place in self._channel_of:
                    self._latest[channel, key] = self._channel_of[place]
                    yield replace(event, channel=self._channel_of[place], key=key + self._shift)
                else:
                    yield event
            case KeyPressure(channel, key, _):
                if channel in self._shared:
                    channel = self._latest.get((channel, key), channel)
                    event = replace(event, channel=channel, key=key + self._shift)
                yield event
            case Bend(channel, _):
                # Those of instruments that are retuned are among what is added.
                if channel not in self._shared:
                    yield event
            case Control(channel, controller, value):
                if not self._sets_range(channel, controller, value):
                    for other in self._heard_by(channel):
                        yield replace(event, channel=other)
            case Program(channel, _) | ChannelPressure(channel, _):
                for other in self._heard_by(channel):
                    yield replace(event, channel=other)
            case _:
                yield event

    def _heard_by(self, channel: int) -> Sequence[int]:
        return self._shared.get(channel) or (channel,)

    def _sets_range(self, channel: int, controller: int, value: int) -> bool:
        """Whether a controller changes the bend range of a channel that is retuned."""
        if channel not in self._shared:
            return False
        msb, lsb = self._selected.get(channel, (127, 127))
        if controller == _RPN_MSB:
            self._selected[channel] = (value, lsb)
        elif controller == _RPN_LSB:
            self._selected[channel] = (msb, value)
        return controller in _DATA and (msb, lsb) == (0, 0)

    def _added(self) -> list[Timed]:
        """Set-up and bends of all instruments, by tick."""
        found: list[tuple[int, int, Event]] = []
        for one in self._bent.values():
            for channel, lane in zip(one.channels, one.lanes, strict=True):
                found += self._of_lane(one, channel, lane)
        found.sort(key=itemgetter(0, 1))
        return [(tick, event) for tick, _, event in found]

    def _of_lane(
        self, one: Instrument, channel: int, lane: Sequence[PlannedNote]
    ) -> Iterator[tuple[int, int, Event]]:
        """(tick, rank, event): the range before the first note or bend, then every bend."""
        tuning = sorted((tick, value / _FINE) for note in lane for tick, value in note.bends)
        ticks = sorted({tick for tick, _ in tuning} | {tick for tick, _ in one.knob.bends})
        if not ticks:
            return
        for event in range_setup(channel, self._range):
            yield ticks[0], 0, event
        own, share, written = 0.0, 0.0, MIDDLE
        bends, steps = iter([*one.knob.bends, (None, 0.0)]), iter([*tuning, (None, 0.0)])
        bend, step = next(bends), next(steps)
        resets = {tick for tick, cents in one.knob.bends if not cents}
        for tick in ticks:
            while bend[0] == tick:
                own, bend = bend[1], next(bends)
            while step[0] == tick:
                share, step = step[1], next(steps)
            value = bend_value(own + share, self._range)
            if value != written or tick in resets:
                if one.knob.own:
                    yield tick, 1, marker_of(Share(channel, share))
                yield tick, 1, Bend(channel, value)
                written = value


def _home_first(one: Instrument) -> tuple[int, ...]:
    return (one.home, *(channel for channel in one.channels if channel != one.home))
