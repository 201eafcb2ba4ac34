"""What a retuned MIDI file says of itself, so that it can be read as what it was before.

A sequencer-specific meta event (FF 7F, RP-001) with the identity for non-commercial use, 7D, then
"retune" and what is said: which channels belong to one instrument, or how far the bend that
follows is tuning. Programs that do not know it leave it alone, and no instrument is sent it.
"""

from __future__ import annotations

from dataclasses import dataclass

from retune.adapters.midi_events import Control, Event, Meta

_SEQUENCER_SPECIFIC = 0x7F
_HEAD = b"\x7dretune"
_LANES, _SHARE = b"\x01", b"\x02"
_PARTS_OF_A_CENT = 1000


@dataclass(frozen=True, slots=True)
class Lanes:
    """Channels, the first of them the instrument's own, on which its notes are spread.

    `own_range` is that of the instrument's own bends in semitones, 0 where it has none; where it
    has some, each bend has a `Share` before it.
    """

    channels: tuple[int, ...]
    own_range: int = 0


@dataclass(frozen=True, slots=True)
class Share:
    """How many cents of the next bend of a channel are tuning."""

    channel: int
    cents: float


_RPN_MSB, _RPN_LSB, _DATA_MSB, _DATA_LSB = 101, 100, 6, 38


def range_setup(channel: int, semitones: int) -> tuple[Control, ...]:
    """RPN 0, bend range: whole semitones, no cents; then the null RPN, so that a stray data
    entry changes nothing."""
    return tuple(
        Control(channel, controller, value)
        for controller, value in (
            (_RPN_MSB, 0),
            (_RPN_LSB, 0),
            (_DATA_MSB, semitones),
            (_DATA_LSB, 0),
            (_RPN_MSB, 127),
            (_RPN_LSB, 127),
        )
    )


def marker_of(said: Lanes | Share) -> Meta:
    """The meta event that says it."""
    if isinstance(said, Lanes):
        body = _LANES + bytes((said.own_range, *said.channels))
    else:
        parts = round(said.cents * _PARTS_OF_A_CENT)
        body = _SHARE + bytes((said.channel,)) + parts.to_bytes(4, signed=True)
    return Meta(_SEQUENCER_SPECIFIC, _HEAD + body)


def said_by(event: Event) -> Lanes | Share | None:
    """What a meta event says, if it is one of these; None for all others and damaged ones."""
    if not isinstance(event, Meta) or event.type != _SEQUENCER_SPECIFIC:
        return None
    if not event.data.startswith(_HEAD):
        return None
    kind, body = event.data[len(_HEAD) :][:1], event.data[len(_HEAD) + 1 :]
    if kind == _LANES and 2 <= len(body) <= 17 and max(body[1:]) < 16 and body[0] < 128:
        return Lanes(tuple(body[1:]), body[0])
    if kind == _SHARE and len(body) == 5 and body[0] < 16:
        return Share(body[0], int.from_bytes(body[1:], signed=True) / _PARTS_OF_A_CENT)
    return None
