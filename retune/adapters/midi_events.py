"""What a Standard MIDI File (RP-001) holds, as plain values.

Conventions
-----------
* Ticks count from the start of the track, in the file's own division.
* Channels count from 0; channel 9 is the rhythm channel.
* A bend is 0 to 16383, 8192 in the middle.
* Text stays bytes here; `text_of` decodes it.
* The end-of-track meta is `RawTrack.end`, never an event.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum


@dataclass(frozen=True, slots=True)
class NoteOff:
    """A key released."""

    channel: int
    key: int
    velocity: int = 64


@dataclass(frozen=True, slots=True)
class NoteOn:
    """A key struck; velocity 0 releases it."""

    channel: int
    key: int
    velocity: int


@dataclass(frozen=True, slots=True)
class KeyPressure:
    """Polyphonic aftertouch."""

    channel: int
    key: int
    pressure: int


@dataclass(frozen=True, slots=True)
class Control:
    """A control change."""

    channel: int
    controller: int
    value: int


@dataclass(frozen=True, slots=True)
class Program:
    """A program change; programs count from 0."""

    channel: int
    program: int


@dataclass(frozen=True, slots=True)
class ChannelPressure:
    """Channel aftertouch."""

    channel: int
    pressure: int


@dataclass(frozen=True, slots=True)
class Bend:
    """A pitch bend, 0 to 16383."""

    channel: int
    value: int


@dataclass(frozen=True, slots=True)
class Sysex:
    """A whole system exclusive message, without its F0 and F7."""

    data: bytes


class MetaType(IntEnum):
    """The meta events of RP-001 and RP-019 this project reads or writes."""

    TEXT = 0x01
    COPYRIGHT = 0x02
    TRACK_NAME = 0x03
    INSTRUMENT_NAME = 0x04
    LYRIC = 0x05
    MARKER = 0x06
    CUE = 0x07
    PROGRAM_NAME = 0x08
    PORT = 0x21
    """Unofficial, but widely read: the port or cable that a track's messages go to."""
    END_OF_TRACK = 0x2F
    TEMPO = 0x51
    TIME_SIGNATURE = 0x58
    KEY_SIGNATURE = 0x59


@dataclass(frozen=True, slots=True)
class Meta:
    """A meta event: its type number, 0 to 127, and its bytes as they stand."""

    type: int
    data: bytes = b""


Event = NoteOff | NoteOn | KeyPressure | Control | Program | ChannelPressure | Bend | Sysex | Meta


@dataclass(frozen=True, slots=True)
class SmpteDivision:
    """Ticks that count time, not beats: frames a second (24, 25, 29, 30), ticks a frame.

    29 stands for 30 drop-frame, which runs at 30000/1001 frames a second.
    """

    frames: int
    ticks: int


@dataclass(frozen=True, slots=True)
class RawTrack:
    """Events with their ticks, ascending, and the tick where the track ends."""

    events: tuple[tuple[int, Event], ...]
    end: int = 0


@dataclass(frozen=True, slots=True)
class RawMidi:
    """A whole file: format 0, 1 or 2, ticks a quarter note or SMPTE division, tracks."""

    format: int
    division: int | SmpteDivision
    tracks: tuple[RawTrack, ...]


def text_of(data: bytes) -> str:
    """Text of a meta event: UTF-8 where it is valid, else Latin-1; no NULs.

    >>> text_of("Ténor".encode("latin-1")), text_of("Ténor".encode())
    ('Ténor', 'Ténor')
    """
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")
    return text.replace("\0", "")
