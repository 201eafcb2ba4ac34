"""What a synth makes of a MIDI file: every key that sounds, with its pitch over time.

Nothing here knows how the file was made. Conventions: pitches are float key numbers on the
grid of A4 = 440 Hz; of events at one tick, those of the earlier track come first.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass, field
from operator import itemgetter

from retune.adapters.midi import (
    Bend,
    Control,
    Event,
    Meta,
    MetaType,
    NoteOff,
    NoteOn,
    RawMidi,
    RawTrack,
)
from retune.errors import OutputError
from retune.export.bend import DEFAULT_RANGE, MIDDLE, bend_cents

_RPN_MSB, _RPN_LSB, _DATA_MSB, _DATA_LSB, _RESET_CONTROLLERS = 101, 100, 6, 38, 121
_BEND_RANGE, _NULL = (0, 0), (127, 127)


@dataclass(slots=True)
class HeardNote:
    """One key as it sounded, from its note-on to its note-off.

    `pitch` is that at the note-on; `moves` are (tick, pitch) of every bend after it.
    """

    track: int
    key: int
    on: int
    pitch: float
    off: int = -1
    moves: list[tuple[int, float]] = field(default_factory=list)

    @property
    def last(self) -> float:
        """The pitch at the note-off."""
        return self.moves[-1][1] if self.moves else self.pitch


@dataclass(slots=True)
class _Channel:
    """One channel's state: parameter selected, bend range in semitones, bend, sounding keys."""

    selected: tuple[int, int] = _NULL
    semitones: float = DEFAULT_RANGE
    bend: int = MIDDLE
    sounding: dict[int, HeardNote] = field(default_factory=dict)

    def pitch(self, key: int) -> float:
        return key + bend_cents(self.bend, self.semitones) / 100.0

    def control(self, controller: int, value: int) -> None:
        msb, lsb = self.selected
        if controller == _RPN_MSB:
            self.selected = (value, lsb)
        elif controller == _RPN_LSB:
            self.selected = (msb, value)
        elif controller == _DATA_MSB and self.selected == _BEND_RANGE:
            self.semitones = value
        elif controller == _DATA_LSB and self.selected == _BEND_RANGE:
            self.semitones = int(self.semitones) + value / 100.0
        elif controller == _RESET_CONTROLLERS:
            self.selected, self.bend = _NULL, MIDDLE


def heard_notes(raw: RawMidi) -> list[HeardNote]:
    """Every note of a format 1 file as it sounds.

    Raises `OutputError` where a key is struck while it sounds or is never released: a synth
    would cut one note off or let it hang.
    """
    ports = {number: _port(track) for number, track in enumerate(raw.tracks)}
    states: defaultdict[tuple[int, int], _Channel] = defaultdict(_Channel)
    heard: list[HeardNote] = []
    for tick, track, event in in_order(raw):
        port = ports[track]
        match event:
            case NoteOn(channel, key, velocity) if velocity > 0:
                state = states[port, channel]
                if key in state.sounding:
                    raise OutputError(f"key {key} is struck twice on channel {channel + 1}")
                note = HeardNote(track, key, tick, state.pitch(key))
                state.sounding[key] = note
                heard.append(note)
            case NoteOff(channel, key) | NoteOn(channel, key):
                if (ended := states[port, channel].sounding.pop(key, None)) is not None:
                    ended.off = tick
            case Bend(channel, value):
                state = states[port, channel]
                state.bend = value
                _move(state, tick)
            case Control(channel, controller, value):
                state = states[port, channel]
                state.control(controller, value)
                _move(state, tick)
            case _:
                pass
    if any(state.sounding for state in states.values()):
        raise OutputError("a note is never released")
    return heard


def _port(track: RawTrack) -> int:
    """The port of a track: of each, all sixteen channels are others (FF 21 01 pp)."""
    said = (event for _, event in track.events if isinstance(event, Meta))
    return next((event.data[0] for event in said if event.type == MetaType.PORT), 0)


def _move(state: _Channel, tick: int) -> None:
    for key, note in state.sounding.items():
        note.moves.append((tick, state.pitch(key)))


def in_order(raw: RawMidi) -> Iterator[tuple[int, int, Event]]:
    """Tick, track and event of all events; at one tick, those of the earlier track first."""
    merged = [
        (tick, number, event)
        for number, track in enumerate(raw.tracks)
        for tick, event in track.events
    ]
    merged.sort(key=itemgetter(0, 1))
    return iter(merged)
