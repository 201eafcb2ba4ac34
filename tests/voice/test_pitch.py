"""The pitch that is heard is the tuned pitch: measured in rendered sound, by our own method."""

from __future__ import annotations

import numpy as np
import pytest

from retune.score.model import Part, PartKind, VoiceType
from retune.tuning.policy import Policy
from retune.units import hz_of
from retune.voice.choir import section
from retune.voice.options import SoundOptions
from retune.voice.stems import stem
from tests.export.building import sung, tuned_score
from tests.voice.measuring import (
    RATE,
    cents,
    cut,
    envelope,
    line,
    measured_hz,
    part,
    partial,
)

STRAIGHT = SoundOptions()


def test_the_measure_finds_a_known_pitch() -> None:
    at = np.arange(RATE) / RATE
    tone = sum(np.sin(2.0 * np.pi * 220.5 * n * at + n) / n for n in range(1, 9))
    assert cents(measured_hz(np.asarray(tone), 220.0), 220.5) == pytest.approx(0.0, abs=1e-6)


def test_held_legato_and_repeated_notes_are_exact() -> None:
    score = line(
        sung(0, 0, "C3", (2, 3.1), (2, -7.7)),
        sung(0, 4, "E3", (3, -13.686286)),
        sung(0, 7, "E3", (1, -13.686286), lyric="la"),
        sung(0, 8, "G4", ("1/2", 1.955)),
        sung(0, "17/2", "A#2", (1, 20.0)),
    )
    samples = stem(score, 0, STRAIGHT)
    for start, stop, key, offset in (
        (0.1, 1.97, 48, 3.1),
        (2.05, 3.96, 48, -7.7),
        (4.05, 6.95, 52, -13.686286),
        (7.05, 7.95, 52, -13.686286),
        (8.05, 8.46, 67, 1.955),
        (8.55, 9.45, 46, 20.0),
    ):
        found = measured_hz(cut(samples, start, stop), hz_of(key, 0.0))
        assert cents(found, hz_of(key, offset)) == pytest.approx(0.0, abs=0.001)


@pytest.mark.parametrize("pitch", ["E2", "C4", "A5"])
@pytest.mark.parametrize(
    "player",
    [
        part(PartKind.ACCOMPANIMENT, 0),
        part(PartKind.ACCOMPANIMENT, 19),
        part(PartKind.GUIDE, 53),
    ],
    ids=["struck", "sustained", "guide voice"],
)
def test_every_sound_is_in_tune(pitch: str, player: Part) -> None:
    note = sung(0, 0, pitch, (2, -11.7))
    samples = stem(line(note, singer=player), 0, STRAIGHT)
    found = measured_hz(cut(samples, 0.1, 1.9), hz_of(note.pitch.key, 0.0))
    assert cents(found, hz_of(note.pitch.key, -11.7)) == pytest.approx(0.0, abs=0.01)


def test_reference_pitch_counts() -> None:
    score = tuned_score(
        [sung(0, 0, "A4", (2, 0.0))], parts=["Alto"], policy=Policy(reference_hz=415.3)
    )
    found = measured_hz(cut(stem(score, 0, STRAIGHT), 0.1, 1.9), 415.0)
    assert found == pytest.approx(415.3, abs=1e-4)


def test_a_glide_takes_forty_milliseconds_and_keeps_the_phase() -> None:
    first, second = hz_of(60, 0.0), hz_of(60, 22.0)
    samples = stem(line(sung(0, 0, "C4", (1, 0.0), (1, 22.0))), 0, STRAIGHT)
    before, after = cut(samples, 0.5, 0.99), cut(samples, 1.05, 1.5)
    assert cents(measured_hz(before, first), first) == pytest.approx(0.0, abs=0.001)
    assert cents(measured_hz(after, second), second) == pytest.approx(0.0, abs=0.001)
    # A raised cosine in log frequency gains very nearly the mean of both over its 40 ms.
    turned = np.angle(partial(after, second) / partial(before, first)) / (2.0 * np.pi)
    expected = 0.5 * first + 0.04 * 0.5 * (first + second) + 0.01 * second
    assert (turned - expected + 0.5) % 1.0 - 0.5 == pytest.approx(0.0, abs=2e-3)


