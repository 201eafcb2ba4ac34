"""Plain tones for accompaniment and guide parts: a sustained one and a struck one.

Both are strictly harmonic, so that their pitch is exact. The colours are our own choice: the
sustained tone's partials fall by 6 dB an octave and, from 1.5 kHz on, by 12 more; the struck
tone's are those of an ideal string struck near a seventh of its length (N. H. Fletcher and
T. D. Rossing, *The Physics of Musical Instruments*, from memory), the upper ones dying away
faster.
"""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from retune.voice.curves import Curve, blocks
from retune.voice.loudness import gain_db, levelled
from retune.voice.phrasing import Sung, glide
from retune.voice.spectrum import HIGHEST_HZ
from retune.voice.tone import Samples, Tone, add_tone
from retune.voice.wavetable import Table

Floats = NDArray[np.float64]

SUSTAINED_LEVEL, STRUCK_LEVEL = -24.0, -21.0
"""Loudness of a tone at mezzo forte in LUFS; of a struck one at its start."""

# Seconds.
ATTACK, RELEASE = 0.04, 0.09
STRIKE, DAMPING = 0.004, 0.12

_CORNER_HZ, _HAMMER_HZ = 1_500.0, 2_500.0
_STRUCK_AT = 1.0 / 7.3
_BRIGHT = 6.0
"""From about this partial on, most of a struck tone is of the part that dies away fast."""

_SLOW, _FASTER = 1.4, 5.0
"""Seconds in which C3 falls by 8.7 dB, and how much faster the bright part does."""


def sustain(out: Samples, sung: Sung, rate: int, gain: float) -> None:
    """Add a sustained tone to samples; `gain` is linear."""
    attack = min(round(ATTACK * rate), sung.length // 2)
    loud = Curve()
    level = gain * 10.0 ** (gain_db(sung.velocity) / 20.0)
    loud.to(sung.start, 0.0)
    loud.to(sung.start + attack, level)
    loud.to(sung.stop, level)
    loud.to(sung.stop + round(RELEASE * rate), 0.0)
    tone = Tone(sung.start, loud.at[-1], _pitch(sung, rate), loud, Curve([0], [0.0]))
    add_tone(out, rate, tone, [[_sustained(2.0 ** sung.path[0][1])]])


def strike(out: Samples, sung: Sung, rate: int, gain: float) -> None:
    """Add a struck tone to samples; `gain` is linear."""
    hz = 2.0 ** sung.path[0][1]
    dark, bright = _struck(hz)
    slow = min(max(_SLOW * math.sqrt(131.0 / hz), 0.3), 2.5)
    level = gain * 10.0 ** (gain_db(sung.velocity) / 20.0)
    shape = Curve()
    shape.to(sung.start, 0.0)
    shape.to(sung.start + min(round(STRIKE * rate), sung.length // 2), level)
    shape.to(sung.stop, level)
    shape.to(sung.stop + round(DAMPING * rate), 0.0)
    stop = min(shape.at[-1], len(out))
    for block in blocks(_pitch(sung, rate), sung.start, stop, rate, (shape,)):
        seconds = np.arange(block.start - sung.start, block.stop - sung.start, dtype=np.float32)
        seconds /= np.float32(-rate * slow)
        fall = np.exp(seconds)
        wave = dark.read(block.phase)
        if block.start - sung.start < 2.0 * slow * rate:
            wave += bright.read(block.phase) * np.exp(seconds * np.float32(_FASTER - 1.0))
        wave *= fall
        height = shape.span(block.start, block.stop)
        wave *= np.float32(height) if isinstance(height, float) else height.astype(np.float32)
        out[block.start : block.stop] += wave


def _pitch(sung: Sung, rate: int) -> Curve:
    """The heights of a note; where a held note moves, it glides."""
    pitch = Curve([sung.start], [sung.path[0][1]])
    glide(pitch, sung, rate)
    return pitch


def _partials(hz: float) -> Floats:
    return np.arange(1, max(int(HIGHEST_HZ / hz), 1) + 1, dtype=np.float64)


@lru_cache(maxsize=96)
def _sustained(hz: float) -> Table:
    number = _partials(hz)
    amplitudes = 1.0 / number / (1.0 + (number * hz / _CORNER_HZ) ** 2)
    return Table.of(levelled(amplitudes, hz, SUSTAINED_LEVEL))


@lru_cache(maxsize=96)
def _struck(hz: float) -> tuple[Table, Table]:
    """The part that lasts and the part that dies away fast."""
    number = _partials(hz)
    amplitudes = np.abs(np.sin(np.pi * number * _STRUCK_AT)) / number
    amplitudes /= 1.0 + (number * hz / _HAMMER_HZ) ** 2
    amplitudes = levelled(amplitudes, hz, STRUCK_LEVEL)
    lasting = 1.0 / (1.0 + (number / _BRIGHT) ** 2)
    return Table.of(amplitudes * lasting), Table.of(amplitudes * (1.0 - lasting))
