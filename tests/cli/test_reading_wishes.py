"""`--transpose` and `--tempo` as a user gives them, on every command that reads a score."""

from __future__ import annotations

import io
import json
from fractions import Fraction
from pathlib import Path
from typing import Any

import mido
import pytest

from tests.cli.conftest import Run, tree


def notes_of(run: Run, hymn: Path, folder: Path, *options: str) -> list[dict[str, Any]]:
    done = run("export", hymn, "--to", "notes", "-o", folder, *options)
    assert done.code == 0, done.err
    (file,) = folder.rglob("*.notes.json")
    return list(json.loads(file.read_text())["notes"])


def test_note_list_is_moved_with_the_same_cents(run: Run, hymn: Path, tmp_path: Path) -> None:
    plain = notes_of(run, hymn, tmp_path / "a")
    moved = notes_of(run, hymn, tmp_path / "b", "--transpose", "-3")
    for old, new in zip(plain, moved, strict=True):
        assert new["key"] == old["key"] - 3
    # E flat major, a minor third down: C major, without any sign (circle of fifths).
    assert moved[0]["pitch"] == plain[0]["pitch"].translate({ord("G"): "E"})
    cents = [[s["cents"] for s in note["segments"]] for note in plain]
    assert cents == [[s["cents"] for s in note["segments"]] for note in moved]


def test_seconds_follow_the_tempo(run: Run, hymn: Path, tmp_path: Path) -> None:
    plain = notes_of(run, hymn, tmp_path / "a")
    slow = notes_of(run, hymn, tmp_path / "b", "--tempo", "50%")
    steady = notes_of(run, hymn, tmp_path / "c", "--tempo", "60", "--no-fermatas")
    for old, new, beat in zip(plain, slow, steady, strict=True):
        assert new["seconds"] == pytest.approx(2 * old["seconds"], abs=2e-6)
        # In 4/4 at 60 a minute a quarter note is a second.
        assert beat["seconds"] == pytest.approx(float(Fraction(beat["onset"])), abs=1e-6)


def test_tracks_are_moved_and_slowed(run: Run, hymn: Path, tmp_path: Path) -> None:
    done = run(
        "tracks", hymn, "-o", tmp_path, "--audio", "none", "--count-in", "0",
        "--starting-notes", "none", "--no-fermatas", "--transpose", "2", "--tempo", "60",
        "--part", "Alto",
    )  # fmt: skip
    assert done.code == 0, done.err
    (name,) = [name for name in tree(tmp_path) if name.endswith(".mid") and "alone" in name]
    file = mido.MidiFile(tmp_path / name)
    # MIDI 1.0: a tempo is microseconds to the quarter note.
    tempi = [m.tempo for track in file.tracks for m in track if m.type == "set_tempo"]
    assert tempi == [1_000_000]
    keys = [m.note for track in file.tracks for m in track if m.type == "note_on" and m.velocity]
    assert keys[0] == 63 + 2  # the alto begins on E flat 4


def test_show_names_the_part_that_leaves_its_range(run: Run, hymn: Path) -> None:
    plain = run("show", hymn)
    assert "usual range" not in plain.err
    done = run("show", hymn, "--transpose", "9")
    assert done.code == 0
    said = " ".join(done.err.split())
    assert "doubt: Bass, bar 5, beat 3: F4 is 5 semitones above the usual range of a bass" in said
    assert all(len(line) <= 80 for line in (done.out + done.err).splitlines())


def test_tonic_is_named_as_it_stands_in_the_score(run: Run, hymn: Path) -> None:
    done = run("show", hymn, "--transpose", "2", "--tonic", "Eb", "--figures-only")
    assert "home tonic F major" in done.out + done.err


@pytest.mark.parametrize("command", ["make", "tracks", "export", "show"])
@pytest.mark.parametrize(
    ("option", "value", "allowed"),
    [
        ("--transpose", "25", "from -24 to 24"),
        ("--transpose", "-25", "from -24 to 24"),
        ("--transpose", "1.5", "whole number of semitones"),
        ("--transpose", "up", "whole number of semitones"),
        ("--tempo", "fast", "80%"),
        ("--tempo", "9", "10 to 400"),
        ("--tempo", "401%", "10 to 400"),
    ],
)
def test_wrong_values_say_what_is_allowed(
    run: Run, hymn: Path, tmp_path: Path, command: str, option: str, value: str, allowed: str
) -> None:
    out = tmp_path / "out"
    more = () if command == "show" else ("-o", out)
    done = run(command, hymn, *more, *(("--to", "notes") if command == "export" else ()),
               option, value)  # fmt: skip
    assert done.code == 2
    assert option in done.err
    assert allowed in done.err
    assert not out.exists()


def test_too_far_for_midi_names_the_note(run: Run, tmp_path: Path) -> None:
    track = mido.MidiTrack()
    track += [
        mido.Message("note_on", note=120, velocity=80, time=0),
        mido.Message("note_off", note=120, time=480),
    ]
    file, data = mido.MidiFile(ticks_per_beat=480), io.BytesIO()
    file.tracks.append(track)
    file.save(file=data)
    (tmp_path / "high.mid").write_bytes(data.getvalue())
    done = run("show", tmp_path / "high.mid", "--transpose", "9")
    assert done.code == 2
    said = " ".join(done.err.split())
    assert "bar 1, beat 1" in said
    assert "C9 moved up by 9 semitones leaves the keys of MIDI" in said
    assert "At most 7 semitones up" in said


def test_playing_time_is_limited_at_the_wished_tempo(run: Run, hymn: Path) -> None:
    assert run("show", hymn, "--max-minutes", "3").code == 0
    done = run("show", hymn, "--max-minutes", "3", "--tempo", "10%")
    assert done.code == 1
    assert "plays longer than 180 seconds" in " ".join(done.err.split())
