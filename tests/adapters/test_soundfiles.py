"""Sound files as other readers find them: samples, lengths, tags."""

from __future__ import annotations

import io

import numpy as np
import pytest
import soundfile

from retune.adapters.soundfiles import SoundFormat, Tags, encode

RATE = 44_100
TAGS = Tags(
    title="Altö predominant – Жар-птица 東風 𝄞",
    album="Hÿmne",
    composer="Ånsa Verrill",
    lyricist="L. Ömm",
    copyright="2026 the choir",
    track=5,
    of=13,
    lyrics="Erste Zeile\nzweite",
    comment="quietly",
    language="deu",
)


def tone(frames: int, channels: int = 2) -> np.ndarray:
    time = np.arange(frames) / RATE
    mono = (0.5 * np.sin(2 * np.pi * 440.0 * time)).astype(np.float32)
    return mono if channels == 1 else np.stack([mono, 0.5 * mono], axis=1)


@pytest.mark.parametrize("kind", SoundFormat)
@pytest.mark.parametrize("channels", [1, 2])
def test_what_was_sounded_is_read_back(kind: SoundFormat, channels: int) -> None:
    sound = tone(RATE, channels)
    found, rate = soundfile.read(io.BytesIO(encode(sound, RATE, kind, TAGS)), dtype="float32")
    assert rate == RATE
    # No encoder may shift the sound: parts must line up.
    assert found.shape == sound.shape
    lossless = kind in (SoundFormat.WAV, SoundFormat.FLAC)
    inner = slice(2000, -2000)
    assert np.abs(found[inner] - sound[inner]).max() < (1e-4 if lossless else 0.02)


@pytest.mark.parametrize("kind", SoundFormat)
def test_tags_as_players_find_them(kind: SoundFormat) -> None:
    with soundfile.SoundFile(io.BytesIO(encode(tone(4096), RATE, kind, TAGS))) as file:
        if kind is SoundFormat.WAV:
            # The INFO chunk of RIFF is ASCII.
            assert file.title.startswith("Alto predominant - ")
            assert (file.album, file.artist) == ("Hymne", "Ansa Verrill")
        else:
            assert (file.title, file.album, file.artist) == (TAGS.title, "Hÿmne", "Ånsa Verrill")
        assert file.tracknumber == "5/13"


@pytest.mark.parametrize("kind", SoundFormat)
def test_control_characters_do_not_end_a_tag(kind: SoundFormat) -> None:
    data = encode(tone(4096), RATE, kind, Tags("one\x00two\nthree"))
    with soundfile.SoundFile(io.BytesIO(data)) as file:
        assert file.title == "one two three"


@pytest.mark.parametrize("kind", SoundFormat)
@pytest.mark.parametrize("frames", [0, 1, 100])
def test_very_short_sounds(kind: SoundFormat, frames: int) -> None:
    data = encode(tone(frames), RATE, kind, Tags("short"))
    with soundfile.SoundFile(io.BytesIO(data)) as file:
        assert file.frames == max(frames, 1)


def test_long_ogg_files_do_not_crash_the_encoder() -> None:
    sound = np.zeros((2_700_000, 2), np.float32)
    with soundfile.SoundFile(io.BytesIO(encode(sound, RATE, SoundFormat.OGG, TAGS))) as file:
        assert file.frames == len(sound)


@pytest.mark.parametrize("kind", [SoundFormat.MP3, SoundFormat.WAV, SoundFormat.FLAC])
def test_equal_sound_makes_equal_bytes(kind: SoundFormat) -> None:
    assert encode(tone(20_000), RATE, kind, TAGS) == encode(tone(20_000), RATE, kind, TAGS)


def test_dither_keeps_a_sound_below_one_step() -> None:
    # Half a step of 16 bits: rounding alone would leave silence.
    quiet = tone(RATE, 1) / np.float32(32768.0)
    found, _ = soundfile.read(io.BytesIO(encode(quiet, RATE, SoundFormat.WAV, TAGS)))
    turn = np.exp(-2j * np.pi * 440.0 * np.arange(RATE) / RATE)
    amplitude = 2 * abs(np.mean(found * turn))
    assert amplitude == pytest.approx(0.5 / 32768.0, rel=0.1)


@pytest.mark.parametrize(
    "bad",
    [
        np.full((10, 2), 1.5, np.float32),
        np.full((10, 2), np.nan, np.float32),
        np.zeros((10, 2)),
        np.zeros((10, 3), np.float32),
    ],
)
def test_samples_that_are_no_sound(bad: np.ndarray) -> None:
    with pytest.raises(ValueError, match=r"samples|channels"):
        encode(bad, RATE, SoundFormat.WAV, TAGS)
