"""One chord as a picture: the partials of every voice in equal temperament and as tuned."""

from __future__ import annotations

import math
from collections.abc import Iterator

from retune.adapters.plotting import Panel, PictureFormat, SpectrumPlot, Stem, Zoom, draw
from retune.chordcard.found import FoundChord
from retune.chordcard.model import Tone
from retune.export.base import LateFile
from retune.harmony.symbols import printed
from retune.units import hz_of
from retune.voice.beats import Pair
from retune.voice.choir import type_of
from retune.voice.formants import formants
from retune.voice.partials import HIGHEST_HZ, HIGHEST_PARTIAL
from retune.voice.spectrum import spectrum

_FLOOR_DB = -60.0
_RD = 1.1
_ZOOMS, _ZOOM_CENTS = 4, 40.0
_OCTAVE = 12


def chord_picture(chord: FoundChord, name: str, title: str, vowel: str = "neutral") -> LateFile:
    """The picture file; its format is that of the ending of `name`, svg, png or pdf."""
    kind = PictureFormat(name.rpartition(".")[2].lower())
    return LateFile(name, lambda: draw(spectrum_plot(chord, title, vowel), kind))


def spectrum_plot(chord: FoundChord, title: str, vowel: str = "neutral") -> SpectrumPlot:
    """What is drawn, as plain values.

    Levels are those of the model of the choir voice, 0 dB for the strongest partial; marked are
    the first partials that pairs of voices share, octaves and unisons aside.
    """
    levels = [_levels(tone, vowel) for tone in chord.tones]
    strongest = max(level for own in levels for level in own)
    levels = [[level - strongest for level in own] for own in levels]
    shared = {(pair.low, s.low_partial) for pair in _telling(chord) for s in pair.shared}
    shared |= {(pair.high, s.high_partial) for pair in _telling(chord) for s in pair.shared}
    lowest = min(tone.equal_hz for tone in chord.tones)
    panels = tuple(
        Panel(
            words,
            tuple(
                Stem(number * hz, level, index, just and (index, number) in shared)
                for index, (hz, own) in enumerate(zip(frequencies, levels, strict=True))
                for number, level in enumerate(own, 1)
                if number * hz <= HIGHEST_HZ and level > _FLOOR_DB
            ),
        )
        for words, frequencies, just in (
            ("equal temperament", [tone.equal_hz for tone in chord.tones], False),
            ("as tuned", [tone.hz for tone in chord.tones], True),
        )
    )
    return SpectrumPlot(
        printed(title),
        tuple(f"{tone.name} {printed(tone.pitch.name)}" for tone in chord.tones),
        (panels[0], panels[1]),
        tuple(_zooms(chord, levels)),
        tuple(_ticks(lowest, chord.tones[0].reference_hz)),
        lowest * 0.9,
        HIGHEST_HZ,
        _FLOOR_DB,
        _ZOOM_CENTS,
        f"Levels: model of the choir voice, vowel {vowel}; formants of Bennett and Rodet 1989.",
    )


def _levels(tone: Tone, vowel: str) -> list[float]:
    voice = tone.voice or type_of(tone.pitch.key)
    amplitudes = spectrum(tone.equal_hz, formants(voice, vowel), _RD)
    return [20.0 * math.log10(amplitude) for amplitude in amplitudes.tolist()]


def _telling(chord: FoundChord) -> list[Pair]:
    """Pairs whose beats tell of the tuning: all but octaves."""
    found = []
    for pair in chord.card.pairs:
        size = pair.ratio.numerator
        if pair.ratio.denominator > 1 or size & (size - 1):
            found.append(pair)
    return found


def _zooms(chord: FoundChord, levels: list[list[float]]) -> Iterator[Zoom]:
    """The first meetings of the simplest pairs, one of each interval, octaves aside."""
    each = {(_odd(pair.ratio.numerator), _odd(pair.ratio.denominator)): pair
            for pair in reversed(_telling(chord))}  # fmt: skip
    simplest = sorted(each.values(), key=lambda one: one.ratio.numerator + one.ratio.denominator)
    for pair in simplest[:_ZOOMS]:
        low, high = chord.tones[pair.low], chord.tones[pair.high]
        p, q = pair.ratio.numerator, pair.ratio.denominator
        middle = math.sqrt(p * low.equal_hz * q * high.equal_hz)
        yield Zoom(
            f"{printed(low.pitch.name)} partial {p}, {printed(high.pitch.name)} partial {q}\n"
            f"near {middle:.0f} Hz",
            tuple(_near(chord, levels, middle, equal=True)),
            tuple(_near(chord, levels, middle, equal=False)),
            f"equal: {_beats(pair.equal_hz)}",
            f"as tuned: {_beats(pair.beat_hz)}",
        )


def _odd(number: int) -> int:
    while number % 2 == 0:
        number //= 2
    return number


def _near(
    chord: FoundChord, levels: list[list[float]], middle: float, *, equal: bool
) -> Iterator[tuple[float, float, int]]:
    for index, tone in enumerate(chord.tones):
        hz = tone.equal_hz if equal else tone.hz
        for number in range(1, min(len(levels[index]), 2 * HIGHEST_PARTIAL) + 1):
            cents = 1200.0 * math.log2(number * hz / middle)
            level = levels[index][number - 1]
            if abs(cents) <= _ZOOM_CENTS and level > _FLOOR_DB:
                yield cents, level, index


def _beats(hz: float) -> str:
    return "still" if hz < 0.005 else f"{hz:.2f} beats a second"


def _ticks(lowest: float, reference_hz: float) -> Iterator[tuple[float, str]]:
    """The Cs and Gs of the range, with their frequencies."""
    for octave in range(9):
        for name, step in (("C", 0), ("G", 7)):
            hz = hz_of(_OCTAVE * (octave + 1) + step, 0.0, reference_hz)
            if lowest * 0.9 <= hz <= HIGHEST_HZ:
                yield hz, f"{name}{octave}\n{hz:.0f}"
