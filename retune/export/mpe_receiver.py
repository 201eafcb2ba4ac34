"""What an MPE receiver makes of a file with one lower zone (M1-100-UM v1.1).

It obeys the configuration message, which resets all bend ranges, adds the manager's bend to that
of each member, and takes the bend range of the member that was told one last for all of them.
Nothing here knows how the file was made. Pitches are float key numbers on the grid of A4 = 440 Hz.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from retune.adapters.midi import Bend, Control, KeyPressure, NoteOff, NoteOn, Program, RawMidi
from retune.errors import OutputError
from retune.export.bend import MIDDLE, bend_cents
from retune.export.midi_channels import PERCUSSION
from retune.export.midi_receiver import HeardNote, in_order

MANAGER = 0
_RPN_MSB, _RPN_LSB, _DATA_MSB, _RESET = 101, 100, 6, 121
_BEND_RANGE, _MPE, _NULL = (0, 0), (0, 6), (127, 127)
_MANAGER_RANGE, _MEMBER_RANGE = 2, 48


@dataclass(slots=True)
class _Zone:
    """The zone's state; `sounding` is by channel and key."""

    members: range = range(0)
    manager_range: int = _MANAGER_RANGE
    member_range: int = _MEMBER_RANGE
    selected: dict[int, tuple[int, int]] = field(default_factory=dict)
    bends: dict[int, int] = field(default_factory=dict)
    sounding: dict[tuple[int, int], HeardNote] = field(default_factory=dict)

    def pitch(self, channel: int, key: int) -> float:
        if channel not in self.members:
            return float(key)
        own = bend_cents(self.bends.get(channel, MIDDLE), self.member_range)
        return key + (own + bend_cents(self.bends.get(MANAGER, MIDDLE), self.manager_range)) / 100.0

    def control(self, channel: int, controller: int, value: int) -> None:
        msb, lsb = self.selected.get(channel, _NULL)
        if controller == _RPN_MSB:
            self.selected[channel] = (value, lsb)
        elif controller == _RPN_LSB:
            self.selected[channel] = (msb, value)
        elif controller == _RESET:
            self.selected[channel] = _NULL
            self.bends.pop(channel, None)
        elif controller == _DATA_MSB and (msb, lsb) == _MPE and channel == MANAGER:
            self._configure(value)
        elif controller == _DATA_MSB and (msb, lsb) == _BEND_RANGE:
            if channel == MANAGER:
                self.manager_range = value
            elif channel in self.members:
                self.member_range = value

    def _configure(self, members: int) -> None:
        if self.sounding:
            raise OutputError("the zone is configured while notes sound, which stops them")
        self.members = range(1, 1 + members)
        self.manager_range, self.member_range = _MANAGER_RANGE, _MEMBER_RANGE
        self.bends.clear()


def heard_in_zone(raw: RawMidi) -> list[HeardNote]:
    """Every note of a format 1 file as it sounds in its lower zone.

    Notes on the percussion channel sound as their keys where it is no member.

    Raises
    ------
    OutputError
        A key is struck while it sounds, outside the zone or never released, or a member is sent
        what the specification forbids: a program or key pressure.
    """
    zone = _Zone()
    heard: list[HeardNote] = []
    for tick, track, event in in_order(raw):
        match event:
            case NoteOn(channel, key, velocity) if velocity > 0:
                if channel not in zone.members and channel != PERCUSSION:
                    raise OutputError(f"key {key} is struck on channel {channel + 1}, no member")
                if (channel, key) in zone.sounding:
                    raise OutputError(f"key {key} is struck twice on channel {channel + 1}")
                note = HeardNote(track, key, tick, zone.pitch(channel, key))
                zone.sounding[channel, key] = note
                heard.append(note)
            case NoteOff(channel, key) | NoteOn(channel, key):
                if (ended := zone.sounding.pop((channel, key), None)) is not None:
                    ended.off = tick
            case Bend(channel, value):
                zone.bends[channel] = value
                _move(zone, channel, tick)
            case Control(channel, controller, value):
                zone.control(channel, controller, value)
                _move(zone, channel, tick)
            case Program(channel) | KeyPressure(channel) if channel in zone.members:
                raise OutputError(f"channel {channel + 1} is a member and is sent {event}")
            case _:
                pass
    if zone.sounding:
        raise OutputError("a note is never released")
    return heard


def _move(zone: _Zone, channel: int, tick: int) -> None:
    """Sounding notes follow; released ones, whose tails a member's bend leaves alone, are gone."""
    for (own, key), note in zone.sounding.items():
        if own == channel or (channel == MANAGER and own in zone.members):
            note.moves.append((tick, zone.pitch(own, key)))
