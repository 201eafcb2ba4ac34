"""What else a chord could be: other just ratios for the same chord, other tones in the bass."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cache
from math import lcm

from retune.chordcard.found import FoundChord
from retune.chordcard.model import proportion
from retune.harmony.model import Degree, Quality
from retune.pitch import Pitch
from retune.tuning.ratios import SPELLED, Template, with_added
from retune.units import ratio_to_cents
from retune.voice.beats import SoundingTone, pairs
from retune.voice.roughness import roughness

_LIMITS = (5, 7)
_STILL_HZ = 0.25
"""Slower beats are not heard as such in a chord of some seconds."""

_TWO = 2

_MORE = {
    Quality.MINOR: ("7/6 3/2",),
    Quality.MINOR_SEVENTH: ("7/6 3/2 7/4",),
}
"""Septimal chords that no policy takes: 6:7:9 and 12:14:18:21 (methods.md B5)."""


@dataclass(frozen=True, slots=True)
class Sound:
    """What a chord sounds like in one tuning.

    `beating` are the rates in Hz at which pairs of its tones beat against the simple intervals
    that they are near, the slowest first.
    """

    roughness: float
    beating: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class Alternative:
    """Other ratios for the same chord.

    `numbers` is the chord in whole numbers, its tones as near above the root as they may lie, ()
    where it is tempered; `differs` holds the tones
    whose ratio is not that of the chord as it stands, with that ratio and its cents against the
    piano above the root; `chosen` marks the chord as it stands.
    """

    numbers: tuple[int, ...]
    differs: tuple[tuple[Degree, Fraction | None, float], ...]
    limit: int
    chosen: bool
    sound: Sound


@dataclass(frozen=True, slots=True)
class Inversion:
    """The same chord in the same register with a tone of it in the bass."""

    bass: Pitch
    pitches: tuple[Pitch, ...]
    numbers: tuple[int, ...]
    chosen: bool
    just: Sound
    equal: Sound


def sound_of(hz: list[float], limit: int = 7) -> Sound:
    """How rough frequencies are, and how fast they beat.

    >>> sound_of([100.0, 125.5]).beating
    (2.0,)
    """
    tones = [SoundingTone(one, one, None) for one in hz]
    beats = sorted(round(pair.beat_hz, 6) for pair in pairs(tones, limit))
    return Sound(roughness(hz), tuple(beat for beat in beats if beat >= _STILL_HZ))


def sound_here(chord: FoundChord) -> Sound:
    """A chord as it is tuned."""
    return sound_of([tone.hz for tone in chord.tones])


def sound_equal(chord: FoundChord) -> Sound:
    """The same chord in equal temperament."""
    return sound_of([tone.equal_hz for tone in chord.tones])


def alternatives(chord: FoundChord) -> tuple[Alternative, ...]:
    """The just ratios that a chord may have, the one that it has first.

    None for what is no known chord, and where there is no choice.
    """
    here = _ratios(chord)
    found: dict[tuple[Fraction | None, ...], Alternative] = {}
    for template in _templates(chord):
        other = chord.with_template(template)
        ratios = _ratios(other)
        if ratios in found:
            continue
        found[ratios] = Alternative(
            _close_numbers(other),
            tuple(_differing(chord, other)),
            template.limit,
            ratios == here,
            sound_here(other),
        )
    ordered = sorted(found.values(), key=lambda one: not one.chosen)
    return tuple(ordered) if len(ordered) > 1 else ()


def _templates(chord: FoundChord) -> Iterator[Template]:
    reading = chord.reading
    for limit in dict.fromkeys((chord.limit, *_LIMITS)):
        yield from reading.templates(limit)
    if reading.quality is not None:
        for text in _MORE.get(reading.quality, ()):
            yield with_added(_template(reading.quality, text), reading.added, 7)


@cache
def _template(quality: Quality, text: str) -> Template:
    spelled = SPELLED[quality]
    semitones = tuple(7 * place % 12 for place in spelled)
    ratios = (Fraction(1), *map(Fraction, text.split()))
    cents = (
        ratio_to_cents(ratio) - 100.0 * steps
        for ratio, steps in zip(ratios, semitones, strict=True)
    )
    return Template(spelled, semitones, ratios, tuple(cents))


def _ratios(chord: FoundChord) -> tuple[Fraction | None, ...]:
    return tuple(tone.ratio for tone in chord.tones)


def _numbers(chord: FoundChord) -> tuple[int, ...]:
    return proportion([tone.sounding for tone in chord.tones]) or ()


def _close_numbers(chord: FoundChord) -> tuple[int, ...]:
    """The tones of the chord above its root within an octave, in whole numbers."""
    ratios = {
        tone.ratio
        for tone, degree in zip(chord.tones, chord.reading.degrees, strict=True)
        if degree is not None
    }
    if None in ratios:
        return ()
    each = sorted(ratio for ratio in ratios if ratio is not None)
    common = lcm(*(ratio.denominator for ratio in each))
    return tuple(int(ratio * common) for ratio in each)


def _differing(
    chord: FoundChord, other: FoundChord
) -> Iterator[tuple[Degree, Fraction | None, float]]:
    told = set()
    for degree, tone, changed in zip(chord.reading.degrees, chord.tones, other.tones, strict=True):
        if degree is not None and degree not in told and tone.ratio != changed.ratio:
            told.add(degree)
            yield degree, changed.ratio, changed.cents - other.root_cents


def inversions(chord: FoundChord) -> tuple[Inversion, ...]:
    """The chord with each of its tones in the bass, as it stands first.

    The tone that goes to the bass and the one that was there change places, each in the octave
    nearest to where the other was; all others stay. None for what is no known chord.
    """
    found = []
    if chord.reading.quality is None and len({pitch.key % 12 for pitch in chord.pitches}) > _TWO:
        return ()
    seen: set[int] = set()
    for index, tone in enumerate(chord.tones):
        if tone.pitch.key % 12 in seen or tone.role:
            continue
        seen.add(tone.pitch.key % 12)
        moved = chord if index == 0 else chord.moved(_exchanged(chord.pitches, index))
        found.append(
            Inversion(
                moved.tones[0].pitch,
                moved.pitches,
                _numbers(moved),
                index == 0,
                sound_here(moved),
                sound_equal(moved),
            )
        )
    return tuple(found) if len(found) > 1 else ()


def _exchanged(pitches: tuple[Pitch, ...], index: int) -> tuple[Pitch, ...]:
    bass, other = pitches[0], pitches[index]
    low, high = _near(other, bass.key), _near(bass, other.key)
    kept = {pitch.key for place, pitch in enumerate(pitches) if place not in (0, index)}
    if high.key in kept:
        high = replace(high, octave=high.octave + (1 if high.key < other.key else -1))
    changed = list(pitches)
    changed[0], changed[index] = high, low
    # Whatever the new bass tone is not below goes up by octaves.
    return tuple(
        pitch if place == index else _above(pitch, low.key) for place, pitch in enumerate(changed)
    )


def _near(pitch: Pitch, key: int) -> Pitch:
    """A pitch in the octave that brings it nearest to a key, the lower one of two as near."""
    octaves = -((pitch.key - key + 6) // 12)
    return replace(pitch, octave=pitch.octave + octaves)


def _above(pitch: Pitch, key: int) -> Pitch:
    while pitch.key <= key:
        pitch = replace(pitch, octave=pitch.octave + 1)
    return pitch
