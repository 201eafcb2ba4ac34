"""Playing through a sound font: pitch measured against one that is exactly tuned.

The font is made here by the SoundFont 2.04 specification (Creative Technology, 2006): one
sawtooth-like cycle whose length makes key 69 sound at exactly 441 Hz at 44.1 kHz.
"""

from __future__ import annotations

import os
import struct
from pathlib import Path

import numpy as np
import pytest

from retune.adapters import soundfont_player
from retune.adapters.soundfont import FontNote, render, require_soundfont
from retune.errors import OutputError
from retune.units import hz_of
from tests.voice.measuring import measured_hz

RATE = 44_100
REFERENCE = 441.0


def _chunk(name: bytes, data: bytes) -> bytes:
    return name + struct.pack("<I", len(data)) + data + b"\x00" * (len(data) % 2)


def _list(name: bytes, *chunks: bytes) -> bytes:
    return _chunk(b"LIST", name + b"".join(chunks))


def font_bytes() -> bytes:
    """A font with one looped sample in one preset, bank 0, program 53."""
    cycle = 100  # frames: 441 Hz at 44.1 kHz
    time = np.arange(cycle * 42) / cycle
    wave = sum(np.sin(2 * np.pi * n * time) / n for n in range(1, 11))
    samples = (0.3 * 32767 * wave / 2).astype("<i2").tobytes() + b"\x00" * 92
    loop_end = cycle * 40
    sample = struct.pack(
        "<20sIIIIIBbHH", b"saw", 0, cycle * 42, cycle * 10, loop_end, RATE, 69, 0, 0, 1
    ) + struct.pack("<20sIIIIIBbHH", b"EOS", 0, 0, 0, 0, 0, 0, 0, 0, 0)
    preset = struct.pack("<20sHHHIII", b"voice", 53, 0, 0, 0, 0, 0)
    preset += struct.pack("<20sHHHIII", b"EOP", 0, 0, 1, 0, 0, 0)
    none = struct.pack("<HHhHH", 0, 0, 0, 0, 0)
    instrument = struct.pack("<20sH", b"saw", 0) + struct.pack("<20sH", b"EOI", 1)
    loop, sample_id = struct.pack("<HH", 54, 1), struct.pack("<HH", 53, 0)
    return _chunk(
        b"RIFF",
        b"sfbk"
        + _list(
            b"INFO",
            _chunk(b"ifil", struct.pack("<HH", 2, 1)),
            _chunk(b"isng", b"EMU8000\x00"),
            _chunk(b"INAM", b"exact\x00"),
        )
        + _list(b"sdta", _chunk(b"smpl", samples))
        + _list(
            b"pdta",
            _chunk(b"phdr", preset),
            _chunk(b"pbag", struct.pack("<HHHH", 0, 0, 1, 0)),
            _chunk(b"pmod", none),
            _chunk(b"pgen", struct.pack("<HH", 41, 0) + b"\x00" * 4),
            _chunk(b"inst", instrument),
            _chunk(b"ibag", struct.pack("<HHHH", 0, 0, 2, 0)),
            _chunk(b"imod", none),
            _chunk(b"igen", loop + sample_id + b"\x00" * 4),
            _chunk(b"shdr", sample),
        ),
    )


def player_is_there() -> bool:
    try:
        soundfont_player.library()
    except OutputError:
        return False
    return True


needs_player = pytest.mark.skipif(
    not player_is_there() and os.environ.get("CI") != "true",
    reason="needs FluidSynth: sudo apt-get install libfluidsynth3",
)


@pytest.fixture(scope="module")
def font(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("font") / "exact.sf2"
    path.write_bytes(font_bytes())
    return path


def heard_cents(sound: np.ndarray, start: float, stop: float, key: float) -> float:
    """Cents by which a stretch is off a key, on the font's own reference of 441 Hz."""
    near = hz_of(key, 0.0, REFERENCE)
    piece = sound[round(start * RATE) : round(stop * RATE)].astype(float)
    return float(1200.0 * np.log2(measured_hz(piece, near) / near))


@needs_player
def test_every_pitch_is_within_a_cent(font: Path) -> None:
    keys = [48.0, 52.0 - 0.13686, 55.01955, 60.15641, 64.3117, 69.0, 71.777, 57.49]
    notes = [FontNote(2.0 * i, 2.0 * i + 1.8, 90, ((2.0 * i, k),)) for i, k in enumerate(keys)]
    sound = render(notes, 53, 2.0 * len(keys), font)
    assert len(sound) == 2 * RATE * len(keys)
    for index, key in enumerate(keys):
        # FluidSynth knows whole cents only: half a cent, and the rounding of its bends.
        assert abs(heard_cents(sound, 2 * index + 0.3, 2 * index + 1.6, key)) < 0.7


@needs_player
def test_notes_with_other_bends_keep_their_own_channel(font: Path) -> None:
    notes = [FontNote(0.0, 3.0, 90, ((0.0, key),)) for key in (60.0, 63.8631, 67.0196)]
    sound = render(notes, 53, 3.0, font)
    for key in (60.0, 63.8631):
        assert abs(heard_cents(sound, 0.5, 2.5, key)) < 1.0


@needs_player
def test_a_held_note_moves(font: Path) -> None:
    sound = render([FontNote(0.0, 4.0, 90, ((0.0, 60.0), (2.0, 60.2)))], 53, 4.0, font)
    assert abs(heard_cents(sound, 0.3, 1.9, 60.0)) < 0.7
    assert abs(heard_cents(sound, 2.2, 3.8, 60.2)) < 0.7


@needs_player
def test_nothing_is_left_of_silence_and_sound_is_bounded(font: Path) -> None:
    # The player dithers to 16 bits.
    assert np.abs(render([], 53, 0.5, font)).max() < 4 / 32768
    loud = [FontNote(0.0, 1.0, 127, ((0.0, 50.0 + 3.1 * i),)) for i in range(12)]
    assert np.abs(render(loud, 53, 1.2, font)).max() <= 1.0


def test_files_that_are_no_font(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="cannot be read"):
        require_soundfont(tmp_path / "missing.sf2")
    other = tmp_path / "other.sf2"
    other.write_bytes(b"RIFF\x00\x00\x00\x00WAVE")
    with pytest.raises(OutputError, match="no sound font"):
        require_soundfont(other)


@needs_player
def test_a_broken_font(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    broken = tmp_path / "broken.sf2"
    broken.write_bytes(font_bytes()[:200])
    with pytest.raises(OutputError, match="cannot be loaded"):
        require_soundfont(broken)
    assert capfd.readouterr().err == ""


def test_no_player_is_told_with_what_to_install(
    font: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(__import__("sys").modules, "fluidsynth", None)
    with pytest.raises(OutputError) as caught:
        require_soundfont(font)
    assert "libfluidsynth3" in caught.value.hint
    assert "pip install" in caught.value.hint
