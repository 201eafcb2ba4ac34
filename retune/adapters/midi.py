"""Standard MIDI Files (RP-001) read and written tick for tick.

The values are those of `retune.adapters.midi_events`, importable from here. Writing is mido's.
Reading frames the tracks itself, because mido 1.3.3 drops the delta time of every meta event it
does not know (FF 08, program name, is one), which shifts all that follows, and refuses whole
files for an unknown chunk or an odd key signature.
"""

from __future__ import annotations

from collections.abc import Iterator
from io import BytesIO
from itertools import pairwise

import mido

from retune.adapters.midi_events import (
    Bend,
    ChannelPressure,
    Control,
    Event,
    KeyPressure,
    Meta,
    MetaType,
    NoteOff,
    NoteOn,
    Program,
    RawMidi,
    RawTrack,
    SmpteDivision,
    Sysex,
    text_of,
)
from retune.adapters.midi_tracks import DAMAGED, EventCounts, TrackReader
from retune.errors import LimitError, OutputError, UnreadableError
from retune.limits import Limits

__all__ = [
    "Bend",
    "ChannelPressure",
    "Control",
    "Event",
    "KeyPressure",
    "Meta",
    "MetaType",
    "NoteOff",
    "NoteOn",
    "Program",
    "RawMidi",
    "RawTrack",
    "SmpteDivision",
    "Sysex",
    "read_midi_file",
    "text_of",
    "write_midi_file",
]

MAX_DELTA = 0x0FFFFFFF
"""The largest number a four-byte variable-length quantity holds."""


def read_midi_file(data: bytes, limits: Limits | None = None) -> RawMidi:
    """Read a Standard MIDI File, tick for tick.

    Unknown chunks are skipped, a header longer than 6 bytes is honoured, and running status may
    last over meta events, as it does in many files. Packets of a split system exclusive
    message are joined where the last one stands; escapes (F7) outside of one are left out.

    Raises
    ------
    UnreadableError
        Not a MIDI file, or a truncated or broken one.
    LimitError
        More bytes, notes or events than `limits` allows.
    """
    limits = limits or Limits()
    if len(data) > limits.max_bytes:
        raise LimitError(f"the file has {len(data)} bytes; at most {limits.max_bytes} are read")
    if data[:4] != b"MThd":
        raise UnreadableError("not a MIDI file: it does not start with MThd")
    chunks = _chunks(data)
    _, header = next(chunks, (b"", b""))
    if len(header) < 6:
        raise UnreadableError("the MIDI header is too short", hint=DAMAGED)
    kind, count = header[1] | header[0] << 8, header[3] | header[2] << 8
    if kind > 2:
        raise UnreadableError(f"unknown MIDI format {kind}; 0, 1 and 2 exist")
    counts = EventCounts(limits)
    tracks: list[RawTrack] = []
    for name, body in chunks:
        if len(tracks) == count:
            break
        if name == b"MTrk":
            tracks.append(TrackReader(body, len(tracks) + 1, counts).read())
    if len(tracks) < count:
        raise UnreadableError(
            f"the header announces {count} tracks, the file holds {len(tracks)}",
            hint=DAMAGED,
        )
    return RawMidi(kind, _division(header[4], header[5]), tuple(tracks))


def _division(high: int, low: int) -> int | SmpteDivision:
    division = SmpteDivision(256 - high, low) if high & 0x80 else high << 8 | low
    if division == 0 or (low == 0 and high & 0x80):
        raise UnreadableError("the MIDI header gives no ticks", hint=DAMAGED)
    return division


def _chunks(data: bytes) -> Iterator[tuple[bytes, bytes]]:
    """Names and bodies of a file's chunks; one cut short raises `UnreadableError`."""
    position = 0
    while position + 8 <= len(data):
        name = data[position : position + 4]
        start = position + 8
        position = start + int.from_bytes(data[position + 4 : start])
        if position > len(data) and name in (b"MThd", b"MTrk"):
            raise UnreadableError("the MIDI file is cut short", hint=DAMAGED)
        yield name, data[start:position]


def write_midi_file(raw: RawMidi) -> bytes:
    """The bytes of a file: events by tick, those of one tick in the order given.

    A track ends at its `end` or its last event, whichever is later.

    Raises
    ------
    OutputError
        A value out of its range, a gap longer than a file can state, or a format 0 file
        without exactly one track.
    """
    if raw.format == 0 and len(raw.tracks) != 1:
        raise OutputError("a MIDI file of format 0 must have exactly one track")
    out = BytesIO()
    try:
        mido.MidiFile(
            type=raw.format,
            ticks_per_beat=_division_word(raw.division),
            tracks=[_track_messages(track) for track in raw.tracks],
        ).save(file=out)
    except (ValueError, TypeError) as error:
        raise OutputError(f"a MIDI value is out of range: {error}") from error
    return out.getvalue()


def _division_word(division: int | SmpteDivision) -> int:
    """The division as the signed 16-bit word of the header."""
    word = division if isinstance(division, int) else division.ticks - (division.frames << 8)
    if not -0x8000 < word < 0x8000 or word == 0:
        raise OutputError(f"{division} is no MIDI division; 1 to 32767 ticks a quarter are")
    return word


def _track_messages(track: RawTrack) -> list[mido.Message | mido.MetaMessage]:
    ordered = sorted(track.events, key=lambda item: item[0])
    last = max([track.end, *(tick for tick, _ in ordered[-1:])])
    ticks = [0, *(tick for tick, _ in ordered), last]
    deltas = [after - before for before, after in pairwise(ticks)]
    if max(deltas) > MAX_DELTA:
        raise OutputError(f"a MIDI file cannot wait {max(deltas)} ticks for an event")
    messages = [
        _message(event, delta) for (_, event), delta in zip(ordered, deltas[:-1], strict=True)
    ]
    return [*messages, mido.MetaMessage("end_of_track", time=deltas[-1])]


def _message(event: Event, delta: int) -> mido.Message | mido.MetaMessage:
    match event:
        case NoteOn(channel, key, velocity):
            kind, values = "note_on", {"channel": channel, "note": key, "velocity": velocity}
        case NoteOff(channel, key, velocity):
            kind, values = "note_off", {"channel": channel, "note": key, "velocity": velocity}
        case KeyPressure(channel, key, pressure):
            kind, values = "polytouch", {"channel": channel, "note": key, "value": pressure}
        case Control(channel, controller, value):
            kind = "control_change"
            values = {"channel": channel, "control": controller, "value": value}
        case Program(channel, program):
            kind, values = "program_change", {"channel": channel, "program": program}
        case ChannelPressure(channel, pressure):
            kind, values = "aftertouch", {"channel": channel, "value": pressure}
        case Bend(channel, value):
            kind, values = "pitchwheel", {"channel": channel, "pitch": value - 8192}
        case Sysex(data):
            return mido.Message("sysex", data=tuple(data), time=delta)
        case Meta(number, data):
            if not 0 <= number < 0x80 or number == MetaType.END_OF_TRACK:
                raise ValueError(f"meta type {number} cannot be written as an event")
            return mido.UnknownMetaMessage(number, data, time=delta)
    return mido.Message(kind, time=delta, **values)
