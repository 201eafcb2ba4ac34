"""A chord with all that one knows of it: from pitches alone, or at a place of a tuned score."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property

from retune.chordcard.model import ChordCard, Tone, chord_card
from retune.chordcard.reading import Reading, off_equal, readings
from retune.pitch import Pitch, PitchClass
from retune.score.model import VoiceType
from retune.tuning.ratios import Template, scale_cents
from retune.units import STANDARD_REFERENCE_HZ
from retune.voice.choir import type_of

_FOUR = (VoiceType.BASS, VoiceType.TENOR, VoiceType.ALTO, VoiceType.SOPRANO)
"""Who sings four tones, the lowest first (common practice, no source)."""


@dataclass(frozen=True)
class FoundChord:
    """A chord of which a card can be made, or one like it.

    Parameters
    ----------
    tones : tuple of Tone
        The lowest first.
    reading : Reading
        Its root and quality; degrees are in the order of the tones.
    rivals : tuple of Reading
        What else it may be, the likeliest first.
    root_cents : float
        Where the root stands.
    limit : int
        Prime limit.
    place : str
        Where in a score it stands, in words; "" for pitches alone.
    """

    tones: tuple[Tone, ...]
    reading: Reading
    rivals: tuple[Reading, ...]
    root_cents: float
    limit: int
    place: str = ""

    @cached_property
    def card(self) -> ChordCard:
        """The card of the chord."""
        return chord_card(self.tones, self.limit)

    @property
    def pitches(self) -> tuple[Pitch, ...]:
        """The pitches, the lowest first."""
        return tuple(tone.pitch for tone in self.tones)

    def with_template(self, template: Template) -> FoundChord:
        """The same chord with the ratios of another template, its root where it is."""
        ratios = self.reading.ratios(self.pitches, self.limit, template)
        return replace(self, tones=_at_ratios(self.tones, self.reading, ratios, self.root_cents))

    def moved(self, pitches: Sequence[Pitch]) -> FoundChord:
        """The same tones in other octaves: a pitch for each, in the order of the tones.

        Each keeps its cents; the voices sing what lies where they did, the lowest the lowest.
        """
        order = sorted(range(len(pitches)), key=lambda index: pitches[index].key)
        tones = tuple(
            replace(self.tones[index], pitch=pitches[index], name=above.name, voice=above.voice)
            for index, above in zip(order, self.tones, strict=True)
        )
        degrees = tuple(self.reading.degrees[index] for index in order)
        return replace(self, tones=tones, reading=replace(self.reading, degrees=degrees))


def _at_ratios(
    tones: Sequence[Tone], reading: Reading, ratios: Sequence[Fraction | None], root_cents: float
) -> tuple[Tone, ...]:
    """Tones at ratios above a root; tempered ones are where a piano has them above it."""
    return tuple(
        replace(
            tone,
            ratio=ratio,
            cents=root_cents
            + (0.0 if ratio is None else off_equal(ratio, reading.root, tone.pitch)),
        )
        for tone, ratio in zip(tones, ratios, strict=True)
    )


def chord_of(
    pitches: Sequence[Pitch],
    limit: int = 5,
    reference_hz: float = STANDARD_REFERENCE_HZ,
    root: PitchClass | None = None,
    tonic: PitchClass | None = None,
    voices: Sequence[VoiceType] = (),
) -> FoundChord:
    """The chord that pitches make.

    Parameters
    ----------
    pitches : sequence of Pitch, not empty
        In any order.
    limit : int
        Prime limit, 3, 5 or 7.
    reference_hz : float
    root : PitchClass, optional
        What it is to be heard on; found unless given.
    tonic : PitchClass, optional
        The root takes its place in the just scale on this tonic; without it the root is where a
        piano has it.
    voices : sequence of VoiceType, optional
        Who sings each tone, the lowest first; by their height unless given.

    >>> from retune.pitch import Pitch
    >>> chord = chord_of([Pitch.parse(name) for name in ("A4", "D3", "D5", "F#4")])
    >>> chord.reading.symbol, [tone.name for tone in chord.tones]
    ('D', ['Bass', 'Tenor', 'Alto', 'Soprano'])
    >>> [round(tone.cents, 3) for tone in chord.tones]
    [0.0, -13.686, 1.955, 0.0]
    """
    ordered = sorted(pitches, key=lambda pitch: pitch.key)
    reading, *rivals = readings(ordered, root)
    kinds = tuple(voices) or voices_of(ordered)
    strangers = [
        "not of the chord" if degree is None and reading.quality is not None else ""
        for degree in reading.degrees
    ]
    tones = [
        Tone(pitch, 0.0, None, reference_hz, name, voice, role)
        for pitch, name, voice, role in zip(ordered, names_of(kinds), kinds, strangers, strict=True)
    ]
    place = 0.0 if tonic is None else scale_cents(reading.root.fifths - tonic.fifths, limit)
    tuned = _at_ratios(tones, reading, reading.ratios(ordered, limit), place)
    return FoundChord(tuned, reading, tuple(rivals), place, limit)


def voices_of(pitches: Sequence[Pitch]) -> tuple[VoiceType, ...]:
    """Who sings some pitches, the lowest first: the four voices where there are four, else by
    their height."""
    if len(pitches) == len(_FOUR):
        return _FOUR
    return tuple(type_of(pitch.key) for pitch in pitches)


def names_of(voices: Sequence[VoiceType]) -> tuple[str, ...]:
    """Names of voices, the lowest first; those of one kind are numbered from the highest down.

    >>> names_of([VoiceType.BASS, VoiceType.TENOR, VoiceType.TENOR])
    ('Bass', 'Tenor 2', 'Tenor 1')
    """
    left = {voice: list(voices).count(voice) for voice in voices}
    many = {voice for voice, count in left.items() if count > 1}
    names = []
    for voice in voices:
        name = voice.value.capitalize()
        names.append(f"{name} {left[voice]}" if voice in many else name)
        left[voice] -= 1
    return tuple(names)
