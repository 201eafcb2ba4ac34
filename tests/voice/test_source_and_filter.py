"""Glottal source, vocal tract and loudness, held against published values."""

from __future__ import annotations

import math

import numpy as np
import pyloudnorm
import pytest
from scipy.integrate import quad
from scipy.signal import freqz

from retune.errors import WishError
from retune.score.model import VoiceType
from retune.voice import language
from retune.voice.formants import Formants, formants
from retune.voice.glottis import harmonics, pulse
from retune.voice.loudness import gain_db, levelled, weighting
from retune.voice.options import LANGUAGES, VOWELS, SoundOptions
from retune.voice.spectrum import spectrum, transfer

# Computed once with scipy's root finder and a cycle of 65,536 points from the equations of Fant,
# Liljencrants and Lin 1985 and Fant 1995: tp, te, ta, epsilon, alpha, then dB of harmonics
# 2, 3, 4, 5, 10, 20, 40 against the first.
LF = {
    0.5: (0.3640, 0.4670, 0.0140, 71.43, 6.089, 2.0, -0.9, -3.9, -6.0, -14.2, -23.8, -35.0),
    1.0: (0.4844, 0.6500, 0.0380, 26.31, 2.807, -3.8, -9.6, -14.1, -16.5, -27.8, -38.7, -50.6),
    1.7: (0.5353, 0.7625, 0.0716, 13.38, 1.311, -11.1, -16.2, -20.7, -25.5, -37.9, -48.9, -62.0),
    2.5: (0.5199, 0.7898, 0.1100, 7.007, 0.564, -17.5, -22.4, -26.5, -31.1, -43.4, -56.2, -70.1),
}


@pytest.mark.parametrize("rd", LF)
def test_lf_pulse_and_its_harmonics(rd: float) -> None:
    form, (tp, te, ta, decay, growth, *levels) = pulse(rd), LF[rd]
    assert (form.peak, form.closure, form.recovery) == pytest.approx((tp, te, ta), abs=5e-5)
    assert form.decay == pytest.approx(decay, rel=5e-4)
    assert form.growth == pytest.approx(growth, abs=1e-3)
    db = 20.0 * np.log10(harmonics(rd, 40))
    found = [db[number - 1] - db[0] for number in (2, 3, 4, 5, 10, 20, 40)]
    assert found == pytest.approx(levels, abs=0.06)


def test_harmonics_are_the_fourier_integral_of_the_pulse() -> None:
    form = pulse(1.3)
    rest = 1.0 - form.closure

    def flow(t: float) -> float:
        if t <= form.closure:
            rise = math.exp(form.growth * (t - form.closure)) * math.sin(math.pi * t / form.peak)
            return -rise / math.sin(math.pi * form.closure / form.peak)
        left = math.exp(-form.decay * (t - form.closure)) - math.exp(-form.decay * rest)
        return -left / (form.decay * form.recovery)

    def integral(of: object) -> float:
        assert callable(of)
        return sum(
            quad(of, low, high, epsabs=1e-12, limit=200)[0]
            for low, high in ((0.0, form.closure), (form.closure, 1.0))
        )

    assert integral(flow) == pytest.approx(0.0, abs=1e-9)
    found = harmonics(1.3, 7)
    for number in (1, 2, 7):
        turn = 2.0 * math.pi * number
        real = integral(lambda t, turn=turn: flow(t) * math.cos(turn * t))
        imaginary = integral(lambda t, turn=turn: flow(t) * math.sin(turn * t))
        assert found[number - 1] == pytest.approx(math.hypot(real, imaginary), rel=1e-7)


def test_table_rows_of_bennett_and_rodet() -> None:
    # G. Bennett and X. Rodet 1989: corner values of the printed table.
    assert formants(VoiceType.BASS, "a").hz == (600, 1040, 2250, 2450, 2750)
    assert formants(VoiceType.BASS, "a").bandwidths == (60, 70, 110, 120, 130)
    assert formants(VoiceType.TENOR, "i").hz == (290, 1870, 2800, 3250, 3540)
    assert formants(VoiceType.ALTO, "e").hz == (400, 1600, 2700, 3300, 4950)
    assert formants(VoiceType.SOPRANO, "u").hz == (325, 700, 2700, 3800, 4950)
    assert formants(VoiceType.SOPRANO, "o").bandwidths == (70, 80, 100, 130, 135)


@pytest.mark.parametrize("voice_type", VoiceType)
def test_every_vowel_of_every_voice_lies_in_order(voice_type: VoiceType) -> None:
    for vowel in VOWELS:
        found = formants(voice_type, vowel)
        assert len(found.hz) == len(found.bandwidths) == 5
        assert all(low < high for low, high in zip(found.hz, found.hz[1:], strict=False))
        assert all(30.0 <= width <= 210.0 for width in found.bandwidths)


