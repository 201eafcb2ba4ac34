"""Reading one track of a Standard MIDI File: delta times, running status, metas, limits."""

from __future__ import annotations

from collections.abc import Callable

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
    RawTrack,
    Sysex,
)
from retune.errors import LimitError, UnreadableError
from retune.limits import Limits

DAMAGED = "The file seems damaged; export it again"
"""The hint that goes with a broken MIDI file."""

_EVENTS_PER_NOTE = 8

# Status nibble -> number of data bytes and what they make.
_CHANNEL_MESSAGES: dict[int, tuple[int, Callable[[int, bytes], Event]]] = {
    0x8: (2, lambda channel, data: NoteOff(channel, data[0], data[1])),
    0x9: (2, lambda channel, data: NoteOn(channel, data[0], data[1])),
    0xA: (2, lambda channel, data: KeyPressure(channel, data[0], data[1])),
    0xB: (2, lambda channel, data: Control(channel, data[0], data[1])),
    0xC: (1, lambda channel, data: Program(channel, data[0])),
    0xD: (1, lambda channel, data: ChannelPressure(channel, data[0])),
    0xE: (2, lambda channel, data: Bend(channel, data[0] | data[1] << 7)),
}
_SYSEX, _ESCAPE, _META = 0xF0, 0xF7, 0xFF


class EventCounts:
    """Notes and events read so far, held against the limits."""

    def __init__(self, limits: Limits) -> None:
        self._notes_left = limits.max_notes
        self._events_left = limits.max_notes * _EVENTS_PER_NOTE
        self._limits = limits

    def add(self, event: Event) -> None:
        """Count one more; raises `LimitError`."""
        self._events_left -= 1
        self._notes_left -= isinstance(event, NoteOn) and event.velocity > 0
        if self._notes_left < 0:
            raise LimitError(f"the file has more than {self._limits.max_notes} notes")
        if self._events_left < 0:
            most = self._limits.max_notes * _EVENTS_PER_NOTE
            raise LimitError(f"the file has more than {most} MIDI events")


class TrackReader:
    """Reads the events of one MTrk chunk."""

    def __init__(self, body: bytes, number: int, counts: EventCounts) -> None:
        self._body = body
        self._number = number
        self._counts = counts
        self._position = 0
        self._split: bytearray | None = None

    def read(self) -> RawTrack:
        """All events; raises `UnreadableError` or `LimitError`."""
        events: list[tuple[int, Event]] = []
        tick, status = 0, 0
        while self._position < len(self._body):
            tick += self._quantity()
            lead = self._byte()
            event: Event | None
            if lead == _META:
                event = self._meta()
                if event.type == MetaType.END_OF_TRACK:
                    break
            elif lead >= 0xF0:
                event = self._sysex(lead)
            else:
                if lead >= 0x80:
                    status = lead
                else:
                    self._position -= 1
                event = self._message(status)
            if event is not None:
                self._counts.add(event)
                events.append((tick, event))
        return RawTrack(tuple(events), tick)

    def _broken(self, what: str) -> UnreadableError:
        return UnreadableError(f"track {self._number} {what}", hint=DAMAGED)

    def _byte(self) -> int:
        if self._position >= len(self._body):
            raise self._broken("ends in the middle of an event")
        self._position += 1
        return self._body[self._position - 1]

    def _take(self, length: int) -> bytes:
        start, self._position = self._position, self._position + length
        if self._position > len(self._body):
            raise self._broken("ends in the middle of an event")
        return self._body[start : self._position]

    def _quantity(self) -> int:
        """A variable-length quantity of at most four bytes."""
        value = 0
        for _ in range(4):
            byte = self._byte()
            value = value << 7 | byte & 0x7F
            if byte < 0x80:
                return value
        raise self._broken("holds a number longer than four bytes")

    def _message(self, status: int) -> Event:
        if status == 0:
            raise self._broken("starts with data that belong to no event")
        length, make = _CHANNEL_MESSAGES[status >> 4]
        data = self._take(length)
        if max(data) > 0x7F:
            raise self._broken("holds a data byte above 127")
        return make(status & 0x0F, data)

    def _meta(self) -> Meta:
        kind = self._byte()
        if kind > 0x7F:
            raise self._broken("holds a meta event of a type above 127")
        return Meta(kind, self._take(self._quantity()))

    def _sysex(self, lead: int) -> Sysex | None:
        """A message once its last packet is there; None before, and for escapes."""
        if lead not in (_SYSEX, _ESCAPE):
            raise self._broken(f"holds the byte {lead:02X}, which no MIDI file may")
        packet = self._take(self._quantity())
        if lead == _SYSEX:
            self._split = bytearray()
        if self._split is None:
            return None
        self._split += packet
        if not self._split.endswith(b"\xf7"):
            return None
        message, self._split = Sysex(bytes(self._split[:-1])), None
        return message
