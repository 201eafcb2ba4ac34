"""One stretch of tone: a pitch, a loudness and a succession of colours, sung by one or several.

Conventions
-----------
* All singers follow one curve of pitch; each has a steady ratio to it and a vibrato about it.
* A vibrato is a sine in Hz, so that its mean over whole swings is exactly the singer's pitch.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from retune.voice.curves import Block, Curve, blocks
from retune.voice.wavetable import Table

Floats = NDArray[np.float64]
Samples = NDArray[np.float32]


@dataclass(frozen=True, slots=True)
class Singer:
    """How one singer departs from the pitch of the tone.

    Parameters
    ----------
    ratio : float
        Steady ratio to the tone's frequency.
    start : float
        Phase at the start, in periods, 0 to 1.
    delay : int
        Samples that this singer's attack comes later.
    swing : float
        Peak deviation of the vibrato, as a share of the frequency; 0 for a straight tone.
    swings : float
        Vibrato in Hz.
    swing_start : float
        Its phase at sample 0, in periods.
    """

    ratio: float = 1.0
    start: float = 0.0
    delay: int = 0
    swing: float = 0.0
    swings: float = 5.1
    swing_start: float = 0.0

    def phase(self, block: Block, rate: int) -> Floats:
        """This singer's phase in a block, in periods."""
        if self.ratio == 1.0 and self.start == 0.0 and self.swing == 0.0:
            return block.phase
        phase = block.phase * self.ratio + self.start
        if self.swing:
            turn = 2.0 * math.pi
            angle = np.arange(block.start, block.stop) * (turn * self.swings / rate)
            angle += turn * self.swing_start
            phase -= np.cos(angle) * (block.hz * (self.swing / (turn * self.swings)))
        return phase


@dataclass(frozen=True, slots=True)
class Tone:
    """A stretch of tone.

    Parameters
    ----------
    start, stop : int
        Samples, `stop` excluded; the gain is 0 at both ends.
    pitch : Curve
        log2 of Hz.
    gain : Curve
        Linear.
    colour : Curve
        Which of the tables sounds, counted from 0; between two whole numbers both do.
    """

    start: int
    stop: int
    pitch: Curve
    gain: Curve
    colour: Curve


def add_tone(
    out: Samples,
    rate: int,
    tone: Tone,
    tables: Sequence[Sequence[Table]],
    singers: Sequence[Singer] = (Singer(),),
) -> None:
    """Add a tone to samples: one succession of tables for each singer."""
    gains = [_delayed(tone.gain, singer.delay) for singer in singers]
    stop = min(tone.stop, len(out))
    for block in blocks(tone.pitch, tone.start, stop, rate, (tone.colour, *gains)):
        colour = tone.colour.span(block.start, block.stop)
        for singer, own, gain in zip(singers, tables, gains, strict=True):
            level = gain.span(block.start, block.stop)
            if isinstance(level, float) and level == 0.0:
                continue
            wave = _coloured(own, colour, singer.phase(block, rate))
            wave *= np.float32(level) if isinstance(level, float) else level.astype(np.float32)
            out[block.start : block.stop] += wave


def _delayed(gain: Curve, delay: int) -> Curve:
    """The gain of a singer whose attack, the first two points, comes later."""
    if not delay:
        return gain
    return Curve([gain.at[0] + delay, *gain.at[1:]], gain.values)


def _coloured(tables: Sequence[Table], colour: float | Floats, phase: Floats) -> Samples:
    if isinstance(colour, float):
        return tables[round(colour)].read(phase)
    low = int(min(colour[0], colour[-1]))
    share = (colour - low).astype(np.float32)
    first = tables[low].read(phase)
    second = tables[low + 1].read(phase)
    second -= first
    second *= share
    second += first
    return second