def test_a_vibrato_stays_centred() -> None:
    score = line(sung(0, 0, "A3", (10, 3.1)))
    for singers in (1, 4):
        samples = stem(score, 0, SoundOptions(singers=singers, vibrato_cents=40.0))
        found = measured_hz(cut(samples, 0.2, 9.8), 220.0)
        assert cents(found, hz_of(57, 3.1)) == pytest.approx(0.0, abs=0.05)


def test_vibrato_has_its_rate_and_extent() -> None:
    # One singer: the phase of the fundamental against a straight tone swings by
    # (peak deviation / rate): 40 cents of 440 Hz are 10.3 Hz, over 5.1 Hz 2.01 radians.
    samples = cut(
        stem(line(sung(0, 0, "A4", (10, 0.0))), 0, SoundOptions(singers=1, vibrato_cents=40.0)),
        0.5,
        9.5,
    )
    at = np.arange(len(samples)) / RATE
    kernel = np.hanning(801) / 400.5
    base = np.convolve(samples * np.exp(-2j * np.pi * 440.0 * at), kernel, mode="valid")
    phase = np.unwrap(np.angle(base))
    spectrum = np.abs(np.fft.rfft((phase - phase.mean()) * np.hanning(len(phase))))
    rate = np.argmax(spectrum) * RATE / len(phase)
    assert rate == pytest.approx(5.13, abs=0.1)
    assert (phase.max() - phase.min()) / 2.0 == pytest.approx(2.01, rel=0.03)


def test_scattered_singers_have_exactly_the_tuned_mean() -> None:
    # At the tenth partial of A3 eight cents are 10 Hz: the singers stand apart in the spectrum.
    options = SoundOptions(scatter_cents=12.0)
    score = line(sung(0, 0, "A3", (20, 0.0)))
    samples = cut(stem(score, 0, options), 0.5, 19.5)
    spectrum = np.abs(np.fft.rfft(samples * np.hanning(len(samples))))
    step = RATE / len(samples)
    low, high = round(2160.0 / step), round(2240.0 / step)
    peaks = [
        place
        for place in range(low, high)
        if spectrum[place] > spectrum[place - 1] and spectrum[place] >= spectrum[place + 1]
    ]
    best = sorted(peaks, key=lambda place: -spectrum[place])[:4]
    found = []
    for place in best:
        # The Hann window's peak between bins is a parabola in dB, very nearly.
        left, here, right = np.log(spectrum[place - 1 : place + 2])
        found.append((place + 0.5 * (left - right) / (left - 2.0 * here + right)) * step / 10.0)
    assert cents(float(np.mean(found)), 220.0) == pytest.approx(0.0, abs=0.02)
    spread = np.std([cents(hz, 220.0) for hz in found])
    assert spread == pytest.approx(12.0, abs=0.05)


def test_scatter_is_steady_from_run_to_run_and_differs_between_parts() -> None:
    options = SoundOptions(scatter_cents=8.0, vibrato_cents=20.0)
    assert section(options, 1, RATE) == section(options, 1, RATE)
    assert section(options, 1, RATE) != section(options, 2, RATE)


@pytest.mark.parametrize(
    ("offset", "beats"), [(0.0, 5.191), (-13.686286, 0.0)], ids=["equal", "just"]
)
def test_a_tenth_beats_as_theory_has_it(offset: float, beats: float) -> None:
    # C3 and E4: partial 5 meets partial 2 at 654.06 Hz; equal temperament beats 5.191 times a
    # second (f_c (2^(13.686/1200) - 1)), the just tenth 5:2 stands still.
    score = tuned_score(
        [sung(0, 0, "C3", (8, 0.0)), sung(1, 0, "E4", (8, offset))],
        parts=[
            Part(0, "Bass", voice_type=VoiceType.BASS),
            Part(1, "Tenor", voice_type=VoiceType.TENOR),
        ],
    )
    both = cut(stem(score, 0, STRAIGHT) + stem(score, 1, STRAIGHT), 0.2, 7.8)
    shape = envelope(both, 5.0 * hz_of(48, 0.0), step=0.01, window=0.06)
    ripple = (shape.max() - shape.min()) / (shape.max() + shape.min())
    if beats:
        assert ripple > 0.05
        wave = np.abs(np.fft.rfft((shape - shape.mean()) * np.hanning(len(shape)), 16 * len(shape)))
        assert np.argmax(wave) / (16 * len(shape) * 0.01) == pytest.approx(beats, abs=0.03)
    else:
        assert ripple < 0.01
