"""Which partial of each singer is worth bringing out in a chord, and which is better left alone."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from retune.chordcard.found import FoundChord
from retune.harmony.model import Degree, Quality
from retune.units import ratio_to_cents
from retune.voice.beats import Pair
from retune.voice.brightvowels import VowelLevel, vowel_levels

BRIGHT, DARKER = 10, (8, 9)
"""Partials of a bass on the root of a minor chord: the first is a major third, the others are the
root and a ninth."""

_MAJOR_THIRD = Fraction(5, 4)
_MINOR = (Quality.MINOR, Quality.MINOR_SEVENTH, Quality.MINOR_MAJOR_SEVENTH)


@dataclass(frozen=True, slots=True)
class SharedByVoice:
    """The lowest partial above its fundamental that a tone shares with another one.

    `tone`, `other` are indices of tones; `vowels` stand with the strongest first.
    """

    tone: int
    partial: int
    other: int
    other_partial: int
    hz: float
    vowels: tuple[VowelLevel, ...]


@dataclass(frozen=True, slots=True)
class MinorThirdRub:
    """A bass on the root of a minor chord, whose tenth partial is a major third.

    `third` is the index of the tone that sings the minor third, `cents` how far the bass's
    partials lie above it, octaves aside, `hz` where its tenth lies.
    """

    bass: int
    third: int
    cents: float
    hz: float


def shared_by_voice(chord: FoundChord) -> tuple[SharedByVoice, ...]:
    """The partials that each sung tone may bring out for another to hear; in order of tones.

    Octaves and unisons are left out, as every partial of the upper tone is shared in them, and
    so is the fundamental, which no vowel is chosen for.
    """
    found = []
    for index, tone in enumerate(chord.tones):
        if tone.voice is None:
            continue
        for partial, other, other_partial in _meetings(chord.card.pairs, index)[: _MOST[index > 0]]:
            levels = vowel_levels(tone.hz, tone.voice, partial)
            hz = partial * tone.hz
            found.append(SharedByVoice(index, partial, other, other_partial, hz, levels))
    return tuple(found)


_MOST = (2, 1)
"""How many partials are named of the lowest tone, and of the others."""


def _meetings(pairs: Sequence[Pair], index: int) -> list[tuple[int, int, int]]:
    """The first partial that a tone shares with each of the others, as (own, other tone, its),
    the lowest first."""
    first: dict[int, tuple[int, int, int]] = {}
    for pair in pairs:
        size = pair.ratio.numerator
        octave = pair.ratio.denominator == 1 and size & (size - 1) == 0
        if octave or index not in (pair.low, pair.high):
            continue
        other = pair.high if index == pair.low else pair.low
        for shared in pair.shared:
            own, theirs = shared.low_partial, shared.high_partial
            if index == pair.high:
                own, theirs = theirs, own
            if own > 1:
                first.setdefault(other, (own, other, theirs))
    return sorted(first.values())


def minor_third_rub(chord: FoundChord) -> MinorThirdRub | None:
    """Where a bass on the root of a minor chord can sound the major third against the minor one.

    The fact is common practice, no source; the figure is 5/4 against the minor third that is
    sung: 70.7 cents for 6/5.
    """
    tones = chord.tones
    if chord.reading.quality not in _MINOR or chord.reading.degrees[0] is not Degree.ROOT:
        return None
    for index, (tone, degree) in enumerate(zip(tones, chord.reading.degrees, strict=True)):
        if degree is not Degree.THIRD or (tone.pitch.key - tones[0].pitch.key) % 12 != 3:
            continue
        above = 300.0 + tone.cents - tones[0].cents
        return MinorThirdRub(0, index, ratio_to_cents(_MAJOR_THIRD) - above, BRIGHT * tones[0].hz)
    return None
