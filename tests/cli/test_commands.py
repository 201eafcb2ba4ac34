"""The commands as a user meets them: what they write, print and return."""

from __future__ import annotations

import json
import re
import subprocess
import sys
from pathlib import Path

import pytest

from tests.cli.conftest import FIXTURES, Run, tree

SCORES = sorted([*FIXTURES.glob("*.musicxml"), *FIXTURES.glob("*.mxl")])


@pytest.mark.parametrize("score", SCORES, ids=lambda p: p.name)
def test_make_writes_the_folder_of_the_design(run: Run, score: Path, tmp_path: Path) -> None:
    done = run("make", score, "-o", tmp_path / "out", "--audio", "none")
    assert done.code == 0, done.err
    files, name = tree(tmp_path / "out"), score.stem
    assert {
        "How to use.txt",
        f"midi/Full mix - {name}.mid",
        f"notes/{name}.notes.csv",
        f"notes/{name}.notes.json",
        f"tables/{name}.scl",
        f"tables/{name}.kbm",
        f"tables/{name}.tables.csv",
    } <= files
    lines = [line for line in done.err.splitlines() if not line.startswith("Wrote")]
    assert max(len(line) for line in lines) <= 80


def test_make_without_o_writes_beside_the_score(run: Run, hymn: Path, tmp_path: Path) -> None:
    score = tmp_path / "my hymn.musicxml"
    score.write_bytes(hymn.read_bytes())
    assert run("make", score, "--audio", "none").code == 0
    assert (tmp_path / "my hymn" / "midi" / "Full mix - my hymn.mid").is_file()


def test_make_again_replaces_its_own_files_only(run: Run, hymn: Path, tmp_path: Path) -> None:
    assert run("make", hymn, "--audio", "none", "-o", tmp_path).code == 0
    before = tree(tmp_path)
    assert run("make", hymn, "--audio", "none", "-o", tmp_path, "--set", "scala.tables=3").code == 0
    assert len([name for name in tree(tmp_path) if name.endswith(".scl")]) == 4
    assert run("make", hymn, "--audio", "none", "-o", tmp_path).code == 0
    assert tree(tmp_path) == before
    note_list = tmp_path / "notes" / "harbour-hymn.notes.csv"
    note_list.write_text("mine now")
    refused = run("make", hymn, "--audio", "none", "-o", tmp_path)
    assert refused.code == 1
    assert "harbour-hymn.notes.csv" in refused.err
    assert note_list.read_text() == "mine now"
    assert tree(tmp_path) == before


def test_export_writes_what_was_asked(run: Run, hymn: Path, tmp_path: Path) -> None:
    assert run("export", hymn, "--to", "midi", "-o", tmp_path).code == 0
    assert {f for f in tree(tmp_path) if not f.startswith(".")} == {
        "midi/Full mix - harbour-hymn.mid"
    }


def test_export_to_standard_output_is_the_file(hymn: Path, tmp_path: Path) -> None:
    arguments = [sys.executable, "-m", "retune", "export", str(hymn), "--to", "midi", "-o"]
    piped = subprocess.run([*arguments, "-"], check=True, capture_output=True)
    subprocess.run([*arguments, str(tmp_path)], check=True, capture_output=True)
    assert piped.stdout == (tmp_path / "midi" / "Full mix - harbour-hymn.mid").read_bytes()
    assert piped.stdout[:4] == b"MThd"


@pytest.mark.parametrize("columns", [80, 120])
def test_show_fits_its_width(
    run: Run, hymn: Path, columns: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", str(columns))
    done = run("show", hymn)
    assert done.code == 0
    assert max(len(line) for line in done.out.splitlines()) <= columns
    assert "\x1b" not in done.out
    for word in ("bar", "beat", "chord", "Soprano", "Alto", "Tenor", "Bass"):
        assert word in done.out


@pytest.mark.parametrize("score", SCORES, ids=lambda p: p.name)
def test_show_works_on_every_bundled_score(run: Run, score: Path) -> None:
    done = run("show", score, "--findings")
    assert done.code == 0, done.err
    assert max(len(line) for line in done.out.splitlines()) <= 80


def test_show_limits_to_bars(run: Run, hymn: Path) -> None:
    done = run("show", hymn, "--bars", "5-6")
    bars = {m[1] for line in done.out.splitlines() if (m := re.match(r" (\d+) +\d", line))}
    assert bars == {"5", "6"}


def test_note_list_follows_options(run: Run, hymn: Path, tmp_path: Path) -> None:
    done = run(
        "export", hymn, "--to", "notes", "-o", tmp_path,
        "--reference", "442", "--drift", "anchored", "--prime-limit", "7",
        "--held-shift", "none", "--tonic", "D",
    )  # fmt: skip
    assert done.code == 0, done.err
    data = json.loads((tmp_path / "notes" / "harbour-hymn.notes.json").read_text("utf-8"))
    assert data["format"] == "retune-notes"
    assert data["reference_hz"] == 442.0
    assert data["policy"] == {
        "prime_limit": 7,
        "drift": "anchored",
        "held_shift": 0.0,
        "temperament": "just",
        "tonic": "D",
    }


def test_score_from_standard_input(run: Run, hymn: Path, tmp_path: Path) -> None:
    done = run("export", "-", "--to", "midi", "-o", tmp_path, stdin=hymn.read_bytes())
    assert done.code == 0, done.err
    assert any(name.endswith(".mid") for name in tree(tmp_path))


def test_exporters_lists_options(run: Run) -> None:
    done = run("exporters")
    assert done.code == 0
    for text in ("midi", "scala", "notes", "retune-choir", "midi.channels", "scala.tables"):
        assert text in done.out
    assert max(len(line) for line in done.out.splitlines()) <= 80


@pytest.mark.parametrize(
    "command", ["make", "tracks", "show", "export", "watch", "play", "exporters"]
)
def test_help_has_examples(run: Run, command: str) -> None:
    done = run(command, "--help")
    assert done.code == 0
    examples = done.out.split("Examples:")[1].splitlines()
    assert sum(line.strip().startswith("retune ") for line in examples) >= 2
