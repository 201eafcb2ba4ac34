"""The choir voice: phrases sung by a section of singers.

A section that sings without scatter and vibrato is in step throughout, so that the mean of its
singers' spectra is one tone; else each singer is a tone with a vocal tract, a pitch, a vibrato
and an attack of their own.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from retune.score.model import PartKind, VoiceType
from retune.tuning.model import TunedScore
from retune.voice.curves import Curve
from retune.voice.formants import formants
from retune.voice.loudness import gain_db, levelled, pulse_shape
from retune.voice.options import SoundOptions
from retune.voice.phrasing import Placed, Sung, glide, median_key, phrases
from retune.voice.spectrum import spectrum
from retune.voice.tone import Samples, Singer, Tone, add_tone
from retune.voice.wavetable import Table

LEVEL = -24.0
"""Loudness of a section at mezzo forte, in LUFS."""

# Seconds. Our choices, but for the slide, which is as fast as singers are: about 60 ms.
ATTACK = 0.07
RELEASE_BEFORE, RELEASE_AFTER = 0.03, 0.06
SLIDE_BEFORE, SLIDE_AFTER = 0.025, 0.03
BLEND_BEFORE, BLEND_AFTER = 0.03, 0.05
DIP = 0.03
MOST_DELAY = 0.03

SYLLABLE_DIP = 10.0 ** (-4.0 / 20.0)
REPEAT_DIP = 10.0 ** (-13.0 / 20.0)

TRACTS = 0.025
"""How far the shortest and the longest vocal tract of a section differ from the mean."""

VIBRATO_HZ = 5.1
"""In choirs 5.13 Hz, SD 0.26 (Cuesta, Gomez, Martorell and Loaiciga, ICMPC 15, 2018)."""
VIBRATO_SPREAD = 0.1

_TYPES = ((67.0, VoiceType.SOPRANO), (61.0, VoiceType.ALTO), (54.5, VoiceType.TENOR))
"""From which median key on a part without a voice type is sung by whom (common practice, no
source: midway between the middles of the usual ranges)."""


@dataclass(frozen=True, slots=True)
class Colour:
    """What one table holds: a vowel at a pitch, sung by tracts of these sizes in step.

    `others` singers sing beside it, each for themselves; `swing` is their vibrato's share of the
    frequency, 0 where their pitches differ anyway.
    """

    voice_type: VoiceType
    vowel: str
    hz: float
    velocity: int
    tracts: tuple[float, ...]
    others: int = 0
    swing: float = 0.0


@lru_cache(maxsize=96)
def table_of(colour: Colour) -> Table:
    """The table of a colour, at `LEVEL` together with the other singers."""
    vowel = formants(colour.voice_type, colour.vowel)
    rd = pulse_shape(colour.velocity)
    spectra = [spectrum(colour.hz, vowel.scaled(tract), rd) for tract in colour.tracts]
    amplitudes = levelled(np.mean(spectra, axis=0), colour.hz, LEVEL)
    if colour.others:
        # N equal tones in step are N times as strong, out of step sqrt(N). Vibratos of their own
        # take partial n out of step by the index of its modulation: J0(index)^2, here as its
        # Gaussian approximation.
        count = colour.others + 1
        together = 0.0
        if colour.swing:
            index = np.arange(1, len(amplitudes) + 1) * colour.hz * colour.swing / VIBRATO_HZ
            together = np.exp(-0.5 * index**2)
        amplitudes = amplitudes / np.sqrt(count + count * (count - 1) * together)
    return Table.of(amplitudes)


def sing(
    out: Samples, tuned: TunedScore, part: int, notes: Sequence[Placed], options: SoundOptions,
    rate: int,
) -> None:  # fmt: skip
    """Add a part, sung by a section, to samples."""
    voice_type = tuned.score.parts[part].voice_type or type_of(median_key(notes))
    vowels = _vowels(tuned, part, notes, options)
    singers = section(options, part, rate)
    tracts = _tracts(options.singers)
    for phrase in phrases(tuned, notes, rate):
        tone = _tone(phrase, rate)
        colours = [
            [
                Colour(
                    voice_type,
                    vowels.get(sung.place, options.vowel),
                    2.0 ** sung.path[0][1],
                    sung.velocity,
                    tracts if len(singers) == 1 else (tract,),
                    len(singers) - 1,
                    singer.swing if singer.ratio == 1.0 else 0.0,
                )
                for sung in phrase
            ]
            for singer, tract in zip(singers, tracts, strict=False)
        ]
        add_tone(out, rate, tone, [_Tables(own) for own in colours], singers)


class _Tables(Sequence[Table]):
    """Tables made when they are read, so that a long phrase does not hold all of its own."""

    def __init__(self, colours: Sequence[Colour]) -> None:
        self._colours = colours

    def __len__(self) -> int:
        return len(self._colours)

    def __getitem__(self, place: int) -> Table:  # type: ignore[override]  # no slices here
        return table_of(self._colours[place])


def section(options: SoundOptions, part: int, rate: int) -> list[Singer]:
    """The singers of a part; one for all of them where they sing in step.

    Drawn with a fixed seed for each part. The mean of their frequencies is exactly the tone's.
    """
    count = options.singers
    if count == 1 or not (options.scatter_cents or options.vibrato_cents):
        swing = _swing(options.vibrato_cents)
        return [Singer(swing=swing, swings=VIBRATO_HZ)]
    draw = np.random.default_rng([part, count])
    cents = draw.standard_normal(count)
    cents *= options.scatter_cents / cents.std()
    ratios = 2.0 ** (cents / 1200.0)
    ratios /= ratios.mean()
    starts = draw.uniform(0.0, 1.0, count) if options.scatter_cents else np.zeros(count)
    rates = VIBRATO_HZ * (1.0 + VIBRATO_SPREAD * draw.uniform(-1.0, 1.0, count))
    swing_starts = (np.arange(count) + draw.uniform(0.0, 1.0, count)) / count
    delays = draw.uniform(0.0, MOST_DELAY * rate, count)
    return [
        Singer(
            float(ratios[one]) if options.scatter_cents else 1.0,
            float(starts[one]),
            round(float(delays[one])),
            _swing(options.vibrato_cents),
            float(rates[one]),
            float(swing_starts[one]),
        )
        for one in range(count)
    ]


def _swing(cents: float) -> float:
    return float(2.0 ** (cents / 1200.0) - 1.0)


def _tracts(count: int) -> tuple[float, ...]:
    """Sizes of the singers' vocal tracts, 1 in the mean."""
    if count == 1:
        return (1.0,)
    return tuple(float(size) for size in np.linspace(1.0 - TRACTS, 1.0 + TRACTS, count))


