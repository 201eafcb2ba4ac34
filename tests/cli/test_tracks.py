"""Learning tracks as a section leader meets them: folders, names, tags, archives, text."""

from __future__ import annotations

import io
import os
import signal
import subprocess
import sys
import time
import zipfile
from pathlib import Path

import numpy as np
import pytest
import soundfile

from tests.adapters.test_soundfont import font_bytes, needs_player
from tests.cli.conftest import FIXTURES, Run, tree
from tests.voice.measuring import measured_hz

SHORT = ("--bars", "1-2", "--count-in", "0", "--starting-notes", "none")


def test_the_folder_that_is_handed_on(run: Run, hymn: Path, tmp_path: Path) -> None:
    done = run("tracks", hymn, "-o", tmp_path, "--bars", "1-2", "--archives")
    assert done.code == 0, done.err
    files = {name for name in tree(tmp_path) if not name.startswith(".")}
    assert {
        "How to use.txt",
        "tracks/00 Full mix - harbour-hymn.mp3",
        "tracks/Soprano/01 Soprano predominant - harbour-hymn.mp3",
        "tracks/Alto/05 Alto alone - harbour-hymn.mp3",
        "tracks/Bass/12 Bass missing - harbour-hymn.mp3",
        "midi/Full mix - harbour-hymn.mid",
        "midi/Alto/Alto predominant - harbour-hymn.mid",
        "archives/Alto - harbour-hymn.zip",
    } <= files
    assert len(files) == 1 + 13 + 13 + 4
    assert max(map(len, done.err.splitlines()[:-1])) <= 80
    with soundfile.SoundFile(tmp_path / "tracks/Alto/05 Alto alone - harbour-hymn.mp3") as file:
        assert file.title == "Alto alone - Hymn for the Blessing of the Nets"
        assert file.album == "Hymn for the Blessing of the Nets"
        assert file.tracknumber == "6/13"
    lengths = {soundfile.info(p).frames for p in tmp_path.rglob("*.mp3")}
    assert len(lengths) == 1


def test_an_archive_holds_what_a_section_needs(run: Run, hymn: Path, tmp_path: Path) -> None:
    assert run("tracks", hymn, "-o", tmp_path, *SHORT, "--archives", "--part", "Alto").code == 0
    with zipfile.ZipFile(tmp_path / "archives" / "Alto - harbour-hymn.zip") as archive:
        assert archive.testzip() is None
        assert sorted(archive.namelist()) == [
            "Alto - harbour-hymn/00 Full mix - harbour-hymn.mp3",
            "Alto - harbour-hymn/01 Alto predominant - harbour-hymn.mp3",
            "Alto - harbour-hymn/02 Alto alone - harbour-hymn.mp3",
            "Alto - harbour-hymn/03 Alto missing - harbour-hymn.mp3",
            "Alto - harbour-hymn/How to use.txt",
        ]
        inside = archive.read("Alto - harbour-hymn/02 Alto alone - harbour-hymn.mp3")
    outside = tmp_path / "tracks" / "Alto" / "02 Alto alone - harbour-hymn.mp3"
    assert inside == outside.read_bytes()


def test_make_writes_tracks_too(run: Run, hymn: Path, tmp_path: Path) -> None:
    done = run("make", hymn, "-o", tmp_path, *SHORT, "--audio", "ogg", "--part", "Bass")
    assert done.code == 0, done.err
    files = tree(tmp_path)
    assert "tracks/Bass/01 Bass predominant - harbour-hymn.ogg" in files
    assert "notes/harbour-hymn.notes.json" in files
    text = (tmp_path / "How to use.txt").read_text("utf-8")
    for words in ("tracks/", "midi/", "tables/", "piano at home", "80", "do not sing through"):
        assert words in text


@pytest.mark.parametrize("kind", ["wav", "flac", "ogg"])
def test_formats(run: Run, hymn: Path, tmp_path: Path, kind: str) -> None:
    done = run("tracks", hymn, "-o", tmp_path, *SHORT, "--part", "Bass", "--audio", kind)
    assert done.code == 0, done.err
    found = list(tmp_path.rglob(f"*.{kind}"))
    assert len(found) == 4
    assert all(soundfile.info(path).format.lower().startswith(kind[:3]) for path in found)


def test_text_speaks_of_what_is_there(run: Run, hymn: Path, tmp_path: Path) -> None:
    wishes = ("--sides", "--compare", "1-2", "--drone", "tonic", "--part", "Alto")
    done = run("tracks", hymn, "-o", tmp_path / "a", "--bars", "1-2", *wishes, "--audio", "ogg")
    assert done.code == 0, done.err
    text = " ".join((tmp_path / "a" / "How to use.txt").read_text("utf-8").split())
    for words in ("the same ear", "equal temperament", "drone", "your own first note"):
        assert words in text
    assert any("Alto left, others right" in name for name in tree(tmp_path / "a"))
    done = run("tracks", hymn, "-o", tmp_path / "b", *SHORT, "--part", "Alto", "--audio", "ogg")
    plain = " ".join((tmp_path / "b" / "How to use.txt").read_text("utf-8").split())
    for words in ("the same ear", "drone", "your own first note"):
        assert words not in plain


def test_equal_twin_beside_the_just_tracks(run: Run, hymn: Path, tmp_path: Path) -> None:
    wishes = (*SHORT, "--part", "Alto", "--audio", "wav")
    assert run("tracks", hymn, "-o", tmp_path, *wishes).code == 0
    assert run("tracks", hymn, "-o", tmp_path, *wishes, "--temperament", "equal").code == 0
    names = [path.name for path in tmp_path.rglob("*Alto alone*.wav")]
    assert sorted(names) == [
        "02 Alto alone (equal) - harbour-hymn.wav",
        "02 Alto alone - harbour-hymn.wav",
    ]
    heard = {}
    for path in tmp_path.rglob("*Alto alone*.wav"):
        sound, rate = soundfile.read(path)
        # The hymn's alto begins on E flat 4, key 63.
        heard["equal" in path.name] = measured_hz(
            sound[round(0.2 * rate) : round(0.6 * rate)].sum(axis=1), 311.13
        )
    assert heard[True] == pytest.approx(440.0 * 2 ** (-6 / 12), abs=0.01)
    assert abs(1200 * np.log2(heard[False] / heard[True])) > 3.0


