"""Clicks: short sounds for keys of the General MIDI percussion map.

Each is a handful of decaying modes with a soft edge. The modes are our own choice: a high and a
low block, sticks, and a metronome's click and bell, told apart by height and length.
"""

from __future__ import annotations

from functools import cache
from typing import NamedTuple

import numpy as np

from retune.voice.loudness import gain_db
from retune.voice.tone import Samples

PEAK = 0.22
"""Peak of a click at mezzo forte."""

EDGE = 0.002
"""Seconds in which a click begins."""

_SILENT = 7.0
"""A mode ends after this many of its time constants."""


class Mode(NamedTuple):
    """A decaying sine: Hz, the time constant in seconds, relative amplitude."""

    hz: float
    decay: float
    amplitude: float


_LOW_BLOCK = (Mode(620.0, 0.022, 1.0), Mode(1_480.0, 0.010, 0.45), Mode(2_650.0, 0.005, 0.2))

MODES: dict[int, tuple[Mode, ...]] = {
    31: (Mode(1_850.0, 0.007, 1.0), Mode(3_100.0, 0.005, 0.8), Mode(4_700.0, 0.003, 0.6)),
    33: (Mode(2_300.0, 0.006, 1.0), Mode(3_900.0, 0.003, 0.5)),
    34: (Mode(1_568.0, 0.110, 1.0), Mode(3_210.0, 0.060, 0.5), Mode(4_430.0, 0.030, 0.25)),
    76: (Mode(990.0, 0.020, 1.0), Mode(2_350.0, 0.009, 0.45), Mode(4_050.0, 0.004, 0.2)),
    77: _LOW_BLOCK,
}
"""Sticks, metronome click, metronome bell, high and low wood block, by key."""


@cache
def click(key: int, rate: int) -> Samples:
    """One click, peak 1; the low block for keys that have no sound of their own."""
    modes = MODES.get(key, _LOW_BLOCK)
    count = round(_SILENT * max(mode.decay for mode in modes) * rate)
    seconds = np.arange(count) / rate
    wave = np.zeros(count)
    for mode in modes:
        fall = mode.amplitude * np.exp(-seconds / mode.decay)
        wave += fall * np.sin(2.0 * np.pi * mode.hz * seconds)
    edge = round(EDGE * rate)
    rise = 0.5 - 0.5 * np.cos(np.pi * np.arange(edge) / edge)
    wave[:edge] *= rise
    wave[-edge:] *= rise[::-1]
    return np.asarray(wave / np.abs(wave).max(), dtype=np.float32)


def add_click(out: Samples, start: int, key: int, velocity: int, rate: int) -> None:
    """Add a click to samples; what lies beyond their end is left out."""
    wave = click(key, rate)[: max(len(out) - start, 0)]
    out[start : start + len(wave)] += wave * np.float32(PEAK * 10.0 ** (gain_db(velocity) / 20.0))
