"""One part of a tuned score as sound.

Conventions
-----------
* Samples are mono float32, 0 dB full scale is 1; a part stays below `PEAK`.
* Levels are balanced so that all parts at 0 dB make a sensible mix: at mezzo forte a section is at
  -24 LUFS, one note of an accompaniment at -30, or at -27 where it is struck and dies away.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from retune.score.model import Part, PartKind
from retune.tuning.model import TunedScore
from retune.voice.choir import sing
from retune.voice.clicks import add_click
from retune.voice.options import SoundOptions
from retune.voice.phrasing import notes_of, sounding
from retune.voice.tones import strike, sustain

TAIL_SECONDS = 1.0
"""Seconds after the end of the score, for the last release."""

PEAK = 0.5
"""No sample of one part is greater; a part that would be is turned down as a whole."""

ACCOMPANIMENT_DB = -6.0
"""Each note of an accompaniment against a section of singers."""
GUIDE_DB = -2.0

# General MIDI programs, from 0.
_CHOIRS = range(52, 55)
_SUSTAINED = (*range(16, 24), *range(40, 45), *range(48, 80), *range(80, 96))
"""Organs; strings and winds, without plucked strings, harp and drums; synthetic sounds."""


def stem(
    tuned: TunedScore, part: int, options: SoundOptions, rate: int = 44_100
) -> NDArray[np.float32]:
    """One part alone, with the sound that suits it.

    Parameters
    ----------
    tuned : TunedScore
    part : int
        Index into the score's parts.
    options : SoundOptions
    rate : int
        Samples a second.

    Returns
    -------
    array of float32, shape (n,)
        From the start of the score to its end and `TAIL_SECONDS` more; n is the same for all
        parts of a score.
    """
    out = np.zeros(
        math.ceil((tuned.seconds(tuned.score.end) + TAIL_SECONDS) * rate), dtype=np.float32
    )
    notes = notes_of(tuned, part)
    this = tuned.score.parts[part]
    if this.kind is PartKind.CLICK:
        for _, one in notes:
            start = round(tuned.seconds(one.note.onset) * rate)
            add_click(out, start, one.note.pitch.key, one.note.velocity, rate)
    elif _is_sung(this):
        sing(out, tuned, part, notes, options, rate)
    else:
        play = sustain if this.program in _SUSTAINED else strike
        level = GUIDE_DB if this.kind is PartKind.GUIDE else ACCOMPANIMENT_DB
        for place, one in notes:
            sung = sounding(tuned, place, one, rate)
            if sung is not None:
                play(out, sung, rate, 10.0 ** (level / 20.0))
    _hold_down(out)
    return out


def _is_sung(part: Part) -> bool:
    if part.kind is PartKind.VOICE:
        return True
    return part.kind is PartKind.GUIDE and part.program in _CHOIRS


def _hold_down(out: NDArray[np.float32]) -> None:
    if len(out):
        peak = max(float(out.max()), -float(out.min()))
        if peak > PEAK:
            out *= np.float32(PEAK / peak)
