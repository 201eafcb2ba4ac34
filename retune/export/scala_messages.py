"""Tables as tuning messages on a track of their own: for an instrument that is played live.

Scale/octave tuning in its two-byte form, real time, for all channels (MIDI Tuning Updated
Specification, CA-020/CA-021): F0 7F 7F 08 09 03 7F 7F, then for C to B how far each is from equal
temperament, 14 bits in steps of 200/16384 cents, the middle 40 00; F7.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from retune.adapters.midi import Meta, MetaType, RawMidi, RawTrack, Sysex, write_midi_file
from retune.export.midi_conductor import conductor
from retune.export.midi_text import text_bytes
from retune.export.ticks import Ticks, ticks_for
from retune.tuning.model import TunedScore
from retune.units import reference_offset

STEP = 100.0 / 8192.0
"""Cents between two neighbouring values; the rounding error is half of it."""

_HEAD = bytes((0x7F, 0x7F, 0x08, 0x09, 0x03, 0x7F, 0x7F))
_HIGHEST = 0x3FFF


def octave_message(cents: Sequence[float]) -> Sysex:
    """The message for twelve deviations from equal temperament in cents, from C up.

    Those beyond 100 cents either way are held there, as the message cannot say more.
    """
    body = bytearray(_HEAD)
    for value in cents:
        number = min(max(8192 + round(value / STEP), 0), _HIGHEST)
        body += bytes((number >> 7, number & 0x7F))
    return Sysex(bytes(body))


def message_file(
    tuned: TunedScore, switches: Sequence[tuple[Fraction, str, Sequence[float]]]
) -> bytes:
    """A MIDI file with the piece's tempo and metre and a message at each switch.

    `switches` are (onset, name of the table, cents from C up), ascending; a message is sent only
    where the table changes.
    """
    ticks: Ticks = ticks_for(tuned)
    offset = reference_offset(tuned.policy.reference_hz)
    end = ticks.at(tuned.score.end)
    events: list[tuple[int, Meta | Sysex]] = [(0, Meta(MetaType.TRACK_NAME, text_bytes("Tuning")))]
    sent: Sysex | None = None
    for place, (onset, name, cents) in enumerate(switches):
        message = octave_message([value + offset for value in cents])
        if message != sent:
            # The first table holds from the start, so that nothing sounds before it.
            tick = ticks.at(onset) if place else 0
            events += [(tick, Meta(MetaType.MARKER, text_bytes(name))), (tick, message)]
            sent = message
    track = RawTrack(tuple(events), end)
    return write_midi_file(RawMidi(1, ticks.division, (conductor(tuned.score, ticks, end), track)))
