"""The sound of whole parts: formants, joins, levels, bounds, which sound for which part."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import numpy as np
import pyloudnorm
import pytest

import retune
from retune.score.model import Part, PartKind, VoiceType
from retune.tuning.model import TunedScore
from retune.units import hz_of
from retune.voice.formants import formants
from retune.voice.glottis import harmonics
from retune.voice.loudness import pulse_shape
from retune.voice.options import SoundOptions
from retune.voice.spectrum import transfer
from retune.voice.stems import PEAK, TAIL_SECONDS, stem
from tests.export.building import sung, tuned_score
from tests.voice.measuring import RATE, Floats, band_power, cut, line, part, partial

FIXTURES = Path(__file__).parents[2] / "fixtures"
STRAIGHT = SoundOptions()
ONE = SoundOptions(singers=1, vowel="a")


def read(name: str) -> TunedScore:
    score = retune.read(str(FIXTURES / name))
    return retune.tune(score, retune.analyse(score), retune.Policy())


def marked(score: TunedScore, *marks: str) -> TunedScore:
    """The same music with marks on its first note."""
    first = replace(score.notes[0].note, marks=frozenset(marks))
    return replace(
        score,
        score=replace(score.score, notes=(first, *score.score.notes[1:])),
        notes=(replace(score.notes[0], note=first), *score.notes[1:]),
    )


def loudness(samples: Floats, window: float = 0.01) -> Floats:
    """RMS in windows, for looking at envelopes."""
    length = round(window * RATE)
    count = len(samples) // length
    return np.sqrt(np.mean(samples[: count * length].reshape(count, length) ** 2, axis=1))


def silent_from(samples: Floats) -> float:
    """Seconds after which there is nothing."""
    return float(np.nonzero(np.abs(samples) > 1e-6)[0][-1] / RATE)


@pytest.mark.parametrize(
    ("voice_type", "pitch", "vowel"),
    [
        (VoiceType.BASS, "G2", "a"),
        (VoiceType.TENOR, "C3", "e"),
        (VoiceType.ALTO, "A3", "o"),
        (VoiceType.SOPRANO, "C4", "i"),
    ],
)
def test_dividing_by_the_source_gives_the_tract(
    voice_type: VoiceType, pitch: str, vowel: str
) -> None:
    note = sung(0, 0, pitch, (2, 0.0))
    singer = Part(0, "One", voice_type=voice_type)
    samples = cut(
        stem(line(note, singer=singer), 0, SoundOptions(singers=1, vowel=vowel)), 0.2, 1.8
    )
    f0 = hz_of(note.pitch.key, 0.0)
    at = f0 * np.arange(1, int(5_000.0 / f0) + 1)
    measured = np.array([abs(partial(samples, hz)) for hz in at])
    found = 20.0 * np.log10(measured / harmonics(pulse_shape(80), len(at)))
    expected = 20.0 * np.log10(transfer(at, formants(voice_type, vowel).raised(f0)))
    assert found - found[0] == pytest.approx(expected - expected[0], abs=0.02)


def test_formants_stand_out_of_a_low_voice() -> None:
    # E2: partials 82 Hz apart sample the tract finely enough to see its peaks.
    singer = Part(0, "Bass", voice_type=VoiceType.BASS)
    samples = cut(stem(line(sung(0, 0, "E2", (2, 0.0)), singer=singer), 0, ONE), 0.2, 1.8)
    f0 = hz_of(40, 0.0)
    at = f0 * np.arange(1, 35)
    gain = np.array([abs(partial(samples, hz)) for hz in at]) / harmonics(pulse_shape(80), 34)
    # The first two formants of the bass /a/ in the sung table, and the three near 2.5 kHz.
    for low, high in ((300.0, 820.0), (820.0, 1500.0), (1500.0, 2350.0)):
        inside = (at > low) & (at < high)
        strongest = at[inside][np.argmax(gain[inside])]
        formant = min((600.0, 1040.0, 2250.0), key=lambda hz: abs(hz - strongest))
        assert low < formant < high
        assert abs(strongest - formant) <= f0


def test_all_parts_of_a_score_are_equally_long() -> None:
    score = read("harbour-hymn.musicxml")
    made = [stem(score, index, STRAIGHT) for index in range(len(score.score.parts))]
    expected = (score.seconds(score.score.end) + TAIL_SECONDS) * RATE
    assert {len(samples) for samples in made} == {int(np.ceil(expected))}
    for samples in made:
        assert samples.dtype == np.float32
        assert np.all(np.isfinite(samples))
        assert 0.05 < np.abs(samples).max() < PEAK
        assert np.abs(samples[-1000:]).max() == 0.0
        assert band_power(samples[: 1 << 20].astype(np.float64), 11_000.0) < 1e-9


@pytest.mark.parametrize(
    "options",
    [
        STRAIGHT,
        SoundOptions(scatter_cents=8.0),
        SoundOptions(vibrato_cents=30.0),
        SoundOptions(singers=9, scatter_cents=8.0, vibrato_cents=30.0),
    ],
    ids=["straight", "scatter", "vibrato", "all"],
)
def test_joins_are_smooth(options: SoundOptions) -> None:
    # A jump would stand out of the second difference by orders of magnitude; the held tone's own
    # is the measure. Leaps of an octave and a fast run are in it, a change of loudness too.
    notes = [
        sung(0, 0, "C3", (2, 0.0), lyric="la"),
        sung(0, 2, "C4", (1, 0.0), (1, 12.0), lyric="la", velocity=50),
        sung(0, 4, "C4", (1, 0.0), lyric="la"),
        sung(0, 5, "E3", (1, 0.0)),
    ]
    notes += [sung(0, 6 + Fraction(i, 16), "CDEF"[i % 4] + "3", ("1/16", 0.0)) for i in range(16)]
    samples = stem(line(*notes), 0, options).astype(np.float64)
    bend = np.abs(np.diff(samples, 2))
    held = max(bend[round(a * RATE) : round(b * RATE)].max() for a, b in ((0.2, 1.9), (2.1, 2.9)))
    assert bend.max() < 1.6 * held
    assert np.abs(np.diff(samples)).max() < 0.05


def test_the_start_fades_in() -> None:
    for player in (Part(0, "Alto"), part(PartKind.ACCOMPANIMENT, 19)):
        samples = cut(stem(line(sung(0, 0, "A4", (1, 0.0)), singer=player), 0, STRAIGHT), 0.0, 0.5)
        shape = loudness(samples)
        assert samples[0] == 0.0
        assert shape[0] < 0.15 * shape[20]
        assert np.all(np.diff(shape[:4]) > 0.0)


def test_repeats_are_struck_anew_syllables_dip_melismas_flow() -> None:
    def deepest(second: str, lyric: str) -> float:
        notes = [sung(0, 0, "E4", (1, 0.0), lyric="a"), sung(0, 1, second, (1, 0.0), lyric=lyric)]
        samples = cut(stem(line(*notes), 0, STRAIGHT), 0.9, 1.1)
        shape = loudness(samples, 3.0 / 329.63)  # three periods
        return float(20.0 * np.log10(shape.min() / shape.max()))

    assert -14.0 < deepest("E4", "a") < -10.0
    assert -5.5 < deepest("F4", "a") < -3.0
    assert deepest("F4", "") > -1.5


def test_before_a_rest_nothing_is_lost_and_for_a_breath_a_quarter_of_a_second() -> None:
    notes = [sung(0, 0, "E4", (2, 0.0)), sung(0, 4, "E4", (1, 0.0))]
    plain = cut(stem(line(*notes), 0, STRAIGHT), 0.0, 4.0)
    assert 2.0 < silent_from(plain) < 2.1
    follows = line(sung(0, 0, "E4", (2, 0.0)), sung(0, 2, "E4", (1, 0.0)))
    for mark in ("breath", "caesura", "fermata"):
        shape = loudness(cut(stem(marked(follows, mark), 0, STRAIGHT), 0.0, 3.0))
        assert shape[170] > 0.5 * shape[100]
        assert np.all(shape[182:199] == 0.0)
        assert shape[215] > 0.9 * shape[100]
    short = line(sung(0, 0, "E4", ("1/2", 0.0)), sung(0, "1/2", "E4", (1, 0.0)))
    shape = loudness(cut(stem(marked(short, "breath"), 0, STRAIGHT), 0.0, 1.0))
    assert shape[33] > 0.5 * shape[20]


def test_staccato_is_shortened() -> None:
    score = line(sung(0, 0, "E4", (1, 0.0)), sung(0, 1, "F4", (1, 0.0)))
    for marks, end in ((("staccato",), 0.6), (("staccato", "tenuto"), 0.8)):
        samples = cut(stem(marked(score, *marks), 0, STRAIGHT), 0.0, 0.99)
        assert silent_from(samples) == pytest.approx(end + 0.06, abs=0.01)


def test_lines_of_a_divided_part_sound_together() -> None:
    whole = stem(line(sung(0, 0, "C4", (2, 0.0)), sung(0, 1, "E4", (1, 0.0))), 0, STRAIGHT)
    low = stem(line(sung(0, 0, "C4", (2, 0.0))), 0, STRAIGHT)
    high = stem(line(sung(0, 1, "E4", (1, 0.0))), 0, STRAIGHT)
    assert whole == pytest.approx(low + high, abs=1e-5)


@pytest.mark.parametrize("pitch", ["A2", "E3", "C4", "G4"])
@pytest.mark.parametrize("vowel", ["neutral", "i", "u", "œ"])
def test_neither_vowel_nor_pitch_makes_a_part_jump(pitch: str, vowel: str) -> None:
    samples = stem(line(sung(0, 0, pitch, (2, 0.0))), 0, SoundOptions(vowel=vowel))
    found = pyloudnorm.Meter(RATE).integrated_loudness(cut(samples, 0.1, 1.9))
    assert found == pytest.approx(-24.0, abs=0.3)
    # Partials in step would reach 0.35: the phases must keep peaks low.
    assert np.abs(samples).max() < 0.2


def test_options_change_the_loudness_little() -> None:
    score = line(sung(0, 0, "A3", (15, 0.0)))
    for options in (
        SoundOptions(singers=1),
        SoundOptions(singers=16),
        SoundOptions(scatter_cents=10.0),
        SoundOptions(vibrato_cents=3.0),
        SoundOptions(vibrato_cents=50.0),
        SoundOptions(singers=8, scatter_cents=6.0, vibrato_cents=30.0),
    ):
        samples = cut(stem(score, 0, options), 0.1, 14.9)
        found = pyloudnorm.Meter(RATE).integrated_loudness(samples)
        assert found == pytest.approx(-24.0, abs=1.5)


def test_louder_is_brighter() -> None:
    def tilt(velocity: int) -> float:
        score = line(sung(0, 0, "C3", (1, 0.0), velocity=velocity))
        samples = cut(stem(score, 0, ONE), 0.1, 0.9)
        high = abs(partial(samples, 20 * hz_of(48, 0.0)))
        return float(20.0 * np.log10(high / abs(partial(samples, hz_of(48, 0.0)))))

    assert tilt(57) + 5.0 < tilt(80) < tilt(90) - 3.0


def test_an_accompaniment_does_not_drown_the_voices() -> None:
    chord = [
        sung(0, bar, pitch, (1, 0.0)) for bar in range(4) for pitch in ("C3", "G3", "C4", "E4")
    ]
    voices = 4.0 * 10.0**-2.4
    for program in (None, 0, 19, 48):
        samples = stem(line(*chord, singer=part(PartKind.ACCOMPANIMENT, program)), 0, STRAIGHT)
        found = pyloudnorm.Meter(RATE).integrated_loudness(cut(samples, 0.0, 4.0))
        assert -15.0 < found - 10.0 * np.log10(voices) < -3.0


def test_a_struck_tone_dies_away_upper_partials_first() -> None:
    note = sung(0, 0, "C3", (4, 0.0))
    samples = stem(line(note, singer=part(PartKind.ACCOMPANIMENT)), 0, STRAIGHT)

    def fall(number: int) -> float:
        hz = number * hz_of(48, 0.0)
        early, late = (abs(partial(cut(samples, at, at + 0.2), hz)) for at in (0.02, 2.0))
        return float(20.0 * np.log10(early / late))

    assert 5.0 < fall(1) < fall(4) < fall(12)


def test_many_loud_notes_stay_below_the_bound() -> None:
    cluster = [sung(0, 0, f"{step}{octave}", (1, 0.0), velocity=127)
               for octave in range(2, 6) for step in "CDEFGAB"]  # fmt: skip
    for kind in (PartKind.VOICE, PartKind.ACCOMPANIMENT):
        samples = stem(line(*cluster, singer=part(kind)), 0, STRAIGHT)
        assert np.abs(samples).max() <= PEAK + 1e-6


@pytest.mark.parametrize("pitch", ["E5", "F5", "G1", "A1", "A#1", "C2"])
def test_clicks_are_brief_and_soft_edged(pitch: str) -> None:
    # General MIDI percussion: 76, 77 wood blocks, 31 sticks, 33, 34 metronome; C2 has no sound
    # of its own here.
    click = line(sung(0, 0, pitch, ("1/8", 0.0)), singer=part(PartKind.CLICK))
    samples = stem(click, 0, STRAIGHT).astype(np.float64)
    assert samples[0] == 0.0
    assert np.abs(samples[:10]).max() < 0.02
    assert 0.1 < np.abs(samples).max() < PEAK
    shape = loudness(samples)
    assert shape.argmax() == 0
    assert shape[20:].max() < (0.35 if pitch == "A#1" else 0.01) * shape[0]
    assert band_power(samples, 11_000.0) < 1e-3


def test_the_five_clicks_differ() -> None:
    made = [
        stem(line(sung(0, 0, pitch, (1, 0.0)), singer=part(PartKind.CLICK)), 0, STRAIGHT)
        for pitch in ("E5", "F5", "G1", "A1", "A#1")
    ]
    for one in range(5):
        for other in range(one):
            alike = np.corrcoef(made[one], made[other])[0, 1]
            assert abs(alike) < 0.5


def test_a_part_without_a_voice_type_is_sung_at_its_height() -> None:
    for pitch, kind in (("A2", VoiceType.BASS), ("A3", VoiceType.TENOR), ("G4", VoiceType.SOPRANO)):
        made = [
            stem(line(sung(0, 0, pitch, (1, 0.0)), singer=singer), 0, STRAIGHT)
            for singer in (Part(0, "Part"), Part(0, "Part", voice_type=kind))
        ]
        assert np.array_equal(*made)


def test_vowels_follow_the_text() -> None:
    notes = [sung(0, 0, "A3", (1, 0.0), lyric="sanc-"), sung(0, 1, "A3", (1, 0.0), lyric="ti")]
    samples = stem(line(*notes), 0, SoundOptions(language="latin", singers=1))
    for vowel, start in (("a", 0.0), ("i", 1.0)):
        fixed = stem(line(*notes), 0, SoundOptions(vowel=vowel, singers=1))
        assert cut(samples, start + 0.15, start + 0.8) == pytest.approx(
            cut(fixed, start + 0.15, start + 0.8), abs=1e-4
        )


def test_silence_and_tiny_notes() -> None:
    nothing = tuned_score([sung(0, 0, "C4", (1, 0.0))], parts=["Soprano", "Alto"])
    assert not stem(nothing, 1, STRAIGHT).any()
    tiny = line(sung(0, 0, "C4", ("1/1000", 0.0)), sung(0, 1, "C4", ("1/50", 0.0)))
    samples = stem(tiny, 0, STRAIGHT).astype(np.float64)
    assert not samples[: RATE - 1].any()
    assert np.abs(np.diff(samples)).max() < 0.02


@pytest.mark.parametrize("rate", [22_050, 48_000])
def test_other_sample_rates(rate: int) -> None:
    samples = stem(line(sung(0, 0, "C4", (2, 0.0))), 0, STRAIGHT, rate).astype(np.float64)
    assert len(samples) == 5 * rate  # a bar of four seconds and the tail
    spectrum = np.abs(np.fft.rfft(samples[:rate]))
    assert 250 + np.argmax(spectrum[250:275]) == 262
