"""Playing through a sound font: pitch measured against one that is exactly tuned.

The font is made here by the SoundFont 2.04 specification (Creative Technology, 2006): one
sawtooth-like cycle whose length makes key 69 sound at exactly 441 Hz at 44.1 kHz.
"""

from __future__ import annotations

import os
import struct
import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
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


def font_bytes(program: int = 53, bank: int = 0) -> bytes:
    """A font with one looped sample in one preset."""
    cycle = 100  # frames: 441 Hz at 44.1 kHz
    time = np.arange(cycle * 42) / cycle
    wave = sum(np.sin(2 * np.pi * n * time) / n for n in range(1, 11))
    samples = (0.3 * 32767 * wave / 2).astype("<i2").tobytes() + b"\x00" * 92
    loop_end = cycle * 40
    sample = struct.pack(
        "<20sIIIIIBbHH", b"saw", 0, cycle * 42, cycle * 10, loop_end, RATE, 69, 0, 0, 1
    ) + struct.pack("<20sIIIIIBbHH", b"EOS", 0, 0, 0, 0, 0, 0, 0, 0, 0)
    preset = struct.pack("<20sHHHIII", b"voice", program, bank, 0, 0, 0, 0)
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


def note(start: float, stop: float, *keys: float, velocity: int = 90) -> FontNote:
    """A note that moves from key to key in equal times."""
    span = (stop - start) / len(keys)
    return FontNote(start, stop, velocity, tuple((start + span * i, k) for i, k in enumerate(keys)))


@needs_player
def test_every_pitch_is_within_a_thirty_second_of_a_cent(font: Path) -> None:
    # Just intervals to each side of their keys, and what lies between two of them.
    keys = [48.0, 52.0 - 0.13686, 55.01955, 60.15641, 64.3117, 69.0, 71.777, 57.49, 57.505]
    notes = [note(2.0 * i, 2.0 * i + 1.8, k) for i, k in enumerate(keys)]
    sound = render(notes, 53, 2.0 * len(keys), font)
    assert len(sound) == 2 * RATE * len(keys)
    for index, key in enumerate(keys):
        # 1/32 cent by the steps, the rest for measuring.
        assert abs(heard_cents(sound, 2 * index + 0.3, 2 * index + 1.6, key)) < 0.04


@needs_player
def test_notes_that_sound_together_keep_their_own_pitch(font: Path) -> None:
    keys = (60.0, 63.8631, 67.0196)
    alone = [render([note(0.0, 2.0, key)], 53, 2.5, font) for key in keys]
    together = render([note(0.0, 2.0, key) for key in keys], 53, 2.5, font)
    assert np.abs(together - sum(alone)).max() < 1e-6
    for key, sound in zip(keys, alone, strict=True):
        assert abs(heard_cents(sound, 0.3, 1.8, key)) < 0.04


@needs_player
def test_more_notes_at_once_than_midi_has_channels(font: Path) -> None:
    keys = [40.0 + 1.0731 * index for index in range(24)]
    together = render([note(0.0, 1.0, key, velocity=40) for key in keys], 53, 1.0, font)
    alone = sum(render([note(0.0, 1.0, key, velocity=40)], 53, 1.0, font) for key in keys)
    # The player swells in the first note of each of its voices over one block of 64 frames.
    assert np.abs(together - alone)[64:].max() < 1e-5


@needs_player
@pytest.mark.parametrize("target", [60.2, 59.951, 65.5, 48.25])
def test_a_held_note_moves(font: Path, target: float) -> None:
    sound = render([note(0.0, 4.0, 60.0, target)], 53, 4.0, font)
    assert abs(heard_cents(sound, 0.3, 1.9, 60.0)) < 0.5
    assert abs(heard_cents(sound, 2.2, 3.8, target)) < 0.5


@needs_player
def test_a_move_favours_the_pitch_that_lasts(font: Path) -> None:
    moving = FontNote(0.0, 4.0, 90, ((0.0, 60.0), (0.4, 60.105)))
    sound = render([moving], 53, 4.0, font)
    assert abs(heard_cents(sound, 1.0, 3.8, 60.105)) < 0.1


@needs_player
def test_notes_begin_and_end_where_they_should(font: Path) -> None:
    start = 12_345  # no multiple of the player's 64 frames
    sound = render([note(start / RATE, start / RATE + 0.5, 62.3)], 53, 2.0, font)
    # The font's sample is 0 in its first frame.
    assert np.flatnonzero(sound)[0] == pytest.approx(start, abs=1)
    # The release of the font is over in some hundredths of a second.
    assert np.flatnonzero(sound)[-1] < start + 0.55 * RATE
    assert np.abs(sound[start + 21_000 : start + 22_000]).max() > 0.01


@needs_player
def test_order_of_notes_and_threads_change_nothing(font: Path) -> None:
    notes = [note(0.1 * i, 0.1 * i + 0.5, 60.0 + 0.3137 * i) for i in range(10)]
    once = render(notes, 53, 2.0, font)
    with ThreadPoolExecutor(2) as pool:
        found = list(pool.map(lambda them: render(them, 53, 2.0, font), [notes, notes[::-1]]))
    for sound in found:
        assert np.array_equal(once, sound)


