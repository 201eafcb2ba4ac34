"""The card of a chord: its tones, how pairs of them beat, what they share, a vowel hint.

Conventions
-----------
* Tones stand in the order they were given in; indices are into them.
* `cents` are against equal temperament at the reference pitch, + is sharp.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from retune.pitch import Pitch
from retune.score.model import VoiceType
from retune.units import hz_of
from retune.voice.beats import Pair, SoundingTone, pairs
from retune.voice.partials import ChordPartial, chord_partial
from retune.voice.vowelhint import Hint, hint

_LEAST_TONES = 3
"""Two tones share what their pair shares."""


@dataclass(frozen=True, slots=True)
class Tone:
    """One tone of a chord: who sings it, where, and the ratio that is meant above the root.

    `ratio` is octave-reduced; None for tempered and lone tones, and for an accompaniment.
    `role` is "" for a tone of the chord, else what it is instead.
    """

    pitch: Pitch
    cents: float
    ratio: Fraction | None
    reference_hz: float
    name: str = ""
    voice: VoiceType | None = None
    role: str = ""

    @property
    def hz(self) -> float:
        """Frequency as tuned."""
        return hz_of(self.pitch.key, self.cents, self.reference_hz)

    @property
    def equal_hz(self) -> float:
        """Frequency in equal temperament."""
        return hz_of(self.pitch.key, 0.0, self.reference_hz)

    @property
    def sounding(self) -> SoundingTone:
        """The tone as beats are counted from."""
        return SoundingTone(self.hz, self.equal_hz, self.ratio)


@dataclass(frozen=True, slots=True)
class ChordCard:
    """All that is said of a chord wherever it stands.

    Parameters
    ----------
    tones : tuple of Tone
    pairs : tuple of Pair
        Simplest intervals first.
    whole : ChordPartial or None
        The lowest partial that all tones share; None for fewer than three, and where a tone has
        no ratio or the partial lies too high.
    hint : Hint or None
    """

    tones: tuple[Tone, ...]
    pairs: tuple[Pair, ...]
    whole: ChordPartial | None
    hint: Hint | None


def chord_card(tones: Sequence[Tone], limit: int) -> ChordCard:
    """The card of some tones; `limit` bounds the primes of intervals that are not meant exactly."""
    sounding = [tone.sounding for tone in tones]
    found = pairs(sounding, limit)
    advice = hint(
        [tone.hz for tone in sounding],
        [tone.voice for tone in tones],
        found,
        names=[tone.name for tone in tones],
    )
    return ChordCard(tuple(tones), found, whole_partial(sounding), advice)


def whole_partial(tones: Sequence[SoundingTone]) -> ChordPartial | None:
    """The lowest partial that all tones of a chord share, with its number in each of them."""
    ratios = above_lowest(tones)
    if len(tones) < _LEAST_TONES or ratios is None:
        return None
    return chord_partial(ratios, min(tone.hz for tone in tones))


def above_lowest(tones: Sequence[SoundingTone]) -> tuple[Fraction, ...] | None:
    """The ratio of each tone above the lowest one, octaves kept; None where one has no ratio."""
    lowest = min(tones, key=lambda tone: tone.hz)
    found = []
    for tone in tones:
        if tone.ratio is None or lowest.ratio is None:
            return None
        octaves = round(math.log2(tone.hz / lowest.hz / float(tone.ratio / lowest.ratio)))
        found.append(tone.ratio / lowest.ratio * Fraction(2) ** octaves)
    return tuple(found)


def proportion(tones: Sequence[SoundingTone]) -> tuple[int, ...] | None:
    """A chord in whole numbers, as 4:5:6; None where a tone has no ratio."""
    ratios = above_lowest(tones)
    if ratios is None:
        return None
    common = math.lcm(*(ratio.denominator for ratio in ratios))
    return tuple(int(ratio * common) for ratio in ratios)
