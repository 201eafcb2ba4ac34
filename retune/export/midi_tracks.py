"""From planned notes on their channels to the events of one track a part.

Order at one tick: note-offs, then set-up, bends, lyrics, note-ons; a channel's bends stand in
the track of the note that needs them, and before it (RP-001 orders nothing between tracks).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
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
from retune.export.midi_channels import Lane
from retune.export.midi_text import lyric_bytes, text_bytes

_OFF, _SETUP, _BEND, _LYRIC, _ON = range(5)

_VOLUME, _PAN, _RESET_CONTROLLERS = 7, 10, 121
_RPN_MSB, _RPN_LSB, _DATA_MSB, _DATA_LSB = 101, 100, 6, 38
_FULL_VOLUME = 100
"""The level General MIDI 2 gives a channel that was told none."""

CENTRE = 64
"""The pan in the middle; 0 is left, 127 right."""

_RANKS = 5
Timed = tuple[int, Event]
"""Place in time, which is tick * _RANKS + rank among the events of that tick; event."""


def part_tracks(
    names: Sequence[str], lanes: Sequence[Lane], pans: Sequence[int], bend_range: int, end: int
) -> list[RawTrack]:
    """One track a part.

    Parameters
    ----------
    names, pans : sequences
        The parts' names and places from left (0) to right (127), in score order.
    lanes : sequence of Lane
        The channels with their notes.
    bend_range : int
        Semitones.
    end : int
        The tick where the piece ends.
    """
    timed: list[list[Timed]] = [[] for _ in names]
    for lane in lanes:
        home = lane.notes[0].part
        pan = pans[home] if len(lane.parts) == 1 else CENTRE
        timed[home].extend((_SETUP, event) for event in _setup(lane, pan, bend_range))
        for part, tick, bend in _bends(lane):
            timed[part].append((tick * _RANKS + _BEND, bend))
        for note in lane.notes:
            events, on, off = timed[note.part], note.on * _RANKS, note.off * _RANKS
            events.append((on + _ON, NoteOn(lane.channel, note.key, note.velocity)))
            events.append((off + _OFF, NoteOff(lane.channel, note.key)))
            if words := lyric_bytes(note.lyric):
                events.append((on + _LYRIC, Meta(MetaType.LYRIC, words)))
    return [_track(name, events, end) for name, events in zip(names, timed, strict=True)]


def _track(name: str, timed: list[Timed], end: int) -> RawTrack:
    timed.sort(key=itemgetter(0))
    title = (0, Meta(MetaType.TRACK_NAME, text_bytes(name)))
    return RawTrack((title, *[(place // _RANKS, event) for place, event in timed]), end)


def _setup(lane: Lane, pan: int, bend_range: int) -> Iterator[Event]:
    """What a channel is told at the start: all of it before its first note."""
    channel = lane.channel
    yield Control(channel, _RESET_CONTROLLERS, 0)
    yield Program(channel, lane.program)
    yield Control(channel, _VOLUME, _FULL_VOLUME)
    yield Control(channel, _PAN, pan)
    # RPN 0, bend range: whole semitones, no cents; then the null RPN, so that a stray data
    # entry changes nothing.
    for controller, value in (
        (_RPN_MSB, 0),
        (_RPN_LSB, 0),
        (_DATA_MSB, bend_range),
        (_DATA_LSB, 0),
        (_RPN_MSB, 127),
        (_RPN_LSB, 127),
    ):
        yield Control(channel, controller, value)
    yield Bend(channel, lane.notes[0].bends[0][1])


def _bends(lane: Lane) -> Iterator[tuple[int, int, Bend]]:
    """Part, tick and bend of each change of a channel's bend after the first."""
    wanted = sorted((tick, note.part, value) for note in lane.notes for tick, value in note.bends)
    current = lane.notes[0].bends[0][1]
    for tick, part, value in wanted:
        if value != current:
            current = value
            yield part, tick, Bend(lane.channel, value)
