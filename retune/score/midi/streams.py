"""The parts of a MIDI file: one for each channel with notes in each track."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from retune.adapters.midi import (
    Control,
    Meta,
    MetaType,
    NoteOff,
    NoteOn,
    Program,
    RawMidi,
    RawTrack,
    text_of,
)
from retune.score.midi.notes import PlayedNote, played_notes


@dataclass(frozen=True, slots=True)
class Stream:
    """One channel of one track; both count from 0. `notes` holds every key press."""

    track: int
    channel: int
    name: str
    instrument: str
    program: int | None
    notes: tuple[PlayedNote, ...]

    @property
    def id(self) -> str:
        """Track and channel, counting from 1 as programs show them."""
        return f"track {self.track + 1} channel {self.channel + 1}"


def streams_of(raw: RawMidi) -> list[Stream]:
    """Every track and channel that has notes, in file order.

    A track's name is its part's name; numbers tell several channels of one track apart. The
    one track of a format 0 file names the piece, not a part (RP-001).
    """
    last, zones = last_key(raw), mpe_zones(raw)
    return [
        stream
        for number, track in enumerate(raw.tracks)
        for stream in _of_track(track, number, raw.format, last, zones)
    ]


_RPN_MSB, _RPN_LSB, _DATA_MSB = 101, 100, 6
_MPE = (0, 6)
_LOWER, _UPPER = 0, 15


def mpe_zones(raw: RawMidi) -> dict[int, int]:
    """Member channels of MPE zones and their managers: one instrument over several channels.

    By the configuration message, RPN 6 on channel 1 (members from 2 up) or 16 (from 15 down);
    M1-100-UM v1.1, 2.1.
    """
    found: dict[int, int] = {}
    selected: dict[int, tuple[int, int]] = {}
    for track in raw.tracks:
        for _, event in track.events:
            if not isinstance(event, Control) or event.channel not in (_LOWER, _UPPER):
                continue
            msb, lsb = selected.get(event.channel, (127, 127))
            if event.controller == _RPN_MSB:
                selected[event.channel] = (event.value, lsb)
            elif event.controller == _RPN_LSB:
                selected[event.channel] = (msb, event.value)
            elif event.controller == _DATA_MSB and (msb, lsb) == _MPE:
                members = range(1, min(event.value, 15) + 1)
                step = 1 if event.channel == _LOWER else -1
                found |= {event.channel + step * one: event.channel for one in members}
    return found


def last_key(raw: RawMidi) -> int:
    """The tick of the last key pressed or released; what hangs is released there."""
    return max(
        (
            tick
            for track in raw.tracks
            for tick, event in track.events
            if isinstance(event, NoteOn | NoteOff)
        ),
        default=0,
    )


def _of_track(
    track: RawTrack, number: int, kind: int, last: int, zones: dict[int, int]
) -> Iterator[Stream]:
    by_channel: dict[int, list[PlayedNote]] = {}
    for note in played_notes(track, number, last):
        by_channel.setdefault(zones.get(note.channel, note.channel), []).append(note)
    name = first_text(track, MetaType.TRACK_NAME) if kind else ""
    for place, channel in enumerate(sorted(by_channel), start=1):
        numbered = f"{name} {place}" if name and len(by_channel) > 1 else name
        yield Stream(
            number,
            channel,
            numbered,
            first_text(track, MetaType.INSTRUMENT_NAME),
            _program(track, channel, by_channel[channel][0].onset),
            tuple(by_channel[channel]),
        )


def first_text(track: RawTrack, kind: MetaType) -> str:
    """The first text of a kind in a track, on one line; "" where there is none."""
    texts = (
        " ".join(text_of(event.data).split())
        for _, event in track.events
        if isinstance(event, Meta) and event.type == kind
    )
    return next((text for text in texts if text), "")


def _program(track: RawTrack, channel: int, first_onset: int) -> int | None:
    """The program in force at a channel's first note, or the first one set later."""
    changes = [
        (tick, event.program)
        for tick, event in track.events
        if isinstance(event, Program) and event.channel == channel
    ]
    before = [program for tick, program in changes if tick <= first_onset]
    return next(iter(before[-1:] or [program for _, program in changes]), None)


# What sequencers call the track of tempo and metre: common practice, no source.
_CONDUCTOR_NAMES = frozenset(
    ("tempo", "tempo track", "tempo map", "conductor", "conductor track", "master track")
)


def title_of(raw: RawMidi, streams: Sequence[Stream]) -> str:
    """The name of the piece: the first track's, unless that names a part or a tempo track."""
    names_a_part = raw.format > 0 and any(stream.track == 0 for stream in streams)
    if names_a_part or not raw.tracks:
        return ""
    name = first_text(raw.tracks[0], MetaType.TRACK_NAME)
    return "" if name.casefold() in _CONDUCTOR_NAMES else name
