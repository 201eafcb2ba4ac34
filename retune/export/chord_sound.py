"""One chord as a sound file: in equal temperament and as it is tuned, turn by turn, then gliding
slowly from one to the other and back, so that its beats slow down, stop and set in again.

Each tone is one straight voice of the built-in choir, so that what beats is the chord alone.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from retune.adapters.soundfiles import SoundFormat, Tags, encode
from retune.chordcard.found import FoundChord
from retune.chordcard.model import Tone
from retune.export.audio_level import levelled
from retune.export.audio_mix import RATE
from retune.export.base import LateFile
from retune.score.model import VoiceType
from retune.voice.choir import Colour, table_of, type_of
from retune.voice.curves import Curve
from retune.voice.tone import Tone as SungTone
from retune.voice.tone import add_tone

LUFS = -18.0
"""Loudness of the file, as of learning tracks."""

_VELOCITY = 80

# Seconds.
HOLD, SLIDE = 5.0, 5.0
_BEFORE, _BETWEEN, _AFTER = 0.2, 0.8, 0.3
_SWELL = 0.15


class Tuning(StrEnum):
    """What a stretch sounds in."""

    EQUAL = "equal"
    JUST = "just"


@dataclass(frozen=True, slots=True)
class Stretch:
    """One sound without a break: (second, tuning) points from its start to its end; where the
    tuning changes between two of them it glides."""

    points: tuple[tuple[float, Tuning], ...]

    @property
    def start(self) -> float:
        """Seconds."""
        return self.points[0][0]

    @property
    def stop(self) -> float:
        """Seconds."""
        return self.points[-1][0]


def programme() -> tuple[Stretch, ...]:
    """Equal and just, twice, and the slide."""
    found = []
    at = _BEFORE
    for tuning in (Tuning.EQUAL, Tuning.JUST) * 2:
        found.append(Stretch(((at, tuning), (at + HOLD, tuning))))
        at += HOLD + _BETWEEN
    points = [(at, Tuning.EQUAL)]
    for tuning in (Tuning.EQUAL, Tuning.JUST, Tuning.JUST, Tuning.EQUAL, Tuning.EQUAL):
        at += HOLD if tuning is points[-1][1] else SLIDE
        points.append((at, tuning))
    return (*found, Stretch(tuple(points)))


def programme_words() -> str:
    """What is heard when, as 'equal 0:00, just 0:06'."""
    words = []
    for stretch in programme():
        words.append(f"{stretch.points[0][1]} {_clock(stretch.start)}")
        for (at, before), (_, after) in pairwise(stretch.points):
            if before is not after:
                words.append(f"gliding to {after} {_clock(at)}")
    return ", ".join(words)


def _clock(seconds: float) -> str:
    minutes, rest = divmod(int(seconds), 60)
    return f"{minutes}:{rest:02d}"


def rendered(chord: FoundChord, vowel: str = "neutral") -> NDArray[np.float32]:
    """The sound, shape (frames, 2), both sides the same; at `LUFS`, true peak at most -1 dB."""
    stretches = programme()
    out = np.zeros(math.ceil((stretches[-1].stop + _AFTER) * RATE), np.float32)
    for tone in chord.tones:
        voice = tone.voice or type_of(tone.pitch.key)
        for stretch in stretches:
            _add(out, tone, voice, vowel, stretch)
    return levelled(np.stack([out, out], axis=1), RATE, LUFS)


def _add(
    out: NDArray[np.float32], tone: Tone, voice: VoiceType, vowel: str, stretch: Stretch
) -> None:
    pitch, gain = Curve(), Curve()
    for seconds, tuning in stretch.points:
        hz = tone.hz if tuning is Tuning.JUST else tone.equal_hz
        pitch.to(round(seconds * RATE), math.log2(hz))
    start, stop, swell = pitch.at[0], pitch.at[-1], round(_SWELL * RATE)
    for at, level in ((start, 0.0), (start + swell, 1.0), (stop - swell, 1.0), (stop, 0.0)):
        gain.to(at, level)
    table = table_of(Colour(voice, vowel, tone.equal_hz, _VELOCITY, (1.0,)))
    add_tone(out, RATE, SungTone(start, stop, pitch, gain, Curve([0], [0.0])), [[table]])


def chord_sound(chord: FoundChord, name: str, title: str, vowel: str = "neutral") -> LateFile:
    """The sound file; its format is that of the ending of `name`, mp3, wav, flac or ogg."""
    kind = SoundFormat(name.rpartition(".")[2].lower())
    tags = Tags(
        title=f"{title}: equal and just",
        album="Chords",
        comment=f"{programme_words()}. Start with the volume low.",
    )
    return LateFile(
        name, lambda: encode(rendered(chord, vowel), RATE, kind, tags), programme_words()
    )
