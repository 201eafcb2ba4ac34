"""A chord as sound: its pitches to a hundredth of a cent, its beats, its loudness."""

from __future__ import annotations

import io

import numpy as np
import pytest
import soundfile
from numpy.typing import NDArray

from retune.adapters.loudness import integrated_lufs, true_peak_db
from retune.chordcard.found import FoundChord, chord_of
from retune.chordcard.naming import parse_pitches
from retune.export.chord_sound import (
    HOLD,
    SLIDE,
    Stretch,
    Tuning,
    chord_sound,
    programme,
    programme_words,
    rendered,
)
from tests.voice.measuring import RATE, cents, cut, envelope, measured_hz

TENTH = chord_of(parse_pitches(["C3 E4"]))


@pytest.fixture(scope="module")
def tenth() -> NDArray[np.float32]:
    return rendered(TENTH)


def held(tuning: Tuning, count: int = 0) -> tuple[float, float]:
    """A steady second after its start to a second before its end."""
    steady = [
        stretch
        for stretch in programme()
        if len(stretch.points) == 2 and stretch.points[0][1] is tuning
    ]
    return steady[count].start + 0.5, steady[count].stop - 0.5


def slide() -> Stretch:
    return programme()[-1]


@pytest.mark.parametrize("tuning", list(Tuning))
@pytest.mark.parametrize("count", [0, 1])
def test_held_pitches_are_exact(tenth: NDArray[np.float32], tuning: Tuning, count: int) -> None:
    """Partials of C3 and E4 that the other tone does not come near."""
    sound = cut(tenth[:, 0], *held(tuning, count))
    for tone in TENTH.tones:
        wanted = tone.hz if tuning is Tuning.JUST else tone.equal_hz
        assert abs(cents(measured_hz(sound, wanted, partials=1), wanted)) < 0.01


def beat_hz(heights: NDArray[np.float64], step: float) -> float:
    """The rate at which an envelope rises and falls most."""
    power = np.abs(np.fft.rfft((heights - heights.mean()) * np.hanning(len(heights)), 1 << 15))
    at = np.fft.rfftfreq(1 << 15, step)
    return float(at[power[at > 1.0].argmax() + int((at <= 1.0).sum())])


def test_equal_tenth_beats_as_the_textbook_has_it_and_the_just_one_does_not(
    tenth: NDArray[np.float32],
) -> None:
    """5.191 Hz near 654 Hz, the fifth partial of C3 (handbook, voice.md 3.1)."""
    step = 0.01
    heights = {
        tuning: envelope(cut(tenth[:, 0], *held(tuning)), 656.5, step, window=0.1)
        for tuning in Tuning
    }
    assert beat_hz(heights[Tuning.EQUAL], step) == pytest.approx(5.191, abs=0.05)
    ripple = {t: float((h.max() - h.min()) / h.mean()) for t, h in heights.items()}
    assert ripple[Tuning.EQUAL] > 0.3
    assert ripple[Tuning.JUST] < 0.02


def test_slide_makes_the_beating_stop_and_start(tenth: NDArray[np.float32]) -> None:
    points = slide().points
    assert [tuning for _, tuning in points] == [
        Tuning.EQUAL, Tuning.EQUAL, Tuning.JUST, Tuning.JUST, Tuning.EQUAL, Tuning.EQUAL,
    ]  # fmt: skip
    step = 0.01

    def ripple(start: float, stop: float) -> float:
        heights = envelope(cut(tenth[:, 0], start, stop), 655.0, step, window=0.1)
        return float((heights.max() - heights.min()) / heights.mean())

    at = [second for second, _ in points]
    assert ripple(at[0] + 0.5, at[1]) > 0.3
    assert ripple(at[2] + 0.3, at[3] - 0.3) < 0.02
    assert ripple(at[4], at[5] - 0.5) > 0.3
    # It slows down on the way: the later half second of the glide has fewer beats in it.
    gliding = envelope(cut(tenth[:, 0], at[1], at[2]), 655.0, step, window=0.1)
    turns = np.flatnonzero(np.diff(np.sign(np.diff(gliding))) < 0)
    gaps = np.diff(turns) * step
    assert gaps[-1] > 1.5 * gaps[0]
    assert at[2] - at[1] == pytest.approx(SLIDE)
    assert at[1] - at[0] == pytest.approx(HOLD)


def test_loudness_peaks_and_both_ends(tenth: NDArray[np.float32]) -> None:
    """-18 LUFS and a true peak of at most -1 dB, as learning tracks (EBU R 128)."""
    assert integrated_lufs(tenth, RATE) == pytest.approx(-18.0, abs=0.2)
    assert true_peak_db(tenth, RATE) <= -1.0
    assert np.all(tenth[0] == 0.0)
    assert np.abs(tenth[:200]).max() < 1e-3
    assert np.abs(np.diff(tenth, axis=0)).max() < 0.2
    assert np.array_equal(tenth[:, 0], tenth[:, 1])


def test_silence_between_stretches(tenth: NDArray[np.float32]) -> None:
    first, second = programme()[:2]
    between = cut(tenth[:, 0], first.stop + 0.02, second.start - 0.02)
    assert np.abs(between).max() < 1e-4


def big() -> FoundChord:
    return chord_of(parse_pitches(["C2 G2 C3 E3 G3 Bb3 D4 F#4 A4 C5 E5 G5"]))


def test_twelve_tones_stay_bounded() -> None:
    sound = rendered(big(), "a")
    assert true_peak_db(sound, RATE) <= -1.0
    assert np.isfinite(sound).all()


@pytest.mark.parametrize("ending", ["wav", "FLAC", "ogg", "mp3"])
def test_file_holds_the_programme(ending: str) -> None:
    file = chord_sound(chord_of(parse_pitches(["A3"])), f"a.{ending}", "One tone")
    info = soundfile.info(io.BytesIO(file.data))
    assert info.samplerate == RATE
    assert info.channels == 2
    assert info.duration == pytest.approx(slide().stop + 0.3, abs=0.1)
    assert file.note == programme_words()


def test_words_say_what_sounds_when() -> None:
    assert programme_words().startswith("equal 0:00, just 0:06, equal 0:11, just 0:17, equal 0:23")
    assert "gliding to just 0:28" in programme_words()
