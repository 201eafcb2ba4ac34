"""Reading a returned MIDI file back: nothing but channels and bends may have changed, and every
note must start at its tuned pitch."""

from __future__ import annotations

from collections.abc import Sequence

from retune.adapters.midi import Bend, Control, NoteOn, RawMidi, RawTrack, read_midi_file
from retune.errors import OutputError, RetuneError
from retune.export.bend import MIDDLE, bend_cents, bend_step
from retune.export.midi_return_tracks import Instrument
from retune.limits import Limits
from retune.score.midi.undo import as_before

_FAULT = "This is a fault of retune; please report it with the file, if you may"
_SLACK = 1e-3
_RPN_MSB, _RPN_LSB, _DATA_MSB = 101, 100, 6


def check_returned(
    data: bytes, source: RawMidi, instruments: Sequence[Instrument], bend_range: int, shift: int
) -> str:
    """Compare a returned file with the one it came from; a line with the greatest error.

    Raises `OutputError` where an event is lost, added or changed, or a note starts off pitch.
    """
    try:
        raw = read_midi_file(data, Limits(max_bytes=len(data), max_notes=len(data)))
    except RetuneError as error:
        raise OutputError(f"the MIDI file reads back wrong: {error.what}", hint=_FAULT) from error
    before = as_before(raw)
    for number, (track, old) in enumerate(zip(before.tracks, source.tracks, strict=True)):
        if _others(track) != _others(old):
            raise OutputError(f"track {number + 1} reads back with other events", hint=_FAULT)
        if _pressed(track, shift) != _pressed(old, 0):
            raise OutputError(f"track {number + 1} reads back with other notes", hint=_FAULT)
    worst, count = 0.0, 0
    for one in instruments:
        for channel, lane in zip(one.channels, one.lanes, strict=True):
            wanted = [(note.on, note.key, note.bends[0][1] / 1000.0) for note in lane]
            heard = _heard(raw.tracks[one.track], channel)
            for tick, key, cents in wanted:
                own = next((c for t, c in reversed(one.knob.bends) if t <= tick), 0.0)
                missed = abs(heard.get((tick, key), float("inf")) - cents - own)
                worst, count = max(worst, missed), count + 1
    if worst > bend_step(bend_range) / 2 + _SLACK:
        raise OutputError(f"a note reads back {worst:.3f} cents off its tuned pitch", hint=_FAULT)
    return f"read back: {count:,} notes, greatest rounding error {worst:.4f} cents"


def _others(track: RawTrack) -> list[object]:
    """Events that no retuning touches, with their ticks."""
    return [(tick, event) for tick, event in track.events if not hasattr(event, "channel")]


def _pressed(track: RawTrack, shift: int) -> list[tuple[int, int, int, int]]:
    """Key presses with tick, channel, key and velocity; pitched ones moved back."""
    return [
        (tick, event.channel, event.key - (shift if event.channel != 9 else 0), event.velocity)
        for tick, event in track.events
        if isinstance(event, NoteOn)
    ]


def _heard(track: RawTrack, channel: int) -> dict[tuple[int, int], float]:
    """How far each key press of a channel is bent as it starts, in cents."""
    selected, semitones, bend = (127, 127), 2, MIDDLE
    found: dict[tuple[int, int], float] = {}
    for tick, event in track.events:
        match event:
            case Control(own, controller, value) if own == channel:
                if controller == _RPN_MSB:
                    selected = (value, selected[1])
                elif controller == _RPN_LSB:
                    selected = (selected[0], value)
                elif controller == _DATA_MSB and selected == (0, 0):
                    semitones = value
                elif controller == 121:
                    bend, selected = MIDDLE, (127, 127)
            case Bend(own, value) if own == channel:
                bend = value
            case NoteOn(own, key, velocity) if own == channel and velocity:
                found[tick, key] = bend_cents(bend, semitones)
            case _:
                pass
    return found
