"""A retuned MIDI file as it was before: channels put together again, tuning taken out.

Only files that say how they were retuned are changed (`retune.adapters.midi_marker`); all others
come back as they are.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from retune.adapters.midi import (
    Bend,
    ChannelPressure,
    Control,
    Event,
    KeyPressure,
    NoteOff,
    NoteOn,
    Program,
    RawMidi,
    RawTrack,
)
from retune.adapters.midi_marker import Lanes, Share, range_setup, said_by

_CENTRE = 8192
_USUAL_RANGE = 2
_RESET = 121
"""Reset all controllers, which centres the bend too (General MIDI 2, 3.5.2)."""

_SETUP = len(range_setup(0, 0))

Timed = tuple[int, Event]


def as_before(raw: RawMidi) -> RawMidi:
    """The file before it was retuned."""
    marked = any(said_by(event) for track in raw.tracks for _, event in track.events)
    if not marked:
        return raw
    return replace(raw, tracks=tuple(_track(track) for track in raw.tracks))


@dataclass(slots=True)
class _Channel:
    """What is known of one channel on the way: whose it is, its ranges, its last share."""

    home: int
    own_range: int
    semitones: int = _USUAL_RANGE
    share: float = 0.0
    written: int = _CENTRE


def _track(track: RawTrack) -> RawTrack:
    channels: dict[int, _Channel] = {}
    found: list[Timed] = []
    events = track.events
    place = 0
    while place < len(events):
        tick, event = events[place]
        place += 1
        said = said_by(event)
        if isinstance(said, Lanes):
            home = said.channels[0]
            channels |= {channel: _Channel(home, said.own_range) for channel in said.channels}
            if said.own_range > _USUAL_RANGE:
                found += [(tick, one) for one in range_setup(home, said.own_range)]
        elif isinstance(said, Share):
            if said.channel in channels:
                channels[said.channel].share = said.cents
        elif (semitones := _added_range(events[place - 1 :], channels)) is not None:
            assert isinstance(event, Control)
            channels[event.channel].semitones = semitones
            place += _SETUP - 1
        else:
            found += [(tick, one) for one in _restored(event, channels)]
    return RawTrack(tuple(found), track.end)


def _added_range(events: Sequence[Timed], channels: dict[int, _Channel]) -> int | None:
    """The semitones of a setting of the bend range that begins here and was added."""
    group = [event for _, event in events[:_SETUP]]
    first = group[0]
    if not isinstance(first, Control) or first.channel not in channels or len(group) < _SETUP:
        return None
    data = group[2]
    if not isinstance(data, Control):
        return None
    return data.value if tuple(group) == range_setup(first.channel, data.value) else None


def _restored(event: Event, channels: dict[int, _Channel]) -> Iterator[Event]:
    """What an event was; nothing for one that was added."""
    channel = getattr(event, "channel", None)
    known = channels.get(channel) if channel is not None else None
    match event:
        case NoteOn() | NoteOff() | KeyPressure() if known is not None:
            yield replace(event, channel=known.home)
        case Bend(number, value) if known is not None:
            if known.own_range and number == known.home:
                yield from _own_bend(known, value)
        case Control() | Program() | ChannelPressure() if known is not None:
            if isinstance(event, Control) and event.controller == _RESET:
                known.written = _CENTRE
            if event.channel == known.home:
                yield event
        case _:
            yield event


def _own_bend(known: _Channel, value: int) -> Iterator[Event]:
    """The instrument's own bend without the tuning, where it changes."""
    own_range = max(known.own_range, _USUAL_RANGE)
    cents = (value - _CENTRE) * 100.0 * known.semitones / _CENTRE - known.share
    own = min(max(round(_CENTRE + cents * _CENTRE / (100.0 * own_range)), 0), 2 * _CENTRE - 1)
    if own != known.written:
        known.written = own
        yield Bend(known.home, own)