@needs_player
@pytest.mark.parametrize("rate", [22_050, 48_000])
def test_other_rates(font: Path, rate: int) -> None:
    sound = render([note(0.0, 2.0, 69.137)], 53, 2.0, font, rate)
    assert len(sound) == 2 * rate
    near = hz_of(69.137, 0.0, REFERENCE)
    # The measure counts in frames of 44.1 kHz.
    hz = measured_hz(sound[rate // 5 :].astype(float), near * RATE / rate) * rate / RATE
    assert abs(1200.0 * np.log2(hz / near)) < 0.04


@needs_player
def test_silence_is_silence_and_sound_is_bounded(font: Path) -> None:
    assert not render([], 53, 0.5, font).any()
    assert not render([note(3.0, 4.0, 60.0)], 53, 0.5, font).any()
    assert len(render([note(0.0, 0.0, 60.0)], 53, 0.0, font)) == 0
    loud = [note(0.0, 1.0, 50.0 + 0.31 * i, velocity=127) for i in range(60)]
    sound = render(loud, 53, 1.2, font)
    assert 0.99 < np.abs(sound).max() <= 1.0


@needs_player
def test_a_program_or_kit_that_the_font_lacks(font: Path) -> None:
    with pytest.raises(OutputError, match="no program 52") as caught:
        render([note(0.0, 1.0, 60.0)], 52, 1.0, font)
    assert str(font) in str(caught.value.where)
    with pytest.raises(OutputError, match="no drum kit"):
        render([note(0.0, 0.1, 76.0)], 0, 1.0, font, percussion=True)


@needs_player
def test_struck_notes_of_a_kit_ring_on(tmp_path: Path) -> None:
    kit = tmp_path / "kit.sf2"
    kit.write_bytes(font_bytes(program=0, bank=128))
    sound = render([note(0.25, 0.3, 69.0)], 0, 2.0, kit, percussion=True)
    assert not sound[: RATE // 4].any()
    assert abs(heard_cents(sound, 0.5, 1.9, 69.0)) < 0.04


@pytest.mark.parametrize(
    ("start", "stop", "velocity", "pitches"),
    [
        (0.0, 1.0, 0, ((0.0, 60.0),)),
        (0.0, 1.0, 128, ((0.0, 60.0),)),
        (1.0, 0.5, 90, ((1.0, 60.0),)),
        (-1.0, 0.5, 90, ((-1.0, 60.0),)),
        (0.0, float("inf"), 90, ((0.0, 60.0),)),
        (0.0, 1.0, 90, ()),
        (0.0, 1.0, 90, ((0.5, 60.0),)),
        (0.0, 1.0, 90, ((0.0, 60.0), (0.6, 61.0), (0.5, 62.0))),
    ],
)
def test_notes_that_cannot_be(
    start: float, stop: float, velocity: int, pitches: tuple[tuple[float, float], ...]
) -> None:
    with pytest.raises(ValueError, match=r"pitches|velocity"):
        FontNote(start, stop, velocity, pitches)


def test_files_that_are_no_font(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="cannot be read"):
        require_soundfont(tmp_path / "missing.sf2")
    other = tmp_path / "other.sf2"
    other.write_bytes(b"RIFF\x00\x00\x00\x00WAVE")
    with pytest.raises(OutputError, match="no sound font"):
        require_soundfont(other)
    with pytest.raises(OutputError, match="no sound font"):
        require_soundfont(tmp_path)


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no named pipes on this system")
def test_a_pipe_is_not_waited_for(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe.sf2")
    with pytest.raises(OutputError, match="no sound font"):
        require_soundfont(tmp_path / "pipe.sf2")


@needs_player
def test_a_broken_font(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    broken = tmp_path / "broken.sf2"
    broken.write_bytes(font_bytes()[:200])
    with pytest.raises(OutputError, match="cannot be loaded"):
        require_soundfont(broken)
    assert capfd.readouterr().err == ""


@needs_player
@pytest.mark.parametrize("ci", ["", "true"])
def test_nothing_is_printed(font: Path, ci: str) -> None:
    code = """
import sys, pathlib
from retune.adapters.soundfont import FontNote, render, require_soundfont
path = pathlib.Path(sys.argv[1])
require_soundfont(path)
render([FontNote(0.0, 0.1, 90, ((0.0, 60.3),))], 53, 0.2, path)
try:
    render([FontNote(0.0, 0.1, 90, ((0.0, 60.3),))], 7, 0.2, path)
except Exception as error:
    assert "no program 7" in str(error)
else:
    raise SystemExit(1)
"""
    done = subprocess.run(
        [sys.executable, "-c", code, str(font)],
        capture_output=True,
        check=False,
        env={**os.environ, "CI": ci},
    )
    assert (done.returncode, done.stdout, done.stderr) == (0, b"", b"")


def test_no_player_is_told_with_what_to_install(
    font: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(__import__("sys").modules, "fluidsynth", None)
    with pytest.raises(OutputError) as caught:
        require_soundfont(font)
    assert "libfluidsynth3" in caught.value.hint
    assert "pip install" in caught.value.hint


@needs_player
def test_no_c_library_is_told_with_what_to_install(
    font: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    # The package looks for the library while it is imported.
    monkeypatch.delitem(sys.modules, "fluidsynth", raising=False)
    monkeypatch.setattr("ctypes.util.find_library", lambda name: None)
    monkeypatch.delenv("HOMEBREW_PREFIX", raising=False)
    with pytest.raises(OutputError) as caught:
        require_soundfont(font)
    assert "libfluidsynth3" in caught.value.hint
