"""A receiver of tuning messages for the tests alone, sharing no code with the project.

Written from the MIDI Tuning Updated Specification (CA-020, CA-021; handbook, standards.md 4).
"""

from __future__ import annotations

from tests.export.smf import Smf, Tone


def receive_tuned(smf: Smf) -> list[Tone]:
    """All tones, tracks taken in file order at each tick; a bend is not expected."""
    merged = sorted(
        (tick, number, place, status, value)
        for number, track in enumerate(smf.tracks)
        for place, (tick, status, value) in enumerate(track.events)
    )
    tables = {program: [100.0 * key for key in range(128)] for program in range(128)}
    program = [0] * 16
    scale = [[0.0] * 12 for _ in range(16)]
    rpn = [[127, 127] for _ in range(16)]
    live: dict[tuple[int, int], Tone] = {}
    tones = []

    def cents(channel: int, key: int) -> float:
        if channel == 9:
            return 100.0 * key
        return tables[program[channel]][key] + scale[channel][key % 12]

    for tick, number, _, status, value in merged:
        kind, channel = status >> 4, status & 15
        moved = False
        if status == 0xF0:
            assert value[1:3] == b"\x7f\x08"
            moved = _obey(value, tables, scale)
        elif kind == 9 and value[1]:
            assert (channel, value[0]) not in live, "a sounding key is struck again"
            pitch = cents(channel, value[0])
            tone = Tone(number, channel, value[0], tick, value[1], [(tick, pitch)])
            live[channel, value[0]] = tone
            tones.append(tone)
        elif kind in (8, 9):
            live.pop((channel, value[0])).off = tick
        elif kind == 0xB and value[0] in (100, 101):
            rpn[channel][101 - value[0]] = value[1]
        elif kind == 0xB and value[0] == 6:
            assert rpn[channel] == [0, 3], "data entry for another parameter"
            program[channel] = value[1]
            moved = True
        else:
            assert kind in (0xB, 0xC)
        if moved:
            for (where, key), tone in live.items():
                if cents(where, key) != tone.line[-1][1]:
                    tone.line.append((tick, cents(where, key)))
    assert not live, "a note hangs"
    return tones


def _obey(value: bytes, tables: dict[int, list[float]], scale: list[list[float]]) -> bool:
    """Whether what sounds moves too: real time does, a dump does not."""
    if value[3] == 2:
        assert value[0] == 0x7F
        assert len(value) == 6 + 4 * value[5]
        for at in range(6, len(value), 4):
            tables[value[4]][value[at]] = _word(value[at + 1 : at + 4])
    elif value[3] == 9:
        assert value[0] == 0x7F
        assert len(value) == 31
        for channel in range(16):
            # hh holds channels 1 to 7, gg 8 to 14, ff 15 and 16.
            byte, bit = ((6, 0), (5, 7), (4, 14))[(channel >= 7) + (channel >= 14)]
            if value[byte] >> (channel - bit) & 1:
                scale[channel] = [
                    (128 * value[7 + 2 * n] + value[8 + 2 * n] - 8192) * 100 / 8192
                    for n in range(12)
                ]
    else:
        assert value[:2] == b"\x7e\x7f"
        assert value[3] == 1
        assert len(value) == 5 + 16 + 384 + 1
        tables[value[4]] = [_word(value[21 + 3 * key : 24 + 3 * key]) for key in range(128)]
    return value[0] == 0x7F


def _word(word: bytes) -> float:
    assert word != b"\x7f\x7f\x7f"
    return 100.0 * word[0] + (128 * word[1] + word[2]) * 100 / 16384