def type_of(key: float) -> VoiceType:
    """The kind of voice that a line around a key is most likely for."""
    return next((kind for lowest, kind in _TYPES if key >= lowest), VoiceType.BASS)


def _vowels(
    tuned: TunedScore, part: int, notes: Sequence[Placed], options: SoundOptions
) -> dict[int, str]:
    """The vowel of each note by its place, where the vowels follow the text."""
    sung = tuned.score.parts[part].kind is PartKind.VOICE
    if not (options.language and sung and any(one.note.lyric for _, one in notes)):
        return {}
    from retune.voice.language import vowels

    found = vowels([one.note.lyric for _, one in notes], options.language)
    return {place: vowel for (place, _), vowel in zip(notes, found, strict=True)}


def _tone(phrase: Sequence[Sung], rate: int) -> Tone:
    """A phrase as curves of pitch, loudness and colour."""
    first, last = phrase[0], phrase[-1]
    pitch, gain, colour = Curve(), Curve(), Curve()
    attack = min(round(ATTACK * rate), first.length // 2)
    gain.to(first.start, 0.0)
    gain.to(first.start + attack, _gain(first))
    pitch.to(first.start, first.path[0][1])
    colour.to(first.start, 0.0)
    previous: Sung | None = None
    for place, sung in enumerate(phrase):
        if previous is not None:
            _join(pitch, gain, previous, sung, rate)
            before, after = _window(previous, sung, BLEND_BEFORE, BLEND_AFTER, rate)
            colour.to(sung.start - before, place - 1.0)
            colour.to(sung.start + after, float(place))
        glide(pitch, sung, rate)
        previous = sung
    before = min(round(RELEASE_BEFORE * rate), last.length // 4)
    stop = last.stop + round(RELEASE_AFTER * rate)
    gain.to(last.stop - before, _gain(last))
    gain.to(stop, 0.0)
    return Tone(first.start, stop, pitch, gain, colour)


def _gain(sung: Sung) -> float:
    return float(10.0 ** (gain_db(sung.velocity) / 20.0))


def _window(previous: Sung, sung: Sung, before: float, after: float, rate: int) -> tuple[int, int]:
    """Samples before and after a note's start; a change takes at most 2/5 of either note."""
    return (
        min(round(before * rate), previous.last_length * 2 // 5),
        min(round(after * rate), sung.first_length * 2 // 5),
    )


def _join(pitch: Curve, gain: Curve, previous: Sung, sung: Sung, rate: int) -> None:
    """From one note to the next: the slide, and what sets the syllable or the note off."""
    here, there = previous.path[-1][1], sung.path[0][1]
    if here != there:
        before, after = _window(previous, sung, SLIDE_BEFORE, SLIDE_AFTER, rate)
        pitch.to(sung.start - before, here)
        pitch.to(sung.start + after, there)
    depth = REPEAT_DIP if previous.key == sung.key else SYLLABLE_DIP if sung.syllable else 1.0
    if depth < 1.0 or previous.velocity != sung.velocity:
        before, after = _window(previous, sung, DIP, DIP, rate)
        gain.to(sung.start - before, _gain(previous))
        if depth < 1.0:
            gain.to(sung.start, depth * min(_gain(previous), _gain(sung)))
        gain.to(sung.start + after, _gain(sung))
