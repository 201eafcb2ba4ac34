"""Tuning messages byte by byte (MIDI Tuning Updated Specification, CA-020, CA-021, RP-020).

Conventions
-----------
* A pitch is a float key number on the grid of A4 = 440 Hz.
* Messages are without F0 and F7; the device is 7F, all.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

FRACTION = 16384
"""Parts of a semitone in a frequency word: 0.0061 cents."""

_HIGHEST = (0x7F << 14) | 0x3FFE
"""7F 7F 7F says "no change"; the word before it is the highest pitch."""

MOST_KEYS = 127


def frequency_word(pitch: float) -> bytes:
    """Three bytes: the key at or below, and 14 bits of the semitone above it.

    The whole number is rounded at once, so that a carry goes into the key.

    >>> frequency_word(69 - 0.1368629).hex(" "), frequency_word(68.99998).hex(" ")
    ('44 6e 3e', '45 00 00')
    """
    number = min(max(round(pitch * FRACTION), 0), _HIGHEST)
    return bytes((number >> 14, number >> 7 & 0x7F, number & 0x7F))


def word_pitch(word: bytes) -> float:
    """The pitch of a frequency word."""
    return word[0] + (word[1] << 7 | word[2]) / FRACTION


def single_notes(program: int, keys: Mapping[int, float]) -> bytes:
    """Single-note tuning change, real time (08 02): keys of a tuning program and their pitches."""
    changes = b"".join(bytes((key,)) + frequency_word(pitch) for key, pitch in keys.items())
    return bytes((0x7F, 0x7F, 0x08, 0x02, program, len(keys))) + changes


def octave(channel: int, cents: Sequence[float]) -> bytes:
    """Scale/octave tuning in its two-byte form, real time (08 09), for one channel: deviations
    of C to B from equal temperament, held within 100 cents."""
    mask = 1 << channel
    head = bytes((0x7F, 0x7F, 0x08, 0x09, mask >> 14, mask >> 7 & 0x7F, mask & 0x7F))
    body = bytearray()
    for value in cents:
        number = min(max(8192 + round(value * 8192 / 100), 0), 0x3FFF)
        body += bytes((number >> 7, number & 0x7F))
    return head + bytes(body)


def bulk(program: int, name: str, pitches: Sequence[float]) -> bytes:
    """Bulk dump of a tuning program (08 01): 128 keys. The checksum is over all bytes from 7E."""
    text = name.encode("ascii", "replace")[:16].ljust(16)
    body = bytes((0x7E, 0x7F, 0x08, 0x01, program)) + text
    body += b"".join(frequency_word(pitch) for pitch in pitches)
    check = 0
    for byte in body:
        check ^= byte
    return body + bytes((check & 0x7F,))
