"""Tuning messages byte by byte (MIDI Tuning Updated Specification, CA-020, CA-021, RP-020).

Conventions
-----------
* A pitch is a whole number of parts of a semitone above key 0, on the grid of A4 = 440 Hz.
* Messages are without F0 and F7; the device is 7F, all.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

FRACTION = 16384
"""Parts of a semitone in a frequency word: 0.0061 cents."""

HIGHEST = (0x7F << 14) | 0x3FFE
"""The highest pitch; 7F 7F 7F, the word after it, says "no change"."""

MOST_KEYS = 127

WORD_STEP = 100.0 / FRACTION
"""Cents between two frequency words."""

OCTAVE_MIDDLE = 8192
OCTAVE_STEP = 100.0 / OCTAVE_MIDDLE
"""Cents between two values of scale/octave tuning in its two-byte form."""


def word_value(cents: float) -> int:
    """Parts of a semitone nearest a distance in cents.

    >>> word_value(-13.68629), word_value(100.0)
    (-2242, 16384)
    """
    return math.floor(cents / WORD_STEP + 0.5)


def octave_value(cents: float) -> int:
    """Steps of scale/octave tuning nearest a distance in cents.

    >>> octave_value(-13.68629), octave_value(-100.0)
    (-1121, -8192)
    """
    return min(max(math.floor(cents / OCTAVE_STEP + 0.5), -OCTAVE_MIDDLE), OCTAVE_MIDDLE - 1)


def frequency_word(pitch: int) -> bytes:
    """Three bytes: the key at or below, and 14 bits of the semitone above it.

    >>> frequency_word(69 * FRACTION - 2242).hex(" "), frequency_word(128 * FRACTION).hex(" ")
    ('44 6e 3e', '7f 7f 7e')
    """
    number = min(max(pitch, 0), HIGHEST)
    return bytes((number >> 14, number >> 7 & 0x7F, number & 0x7F))


def single_notes(program: int, keys: Mapping[int, int]) -> bytes:
    """Single-note tuning change, real time (08 02): keys of a tuning program and their pitches."""
    changes = b"".join(bytes((key,)) + frequency_word(pitch) for key, pitch in keys.items())
    return bytes((0x7F, 0x7F, 0x08, 0x02, program, len(keys))) + changes


def octave(channel: int, steps: Sequence[int]) -> bytes:
    """Scale/octave tuning in its two-byte form, real time (08 09), for one channel: steps from
    equal temperament for C to B, -8192 to 8191."""
    mask = 1 << channel
    head = bytes((0x7F, 0x7F, 0x08, 0x09, mask >> 14, mask >> 7 & 0x7F, mask & 0x7F))
    numbers = (OCTAVE_MIDDLE + step for step in steps)
    return head + b"".join(bytes((number >> 7, number & 0x7F)) for number in numbers)


def bulk(program: int, name: str, pitches: Sequence[int]) -> bytes:
    """Bulk dump of a tuning program (08 01): 128 keys. The checksum is over all bytes from 7E:
    the specification contradicts itself, and receivers may ignore it."""
    text = name.encode("ascii", "replace")[:16].ljust(16)
    body = bytes((0x7E, 0x7F, 0x08, 0x01, program)) + text
    body += b"".join(frequency_word(pitch) for pitch in pitches)
    return body + bytes((checksum(body),))


def checksum(body: bytes) -> int:
    """XOR of all bytes, 7 bits."""
    found = 0
    for byte in body:
        found ^= byte
    return found & 0x7F
