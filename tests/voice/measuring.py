"""What is measured in rendered sound: pitch by phase slopes, harmonics, envelopes."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from retune.score.model import Part, PartKind, VoiceType
from retune.tuning.model import TunedScore
from tests.export.building import Sung, tuned_score

RATE = 44_100
Floats = NDArray[np.float64]

SOPRANO = Part(0, "Soprano", voice_type=VoiceType.SOPRANO)
TENOR = Part(0, "Tenor", voice_type=VoiceType.TENOR)


def part(kind: PartKind, program: int | None = None) -> Part:
    """The only part of a score."""
    return Part(0, "Part", kind, program=program)


def line(*notes: Sung, singer: Part = TENOR, qpm: int = 60) -> TunedScore:
    """One part at one quarter note a second unless told."""
    return tuned_score(notes, parts=[singer], tempo=[(0, qpm)])


def cut(samples: NDArray[np.float32], start: float, stop: float) -> Floats:
    """The samples between two times in seconds."""
    return samples[round(start * RATE) : round(stop * RATE)].astype(np.float64)


def partial(samples: Floats, hz: float) -> complex:
    """Complex amplitude of a sinusoid of known frequency (Hann window), phase at the start."""
    window = np.hanning(len(samples) + 1)[:-1]
    turn = np.exp(-2j * np.pi * hz * np.arange(len(samples)) / RATE)
    return complex(2.0 * np.sum(samples * window * turn) / np.sum(window))


def measured_hz(samples: Floats, near: float, partials: int = 8) -> float:
    """Frequency of a steady harmonic tone near a guess (about 40 cents): the phase that each
    partial gains from one window to a later one, weighted by its power, from small to large
    distances, so that no turn is lost."""
    hz = near
    length = len(samples) // 2
    for distance in (length // 64, length // 16, length // 4, length, length):
        gained, weight = 0.0, 0.0
        for number in range(1, partials + 1):
            if number * hz > 8_000.0:
                break
            first = partial(samples[:length], number * hz)
            second = partial(samples[distance : distance + length], number * hz)
            turned = np.exp(-2j * np.pi * number * hz * distance / RATE)
            share = abs(first) ** 2
            gained += share * float(np.angle(second / first * turned)) / number
            weight += share
        hz += gained / weight / (2.0 * math.pi * distance / RATE)
    return hz


def cents(hz: float, than: float) -> float:
    """How much higher a frequency is than another."""
    return 1200.0 * math.log2(hz / than)


def band_power(samples: Floats, above: float) -> float:
    """Share of the power above a frequency."""
    power = np.abs(np.fft.rfft(samples * np.hanning(len(samples)))) ** 2
    at = np.fft.rfftfreq(len(samples), 1.0 / RATE)
    return float(power[at > above].sum() / power.sum())


def envelope(samples: Floats, hz: float, step: float = 0.01, window: float = 0.25) -> Floats:
    """Magnitude of one partial over time."""
    length, hop = round(window * RATE), round(step * RATE)
    starts = range(0, len(samples) - length, hop)
    return np.array([abs(partial(samples[at : at + length], hz)) for at in starts])
