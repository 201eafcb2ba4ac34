"""Sound files as other readers find them: samples, lengths, tags."""

from __future__ import annotations

import io
from pathlib import Path

import numpy as np
import pytest
import soundfile
from tinytag import TinyTag

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


def tags_of(data: bytes, kind: SoundFormat, folder: Path) -> TinyTag:
    """What a reader of tags that knows nothing of this project finds (tinytag)."""
    path = folder / f"sound.{kind}"
    path.write_bytes(data)
    return TinyTag.get(path)


def other(found: TinyTag, name: str) -> str:
    return "|".join(found.other.get(name, []))


@pytest.mark.parametrize("kind", SoundFormat)
def test_tags_as_another_reader_finds_them(kind: SoundFormat, tmp_path: Path) -> None:
    found = tags_of(encode(tone(4096), RATE, kind, TAGS), kind, tmp_path)
    wav = kind is SoundFormat.WAV
    # A WAV file has its title twice: in plain letters in INFO, and as it is.
    titles = [found.title or "", *found.other.get("title", [])]
    assert TAGS.title in titles
    assert all(title == TAGS.title or (wav and title.isascii()) for title in titles)
    albums = [found.album or "", *found.other.get("album", [])]
    assert "Hÿmne" in albums
    assert "Ånsa Verrill" in [found.artist, *found.other.get("artist", [])]
    assert found.composer == "Ånsa Verrill"
    assert other(found, "lyricist") == "L. Ömm"
    assert "2026 the choir" in found.other["copyright"]
    assert (found.track, found.track_total) == (5, 13)
    assert "Erste Zeile\nzweite" in other(found, "lyrics")
    comments = [found.comment or "", *found.other.get("comment", [])]
    assert any("quietly" in comment for comment in comments)


@pytest.mark.parametrize("kind", SoundFormat)
def test_tags_as_the_sound_library_finds_them(kind: SoundFormat) -> None:
    with soundfile.SoundFile(io.BytesIO(encode(tone(4096), RATE, kind, TAGS))) as file:
        if kind is SoundFormat.WAV:
            # The INFO chunk of RIFF is ASCII.
            assert file.title.startswith("Alto predominant - ")
            assert (file.album, file.artist) == ("Hymne", "Ansa Verrill")
        else:
            assert (file.title, file.album, file.artist) == (TAGS.title, "Hÿmne", "Ånsa Verrill")
        # Vorbis comments have the number of tracks in a field of its own.
        whole = kind in (SoundFormat.MP3, SoundFormat.WAV)
        assert file.tracknumber == ("5/13" if whole else "5")


@pytest.mark.parametrize("kind", SoundFormat)
def test_track_0_is_a_track(kind: SoundFormat, tmp_path: Path) -> None:
    found = tags_of(encode(tone(4096), RATE, kind, Tags("all", track=0, of=13)), kind, tmp_path)
    assert found.track_total == 13
    with soundfile.SoundFile(tmp_path / f"sound.{kind}") as file:
        assert file.tracknumber.split("/")[0] == "0"


@pytest.mark.parametrize("kind", SoundFormat)
def test_control_characters_do_not_end_a_tag(kind: SoundFormat, tmp_path: Path) -> None:
    tags = Tags("one\x00two\nthree", lyrics="a\x00b\r\nc\x1bd\re", language="eng")
    found = tags_of(encode(tone(4096), RATE, kind, tags), kind, tmp_path)
    assert found.title == "one two three"
    assert "a b\nc d\ne" in other(found, "lyrics")


@pytest.mark.parametrize("kind", SoundFormat)
def test_odd_text_and_no_text(kind: SoundFormat, tmp_path: Path) -> None:
    found = tags_of(encode(tone(4096), RATE, kind, Tags("\ud800 x")), kind, tmp_path)
    assert found.title == "? x"
    assert tags_of(encode(tone(4096), RATE, kind, Tags("")), kind, tmp_path).title is None