@pytest.mark.parametrize("voice_type", VoiceType)
def test_vowels_stand_in_the_vowel_chart_as_the_letters_do(voice_type: VoiceType) -> None:
    # The chart of the International Phonetic Association: the opener the vowel the higher F1,
    # the further back (and rounder) the lower F2.
    first = {vowel: formants(voice_type, vowel).hz[0] for vowel in VOWELS}
    second = {vowel: formants(voice_type, vowel).hz[1] for vowel in VOWELS}
    assert first["i"] < first["ɪ"] < first["ɛ"] < first["æ"]
    assert first["u"] < first["ʊ"] < first["o"] < first["ɔ"] < first["a"]
    assert second["i"] > second["y"] > second["ø"] > second["œ"] > second["ɔ"] > second["u"]
    assert second["e"] > second["ɜ"] > second["ʌ"] > second["o"]
    assert first["o"] < first["neutral"] < first["a"]


def test_first_formant_never_lies_below_the_pitch() -> None:
    for f0 in (200.0, 400.0, 700.0, 1100.0):
        for vowel in VOWELS:
            raised = formants(VoiceType.SOPRANO, vowel).raised(f0)
            assert raised.hz[0] >= f0
            assert list(raised.hz) == sorted(raised.hz)
    low = formants(VoiceType.BASS, "a")
    assert low.raised(110.0) == low


def test_transfer_peaks_at_the_formants_and_is_one_at_rest() -> None:
    vowel = formants(VoiceType.TENOR, "e")
    hz = np.arange(0.0, 4000.0, 1.0)
    gain = transfer(hz, vowel)
    assert gain[0] == pytest.approx(1.0, abs=1e-3)
    peaks = hz[1:-1][(gain[1:-1] > gain[:-2]) & (gain[1:-1] > gain[2:])]
    for formant in vowel.hz:
        assert np.min(np.abs(peaks - formant)) < 0.03 * formant


def test_transfer_is_a_cascade_of_klatt_resonators_with_higher_poles() -> None:
    # D. H. Klatt, JASA 67, 971-995 (1980): y = A x + B y1 + C y2. A digital resonator at 1 MHz
    # is the continuous one; the higher-pole correction after five formants is
    # 0.433 x^2 + 0.0007 x^4 dB, x = f / 500 Hz.
    vowel = Formants((650.0, 1080.0, 2650.0, 2900.0, 3250.0), (80.0, 90.0, 120.0, 130.0, 140.0))
    rate, hz = 1_000_000.0, np.array([120.0, 650.0, 1500.0, 2800.0, 4000.0])
    expected = np.ones(len(hz))
    for centre, width in zip(vowel.hz, vowel.bandwidths, strict=True):
        c = -math.exp(-2.0 * math.pi * width / rate)
        b = 2.0 * math.exp(-math.pi * width / rate) * math.cos(2.0 * math.pi * centre / rate)
        expected *= np.abs(freqz([1.0 - b - c], [1.0, -b, -c], hz, fs=rate)[1])
    x = hz / 500.0
    expected *= 10.0 ** ((0.433 * x**2 + 0.0007 * x**4) / 20.0)
    assert transfer(hz, vowel) == pytest.approx(expected, rel=1e-3)


def test_spectrum_is_source_times_tract_up_to_ten_kilohertz() -> None:
    vowel = formants(VoiceType.BASS, "o")
    found = spectrum(110.0, vowel, 1.1)
    assert len(found) == 90
    at = 110.0 * np.arange(1, 91)
    assert found / harmonics(1.1, 90) == pytest.approx(transfer(at, vowel))


def test_high_pitches_carry_the_first_formant_along() -> None:
    # Sung as it stands, /u/ (F1 325 Hz) would lose its fundamental on A5: two octaves above a
    # resonance the gain falls by 12 dB an octave.
    vowel = formants(VoiceType.SOPRANO, "u")
    gain = spectrum(880.0, vowel, 1.1)[0] / harmonics(1.1, 1)[0]
    assert gain > 5.0 > transfer(np.array([880.0]), vowel)[0]


def test_weighting_is_the_one_of_the_loudness_meter() -> None:
    # ITU-R BS.1770, as pyloudnorm has it.
    hz = np.array([40.0, 100.0, 440.0, 1500.0, 3000.0, 8000.0])
    expected = np.ones(len(hz))
    for stage in pyloudnorm.Meter(48_000)._filters.values():
        expected *= np.abs(freqz(stage.b, stage.a, hz, fs=48_000.0)[1])
    assert weighting(hz) == pytest.approx(expected, rel=0.005)
    # A full-scale sine of 997 Hz reads -3.01 LUFS, by the same standard.
    sine = levelled(np.array([0.3]), 997.0, -3.01)
    assert sine[0] == pytest.approx(1.0, rel=0.005)


def test_vowels_and_languages_are_those_of_the_texts() -> None:
    assert set(language.VOWELS) == set(VOWELS)
    assert language.LANGUAGES == LANGUAGES


def test_dynamics_stay_moderate() -> None:
    assert gain_db(80) == 0.0
    assert 12.0 <= gain_db(103) - gain_db(45) <= 14.0
    assert gain_db(127) <= 6.0


@pytest.mark.parametrize(
    "wish",
    [
        {"vowel": "x"},
        {"language": "welsh"},
        {"singers": 0},
        {"scatter_cents": -1.0},
        {"vibrato_cents": math.nan},
    ],
)
def test_impossible_wishes_are_told(wish: dict) -> None:
    with pytest.raises(WishError):
        SoundOptions(**wish)