def test_export_audio_alone_to_standard_output(hymn: Path) -> None:
    command = [sys.executable, "-m", "retune", "export", str(hymn), "--to", "audio", "-o", "-"]
    wishes = ["--bars", "1-2", "--set", "audio.format=flac"]
    done = subprocess.run([*command, *wishes], check=True, capture_output=True)
    assert soundfile.info(io.BytesIO(done.stdout)).format == "FLAC"


@needs_player
def test_through_a_sound_font(run: Run, hymn: Path, tmp_path: Path) -> None:
    font = tmp_path / "exact.sf2"
    font.write_bytes(font_bytes())
    wishes = (*SHORT, "--part", "Alto", "--audio", "wav")
    done = run("tracks", hymn, "-o", tmp_path / "o", *wishes, "--soundfont", font)
    assert done.code == 0, done.err
    (path,) = (tmp_path / "o").rglob("*Alto alone*.wav")
    sound, rate = soundfile.read(path)
    hz = measured_hz(sound[round(0.2 * rate) : round(0.6 * rate)].sum(axis=1), 311.8)
    built_in = run("tracks", hymn, "-o", tmp_path / "b", *wishes)
    assert built_in.code == 0
    (path,) = (tmp_path / "b").rglob("*Alto alone*.wav")
    sound, rate = soundfile.read(path)
    own = measured_hz(sound[round(0.2 * rate) : round(0.6 * rate)].sum(axis=1), 311.8)
    # The font's key 69 sounds at 441 Hz.
    assert abs(1200 * np.log2(hz / own * 440 / 441)) < 1.0


def test_a_missing_sound_font_is_one_clear_line(run: Run, hymn: Path, tmp_path: Path) -> None:
    done = run("tracks", hymn, "-o", tmp_path / "out", "--soundfont", tmp_path / "none.sf2")
    assert done.code == 1
    error = done.err[done.err.index("Error:") :]
    assert "none.sf2" in error
    assert error.count("Error:") == 1
    # What needs no font is done.
    files = tree(tmp_path / "out")
    assert any(name.startswith("midi/") for name in files)
    assert not any(name.startswith("tracks/") for name in files)


def test_vowels_follow_the_text(run: Run, tmp_path: Path) -> None:
    score = FIXTURES / "lamp-night.musicxml"
    wishes = ("--bars", "5-6", "--part", "Alto", "--audio", "wav", "--count-in", "0")
    assert run("tracks", score, "-o", tmp_path / "a", *wishes).code == 0
    assert run("tracks", score, "-o", tmp_path / "b", *wishes, "--language", "german").code == 0
    (plain,) = (tmp_path / "a").rglob("*alone*.wav")
    (worded,) = (tmp_path / "b").rglob("*alone*.wav")
    assert plain.read_bytes() != worded.read_bytes()


def test_an_interrupt_while_rendering_leaves_nothing(hymn: Path, tmp_path: Path) -> None:
    out = tmp_path / "out"
    process = subprocess.Popen(
        [sys.executable, "-m", "retune", "tracks", str(hymn), "-o", str(out), "--bars", "1-12"],
        stderr=subprocess.PIPE,
        text=True,
        env={**os.environ, "OMP_NUM_THREADS": "1"},
    )
    deadline = time.monotonic() + 60
    staged = out / ".none"
    while not staged.exists() and time.monotonic() < deadline and process.poll() is None:
        # Files are staged in a hidden folder while others are still being rendered.
        staged = next(out.glob(".retune-staging-*/0"), out / ".none") if out.exists() else staged
        time.sleep(0.02)
    process.send_signal(signal.SIGINT)
    _, err = process.communicate(timeout=60)
    assert process.returncode == 130, err
    assert tree(tmp_path) == set()


def test_what_can_be_written_is_written(run: Run, tmp_path: Path) -> None:
    """Forty parts are too many for one MIDI file's channels; all else is done, exit code 1."""
    parts = "".join(
        f'<score-part id="P{n}"><part-name>Voice {n}</part-name></score-part>' for n in range(40)
    )
    steps = ("C", "E", "G", "C")
    bodies = "".join(
        f'<part id="P{n}"><measure number="1"><attributes><divisions>1</divisions></attributes>'
        f"<note><pitch><step>{steps[n % 4]}</step><octave>{3 + n % 4 // 2}</octave></pitch>"
        "<duration>4</duration><type>whole</type></note></measure></part>"
        for n in range(40)
    )
    score = tmp_path / "forty.musicxml"
    score.write_text(
        f'<score-partwise version="4.0"><part-list>{parts}</part-list>{bodies}</score-partwise>'
    )
    done = run("make", score, "-o", tmp_path / "out", "--part", "Voice 7", "--audio", "ogg")
    files = tree(tmp_path / "out")
    assert "notes/forty.notes.csv" in files
    assert "tracks/Voice 7/01 Voice 7 predominant - forty.ogg" in files
    assert {name for name in files if name.endswith(".html")} == {
        "forty.html",
        "forty - Voice 7.html",
    }
    midi = [name for name in files if name.startswith("midi/")]
    assert (done.code, bool(midi)) in ((1, False), (0, True)), done.err
    if done.code:
        assert "channel" in done.err
