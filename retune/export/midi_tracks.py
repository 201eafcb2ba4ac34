"""From planned notes on their channels to the events of one track a part.

Order at one tick: note-offs, then set-up, bends, lyrics, note-ons; a channel's bends stand in
the track of the note that needs them, and before it (RP-001 orders nothing between tracks).
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from operator import itemgetter

from retune.adapters.midi import (
    Bend,
    Control,
    Event,
    Meta,
    MetaType,
    NoteOff,
    NoteOn,
    Program,
    RawTrack,
)
from retune.adapters.midi_marker import Lanes, marker_of, range_setup
from retune.export.midi_channels import PERCUSSION, Lane
from retune.export.midi_text import lyric_bytes, text_bytes

_OFF, _SETUP, _BEND, _LYRIC, _ON = range(5)

_VOLUME, _PAN, _RESET_CONTROLLERS = 7, 10, 121
FULL_VOLUME = 100
"""The level General MIDI 2 gives a channel that was told none."""

CENTRE = 64
"""The pan in the middle; 0 is left, 127 right."""

_RANKS = 5
Timed = tuple[int, Event]
"""Place in time, which is tick * _RANKS + rank among the events of that tick; event."""


def volume(gain_db: float) -> int:
    """Channel volume for a gain: 40 log10 of its share (General MIDI 2), from the usual level.

    >>> volume(0.0), volume(-9.0), volume(-100.0)
    (100, 60, 0)
    """
    return min(round(FULL_VOLUME * math.pow(10.0, gain_db / 40.0)), 127)


def pan(place: float) -> int:
    """Pan for a place from -1 (left) to 1 (right).

    >>> pan(-1.0), pan(0.0), pan(1.0)
    (0, 64, 127)
    """
    return min(round(CENTRE * (1.0 + place)), 127)


def part_tracks(
    names: Mapping[int, str],
    lanes: Sequence[Lane],
    mix: Mapping[int, tuple[int, int]],
    bend_range: int,
    end: int,
) -> list[RawTrack]:
    """One track a part.

    Parameters
    ----------
    names : mapping
        Name by part, in the order of the tracks.
    lanes : sequence of Lane
        The channels with their notes.
    mix : mapping
        Volume and pan (0 left to 127 right) by part.
    bend_range : int
        Semitones.
    end : int
        The tick where the piece ends.
    """
    timed: dict[int, list[Timed]] = {part: [] for part in names}
    for lane in lanes:
        home = lane.notes[0].part
        level, place = mix[home] if len(lane.parts) == 1 else (FULL_VOLUME, CENTRE)
        timed[home].extend((_SETUP, event) for event in _setup(lane, level, place, bend_range))
        for part, tick, bend in _bends(lane):
            timed[part].append((tick * _RANKS + _BEND, bend))
        for note in lane.notes:
            events, on, off = timed[note.part], note.on * _RANKS, note.off * _RANKS
            events.append((on + _ON, NoteOn(lane.channel, note.key, note.velocity)))
            events.append((off + _OFF, NoteOff(lane.channel, note.key)))
            if words := lyric_bytes(note.lyric):
                events.append((on + _LYRIC, Meta(MetaType.LYRIC, words)))
    ports = {lane.notes[0].part: lane.port for lane in lanes}
    if any(ports.values()):
        # One for each track, before all that goes to the port.
        for part, port in ports.items():
            timed[part].insert(0, (_SETUP, Meta(MetaType.PORT, bytes((port,)))))
    for part, channels in _own_channels(lanes).items():
        timed[part].insert(0, (_SETUP, marker_of(Lanes(channels))))
    return [_track(names[part], events, end) for part, events in timed.items()]


def _own_channels(lanes: Sequence[Lane]) -> dict[int, tuple[int, ...]]:
    """The channels of each part that has its channels for itself, the percussion left out."""
    found: dict[int, tuple[int, ...]] = {}
    for lane in lanes:
        if len(lane.parts) > 1:
            return {}
        if lane.channel != PERCUSSION:
            (part,) = lane.parts
            found[part] = (*found.get(part, ()), lane.channel)
    return found


def _track(name: str, timed: list[Timed], end: int) -> RawTrack:
    timed.sort(key=itemgetter(0))
    title = (0, Meta(MetaType.TRACK_NAME, text_bytes(name)))
    return RawTrack((title, *[(place // _RANKS, event) for place, event in timed]), end)


def _setup(lane: Lane, level: int, place: int, bend_range: int) -> Iterator[Event]:
    """What a channel is told at the start: all of it before its first note."""
    channel = lane.channel
    yield Control(channel, _RESET_CONTROLLERS, 0)
    yield Program(channel, lane.program)
    yield Control(channel, _VOLUME, level)
    yield Control(channel, _PAN, place)
    yield from range_setup(channel, bend_range)
    yield Bend(channel, lane.notes[0].bends[0][1])


def _bends(lane: Lane) -> Iterator[tuple[int, int, Bend]]:
    """Part, tick and bend of each change of a channel's bend after the first."""
    wanted = sorted((tick, note.part, value) for note in lane.notes for tick, value in note.bends)
    current = lane.notes[0].bends[0][1]
    for tick, part, value in wanted:
        if value != current:
            current = value
            yield part, tick, Bend(lane.channel, value)
