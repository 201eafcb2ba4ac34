"""What a synth that obeys tuning messages makes of a MIDI file.

It knows tuning programs (RPN 3), single-note changes (08 02), bulk dumps (08 01) and two-byte
scale/octave tuning (08 09) of the MIDI Tuning Updated Specification; real-time messages move what
sounds, others leave it. Nothing here knows how the file was made, and words are read here without
the code that writes them. Pitches are float key numbers on the grid of A4 = 440 Hz; of events at
one tick, those of the earlier track come first.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import reduce
from operator import xor

from retune.adapters.midi import Control, NoteOff, NoteOn, RawMidi, Sysex
from retune.errors import OutputError
from retune.export.midi_channels import PERCUSSION
from retune.export.midi_receiver import HeardNote, in_order

_RPN_MSB, _RPN_LSB, _DATA_MSB, _RESET = 101, 100, 6, 121
_TUNING_PROGRAM, _NULL = (0, 3), (127, 127)
_REAL_TIME, _NON_REAL_TIME, _ALL, _TUNING = 0x7F, 0x7E, 0x7F, 0x08
_BULK, _SINGLE, _OCTAVE = 0x01, 0x02, 0x09
_NO_CHANGE = (0x7F, 0x7F, 0x7F)


@dataclass(slots=True)
class _Channel:
    """Parameter selected, tuning program, octave tuning in keys, sounding notes by key."""

    selected: tuple[int, int] = _NULL
    program: int | None = None
    octave: tuple[float, ...] = (0.0,) * 12
    sounding: dict[int, HeardNote] = field(default_factory=dict)


class _Synth:
    """The state of the whole synth; `programs` is the pitch of each retuned key by program."""

    def __init__(self) -> None:
        self.channels = [_Channel() for _ in range(16)]
        self.programs: dict[int, dict[int, float]] = {}

    def pitch(self, number: int, key: int) -> float:
        if number == PERCUSSION:
            return float(key)
        channel = self.channels[number]
        table = {} if channel.program is None else self.programs.get(channel.program, {})
        return table.get(key, float(key)) + channel.octave[key % 12]

    def control(self, number: int, controller: int, value: int) -> None:
        channel = self.channels[number]
        msb, lsb = channel.selected
        if controller == _RPN_MSB:
            channel.selected = (value, lsb)
        elif controller == _RPN_LSB:
            channel.selected = (msb, value)
        elif controller == _RESET:
            channel.selected = _NULL
        elif controller == _DATA_MSB and channel.selected == _TUNING_PROGRAM:
            channel.program = value

    def tune(self, data: bytes) -> bool:
        """Obey a message; whether notes that sound move too."""
        if len(data) < 5 or data[1] != _ALL or data[2] != _TUNING or max(data) > 0x7F:
            raise OutputError("a system exclusive message is no tuning message to all devices")
        real_time, kind = data[0] == _REAL_TIME, data[3]
        if kind == _SINGLE and real_time and len(data) == 6 + 4 * data[5]:
            table = self.programs.setdefault(data[4], {})
            for at in range(6, len(data), 4):
                _set(table, data[at], data[at + 1 : at + 4])
        elif kind == _BULK and data[0] == _NON_REAL_TIME and len(data) == 406:
            if reduce(xor, data) & 0x7F:
                raise OutputError("a bulk dump has a wrong checksum")
            table = self.programs.setdefault(data[4], {})
            for key in range(128):
                _set(table, key, data[21 + 3 * key : 24 + 3 * key])
        elif kind == _OCTAVE and real_time and len(data) == 31 and data[4] < 4:
            mask = data[4] << 14 | data[5] << 7 | data[6]
            words = zip(data[7::2], data[8::2], strict=True)
            octave = tuple(((high << 7 | low) - 0x2000) / 0x2000 for high, low in words)
            for number, channel in enumerate(self.channels):
                if mask >> number & 1:
                    channel.octave = octave
        else:
            raise OutputError(f"tuning message 08 {kind:02X} is not as the specification has it")
        return real_time


def _set(table: dict[int, float], key: int, word: bytes) -> None:
    if tuple(word) != _NO_CHANGE:
        table[key] = word[0] + (word[1] / 128.0 + word[2] / 16384.0)


def heard_by_tuning(raw: RawMidi) -> list[HeardNote]:
    """Every note of a format 1 file as it sounds.

    Raises `OutputError` for a message that the specification does not have, and where a key is
    struck while it sounds or is never released.
    """
    synth = _Synth()
    heard: list[HeardNote] = []
    for tick, track, event in in_order(raw):
        match event:
            case NoteOn(channel, key, velocity) if velocity > 0:
                sounding = synth.channels[channel].sounding
                if key in sounding:
                    raise OutputError(f"key {key} is struck twice on channel {channel + 1}")
                sounding[key] = HeardNote(track, key, tick, synth.pitch(channel, key))
                heard.append(sounding[key])
            case NoteOff(channel, key) | NoteOn(channel, key):
                if (ended := synth.channels[channel].sounding.pop(key, None)) is not None:
                    ended.off = tick
            case Control(channel, controller, value):
                synth.control(channel, controller, value)
                _move(synth, tick)
            case Sysex(data):
                if synth.tune(data):
                    _move(synth, tick)
            case _:
                pass
    if any(channel.sounding for channel in synth.channels):
        raise OutputError("a note is never released")
    return heard


def _move(synth: _Synth, tick: int) -> None:
    for number, channel in enumerate(synth.channels):
        for key, note in channel.sounding.items():
            if (pitch := synth.pitch(number, key)) != note.last:
                note.moves.append((tick, pitch))