@pytest.mark.parametrize("kind", SoundFormat)
@pytest.mark.parametrize("size", [70_000, 40_000, 255 * 255, 1])
def test_long_lyrics_leave_the_sound_as_it_was(
    kind: SoundFormat, size: int, tmp_path: Path
) -> None:
    # Longer than a page of an Ogg stream holds, 255 segments of 255 bytes.
    long, plain = Tags("x", lyrics="ö" * size), Tags("x")
    found = tags_of(encode(tone(20_000), RATE, kind, long), kind, tmp_path)
    assert "ö" * min(size, 60_000) in other(found, "lyrics")
    sound, _ = soundfile.read(tmp_path / f"sound.{kind}")
    expected, _ = soundfile.read(io.BytesIO(encode(tone(20_000), RATE, kind, plain)))
    assert np.array_equal(sound, expected)


def test_an_mp3_file_has_one_tag() -> None:
    data = encode(tone(20_000), RATE, SoundFormat.MP3, TAGS)
    assert data.count(b"ID3") == 1
    assert data[-128:-125] != b"TAG"


@pytest.mark.parametrize(
    ("text", "frame"),
    [
        ("2026 the choir", "2026 the choir"),
        ("Copyright © 2026, the choir", "2026 the choir"),
        ("(c) 1999 A", "1999 A"),
        ("all rights reserved", None),
        ("", None),
    ],
)
def test_copyright_begins_with_a_year(text: str, frame: str | None, tmp_path: Path) -> None:
    # ID3v2.3, 4.2.1, TCOP: a year and a space; "Copyright ©" is the player's to say.
    tags = Tags("x", copyright=text)
    found = tags_of(encode(tone(4096), RATE, SoundFormat.MP3, tags), SoundFormat.MP3, tmp_path)
    assert found.other.get("copyright") == (None if frame is None else [frame])


def test_chunks_of_a_wav_file_fill_it() -> None:
    # RIFF: sizes without padding, every chunk at an even place.
    for title in ("x", "xy"):
        data = encode(tone(101, 1), RATE, SoundFormat.WAV, Tags(title, comment="odd"))
        names, at = [], 12
        while at < len(data):
            names.append(data[at : at + 4])
            size = int.from_bytes(data[at + 4 : at + 8], "little")
            at += 8 + size + size % 2
        assert at == len(data) == int.from_bytes(data[4:8], "little") + 8
        assert names == [b"fmt ", b"LIST", b"data", b"id3 "]


def ogg_crc(page: bytes) -> int:
    """RFC 3533, 6: generator 0x04c11db7, high bit first, from 0, over a page with no CRC."""
    crc = 0
    for byte in page[:22] + bytes(4) + page[26:]:
        crc ^= byte << 24
        for _ in range(8):
            crc = (crc << 1 ^ (0x104C11DB7 if crc & 0x80000000 else 0)) & 0xFFFFFFFF
    return crc


def test_pages_of_an_ogg_file_by_the_standard() -> None:
    data = encode(tone(30_000), RATE, SoundFormat.OGG, Tags("x", lyrics="ö" * 60_000))
    at, numbers, flags, positions = 0, [], [], []
    while at < len(data):
        lacing = data[at + 27 : at + 27 + data[at + 26]]
        end = at + 27 + len(lacing) + sum(lacing)
        page = data[at:end]
        assert page[:5] == b"OggS\x00"
        assert page[14:18] == (1).to_bytes(4, "little")
        assert int.from_bytes(page[22:26], "little") == ogg_crc(page)
        numbers.append(int.from_bytes(page[18:22], "little"))
        flags.append(page[5])
        positions.append(int.from_bytes(page[6:14], "little", signed=True))
        at = end
    assert numbers == list(range(len(numbers)))
    # Begin of stream; the comments go on over the second and third page; end of stream.
    assert flags[:3] == [2, 0, 1]
    assert flags[-1] == 4
    assert positions[:3] == [0, -1, 0]
    assert positions[-1] == 30_000


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


@pytest.mark.parametrize("kind", SoundFormat)
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


def test_a_language_that_is_no_code() -> None:
    with pytest.raises(ValueError, match="ISO 639-2"):
        encode(tone(100), RATE, SoundFormat.MP3, Tags("x", lyrics="y", language="de"))
