"""From notes on their channels and what these are told to the events of one track a part.

Order at one tick: note-offs, then set-up and tuning, lyrics, note-ons (RP-001 orders nothing
between tracks, so that tuning stands in the track of the notes that need it; the tables of a bulk
dump alone, all of them at the start, stand in the first track).
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from operator import itemgetter

from retune.adapters.midi import Control, Event, Meta, MetaType, NoteOff, NoteOn, Program, RawTrack
from retune.export.midi_channels import PERCUSSION, Lane
from retune.export.midi_text import lyric_bytes, text_bytes
from retune.export.midi_tracks import CENTRE, FULL_VOLUME
from retune.export.mts_messages import Tables, select

_VOLUME, _PAN, _RESET_CONTROLLERS = 7, 10, 121
_NAME, _OFF, _DUMP, _SETUP, _TUNE, _LYRIC, _ON = range(7)

_Timed = tuple[int, int, Event]
"""Tick, rank among the events of that tick, event."""


def tuned_tracks(
    names: Mapping[int, str],
    lanes: Sequence[Lane],
    mix: Mapping[int, tuple[int, int]],
    made: Tables,
    end: int,
    programs: bool,
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
    made : Tables
        What the channels are told.
    end : int
        The tick where the piece ends.
    programs : bool
        Whether each channel has the tuning program of its own number.
    """
    timed: dict[int, list[_Timed]] = {
        part: [(0, _NAME, Meta(MetaType.TRACK_NAME, text_bytes(name)))]
        for part, name in names.items()
    }
    for lane in lanes:
        home = lane.notes[0].part
        level, place = mix[home] if len(lane.parts) == 1 else (FULL_VOLUME, CENTRE)
        timed[home] += ((0, _SETUP, event) for event in _setup(lane, level, place, programs))
        for note in lane.notes:
            events = timed[note.part]
            events.append((note.on, _ON, NoteOn(lane.channel, note.key, note.velocity)))
            events.append((note.off, _OFF, NoteOff(lane.channel, note.key)))
            if words := lyric_bytes(note.lyric):
                events.append((note.on, _LYRIC, Meta(MetaType.LYRIC, words)))
    for told in made.told:
        timed[told.part] += ((told.tick, _TUNE, event) for event in told.events)
    timed[next(iter(names))] += ((0, _DUMP, dump) for dump in made.dumps)
    return [_track(events, end) for events in timed.values()]


def _setup(lane: Lane, level: int, place: int, programs: bool) -> Iterator[Event]:
    """What a channel is told at the start; controllers are reset first, as that may undo a
    tuning."""
    yield Control(lane.channel, _RESET_CONTROLLERS, 0)
    yield Program(lane.channel, lane.program)
    yield Control(lane.channel, _VOLUME, level)
    yield Control(lane.channel, _PAN, place)
    if programs and lane.channel != PERCUSSION:
        yield from select(lane.channel, lane.channel)


def _track(timed: list[_Timed], end: int) -> RawTrack:
    timed.sort(key=itemgetter(0, 1))
    return RawTrack(tuple((tick, event) for tick, _, event in timed), end)
