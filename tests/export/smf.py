"""A Standard MIDI File parser for the tests alone, written from RP-001 and sharing no code.

It checks what the standard demands (lengths, end of track, running status) and follows each
channel as a receiver that knows RPN 0 and pitch bend would.
"""

from __future__ import annotations

from dataclasses import dataclass, field


@dataclass
class Chunk:
    """A track: (tick, status or 'meta', data) in file order."""

    events: list[tuple[int, int, bytes]] = field(default_factory=list)
    metas: list[tuple[int, int, bytes]] = field(default_factory=list)
    order: list[tuple[int, int, bytes]] = field(default_factory=list)


@dataclass
class Smf:
    format: int
    division: int
    tracks: list[Chunk]


def _vlq(data: bytes, at: int) -> tuple[int, int]:
    value = 0
    for count in range(4):
        value = value * 128 + data[at + count] % 128
        if data[at + count] < 128:
            return value, at + count + 1
    raise AssertionError("a number longer than four bytes")


def parse(data: bytes) -> Smf:
    assert data[:8] == b"MThd\x00\x00\x00\x06"
    kind, count, division = (int.from_bytes(data[i : i + 2], "big") for i in (8, 10, 12))
    assert 0 < division < 32768
    at, tracks = 14, []
    while at < len(data):
        assert data[at : at + 4] == b"MTrk"
        length = int.from_bytes(data[at + 4 : at + 8], "big")
        tracks.append(_track(data[at + 8 : at + 8 + length]))
        at += 8 + length
    assert at == len(data)
    assert len(tracks) == count
    return Smf(kind, division, tracks)


def _track(body: bytes) -> Chunk:
    chunk, at, tick, status = Chunk(), 0, 0, None
    while True:
        delta, at = _vlq(body, at)
        tick += delta
        if body[at] == 0xFF:
            kind = body[at + 1]
            length, at = _vlq(body, at + 2)
            value, at, status = body[at : at + length], at + length, None
            chunk.metas.append((tick, kind, value))
            chunk.order.append((tick, 0xFF00 + kind, value))
            if kind == 0x2F:
                assert at == len(body)
                assert length == 0
                return chunk
            continue
        assert body[at] != 0xF7, "no split system exclusive expected"
        if body[at] == 0xF0:
            # The length counts the F7 at the end, not the F0.
            length, at = _vlq(body, at + 1)
            value, at, status = body[at : at + length], at + length, None
            assert value[-1] == 0xF7
            assert all(byte < 128 for byte in value[:-1])
            chunk.events.append((tick, 0xF0, value[:-1]))
            chunk.order.append((tick, 0xF0, value[:-1]))
            continue
        if body[at] >= 0x80:
            status, at = body[at], at + 1
        assert status is not None, "running status without a status"
        size = 1 if status >> 4 in (0xC, 0xD) else 2
        value = body[at : at + size]
        assert all(byte < 128 for byte in value)
        at += size
        chunk.events.append((tick, status, value))
        chunk.order.append((tick, status, value))


@dataclass
class Tone:
    """A note as received: `line` is its pitch in cents above key 0 at each tick it changed."""

    track: int
    channel: int
    key: int
    on: int
    velocity: int
    line: list[tuple[int, float]]
    off: int | None = None

    def at(self, tick: int) -> float:
        """Cents above key 0 from this tick on."""
        return [cents for when, cents in self.line if when <= tick][-1]

    def before(self, tick: int) -> float:
        return [cents for when, cents in self.line if when < tick][-1]


@dataclass
class BendEvent:
    tick: int
    channel: int
    value: int


def receive(smf: Smf) -> tuple[list[Tone], list[BendEvent]]:
    """All tones and all bends, tracks taken in file order at each tick.

    Channels count on from port to port (FF 21 01 pp), 16 on each.
    """
    ports = [[v[0] for _, kind, v in t.metas if kind == 0x21] or [0] for t in smf.tracks]
    merged = sorted(
        (tick, number, place, status, value)
        for number, track in enumerate(smf.tracks)
        for place, (tick, status, value) in enumerate(track.events)
    )
    channels = range(16 * (1 + max(port for found in ports for port in found)))
    bend = dict.fromkeys(channels, 8192)
    semitones = dict.fromkeys(channels, 2.0)
    rpn = {channel: [127, 127] for channel in channels}
    tones: list[Tone] = []
    live: dict[tuple[int, int], Tone] = {}
    bends: list[BendEvent] = []
    for tick, number, _, status, value in merged:
        assert status != 0xF0, "no system exclusive expected"
        (port,) = ports[number]
        kind, channel = status >> 4, 16 * port + (status & 15)
        if kind == 9 and value[1]:
            assert (channel, value[0]) not in live, "a sounding key is struck again"
            cents = 100 * value[0] + (bend[channel] - 8192) / 8192 * semitones[channel] * 100
            tone = Tone(number, channel, value[0], tick, value[1], [(tick, cents)])
            live[channel, value[0]] = tone
            tones.append(tone)
        elif kind in (8, 9):
            live.pop((channel, value[0])).off = tick
        elif kind == 0xE:
            bend[channel] = value[0] + 128 * value[1]
            bends.append(BendEvent(tick, channel, bend[channel]))
        elif kind == 0xB and value[0] in (100, 101):
            rpn[channel][101 - value[0]] = value[1]
        elif kind == 0xB and value[0] == 6 and rpn[channel] == [0, 0]:
            semitones[channel] = float(value[1])
        elif kind == 0xB and value[0] == 121:
            bend[channel] = 8192
        if kind in (0xE, 0xB):
            for (where, key), tone in live.items():
                if where == channel:
                    cents = 100 * key + (bend[channel] - 8192) / 8192 * semitones[channel] * 100
                    tone.line.append((tick, cents))
    assert not live, "a note hangs"
    return tones, bends


def seconds(smf: Smf, tick: int) -> float:
    """Seconds of a tick by the tempo events of the first track."""
    now, last, micros = 0.0, 0, 500_000
    for when, kind, value in smf.tracks[0].metas:
        if kind == 0x51 and when <= tick:
            now += (when - last) * micros / smf.division / 1e6
            last, micros = when, int.from_bytes(value, "big")
    return now + (tick - last) * micros / smf.division / 1e6
