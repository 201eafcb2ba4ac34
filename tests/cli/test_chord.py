"""`retune chord` as a user meets it: what it prints, writes and refuses."""

from __future__ import annotations

import io
import json
import re
from pathlib import Path

import pytest
import soundfile

from tests.cli.conftest import Run, tree

CHORDS = [
    "D3 F#4 A4 D5",
    "C3 E3 G3 Bb3",
    "c3,e♭3,g3",
    "C3 E3 G#3",
    "B2 D3 F3 Ab3",
    "C4 Db4 D4",
    "A2",
    "A4 A4",
    "D3 A3",
    "D F# A C E",
    "C1 G3 B3 D4 F4 Ab4 C#5 E5 G5 B5 D6 C8",
]


@pytest.mark.parametrize("text", CHORDS)
@pytest.mark.parametrize("columns", [80, 120])
def test_every_chord_is_told_within_its_width(
    run: Run, text: str, columns: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", str(columns))
    done = run("chord", *text.split())
    assert done.code == 0, done.err
    assert max(map(len, done.out.splitlines())) <= columns
    assert done.err == ""
    assert "cents" in done.out


def test_beats_and_ratios_of_the_issues_example(run: Run) -> None:
    """Beats of a fifth and a major third scale with the lower tone from those on C3 (0.443 and
    5.191, handbook voice.md 3.1): on D3 they are 2^(2/12) times as fast."""
    out = run("chord", "D3", "F#4", "A4", "D5").out
    assert re.search(r"^D major: D3 F#4 A4 D5$", out, re.MULTILINE)
    assert "whole numbers 2:5:6:8" in out
    assert re.search(r"Tenor +F#4 +5:4 +-13\.7 +367\.081 +369\.994", out)
    tenth = re.search(r"D3 F#4 +major tenth 5:2 +(\S+) +(\S+)  5-2 734, 10-4 1468", out)
    assert tenth is not None
    assert float(tenth[1]) == pytest.approx(5.191 * 2 ** (2 / 12), abs=0.005)
    assert tenth[2] == "0"
    assert "Bennett and Rodet 1989" in out
    assert "Sethares 1993" in out
    assert "director and teacher decide" in out


def test_minor_chord_warns_of_the_bright_bass(run: Run) -> None:
    # Common practice, no source, and said so.
    out = " ".join(run("chord", "C3", "G3", "Eb4", "C5").out.split())
    assert "70.7 cents above the minor one of Alto" in out
    assert "8th or 9th (common practice, no source)" in out
    triad = " ".join(run("chord", "C3", "Eb3", "G3").out.split())
    assert "All tones meet first at 785 Hz: the 6th of C3, the 5th of Eb3, the 4th of G3." in triad


def test_options_on_pitches(run: Run) -> None:
    seventh = run("chord", "C3", "E3", "G3", "Bb3", "--prime-limit", "7").out
    assert "whole numbers 4:5:6:7" in seventh
    assert re.search(r"20:25:30:36 +seventh 9:5 \(\+17\.6\)", seventh)
    assert re.search(r"36:45:54:64 +seventh 16:9 \(-3\.9\)", seventh)
    assert "442.000" in run("chord", "A4", "--reference", "442").out
    assert "Am7" in run("chord", "C3", "E3", "G3", "A3", "--root", "A").out.splitlines()[0]
    placed = run("chord", "D3", "F3", "A3", "--tonic", "C").out
    assert "its root +3.9 cents from" in " ".join(placed.split())
    named = run("chord", "D4", "F4", "--voices", "alto,soprano").out
    assert re.search(r"^ Soprano +F4", named, re.MULTILINE)


def test_json_is_one_document(run: Run) -> None:
    done = run("chord", "D3", "F#4", "A4", "D5", "--json")
    found = json.loads(done.out)
    assert (found["format"], found["version"]) == ("retune-chord", 1)
    assert found["whole_numbers"] == [2, 5, 6, 8]
    assert [tone["ratio"] for tone in found["tones"]] == ["1/1", "5/4", "3/2", "1/1"]
    assert found["tones"][1]["cents"] == pytest.approx(-13.686286, abs=1e-6)
    tenth = next(pair for pair in found["pairs"] if pair["ratio"] == "5/2")
    assert tenth["equal_beats"] == pytest.approx(5.191201 * 2 ** (2 / 12), abs=1e-5)
    assert {"low": 10, "high": 4, "hz": pytest.approx(1468.32, abs=0.01)} in tenth["shared"]
    assert found["here"]["roughness"] < found["equal"]["roughness"]
    assert json.loads(run("chord", "C4", "Db4", "D4", "--json").out)["quality"] is None


def test_chord_of_a_score_is_what_show_prints(run: Run, hymn: Path) -> None:
    done = run("chord", "--from", hymn, "--at", "9:3")
    assert done.code == 0, done.err
    assert done.out.startswith("bar 9, beat 3: F7, F dominant seventh: A2 C4 Eb4 F4")
    row = next(
        line
        for line in run("show", hymn, "--bars", "9", "-q").out.splitlines()
        if re.match(r" 9 +3 ", line)
    )
    shown = re.findall(r"([A-G][#b]?\d) +([-+]?\d+)", row)
    for pitch, cents in shown:
        told = re.search(
            rf" {pitch} .* ([-+]?\d+\.\d) +\d+\.\d{{3}} +\d+\.\d{{3}}$", done.out, re.M
        )
        assert told is not None
        assert abs(float(told[1]) - float(cents)) <= 0.55
    equal = run("chord", "--from", hymn, "--at", "9:3", "--temperament", "equal")
    assert equal.code == 0
    assert max(map(len, done.out.splitlines())) <= 80


def test_score_from_standard_input(run: Run, hymn: Path) -> None:
    done = run("chord", "--from", "-", "--at", "1", stdin=hymn.read_bytes())
    assert done.code == 0, done.err
    assert "Eb major" in done.out


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ([], "give pitches"),
        (["H3"], "Did you mean B3?"),
        (["D3", "--at", "3"], "--at goes with --from"),
        (["D3", "--drift", "follow"], "--drift goes with --from"),
        (["D3", "--findings"], "--findings goes with --from"),
        (["D3", "F3", "--vowel", "a"], "--vowel goes with"),
        (["D3", "F3", "--voices", "bass,tenr"], "Did you mean tenor?"),
        (["D3", "F3", "--voices", "bass"], "Name one for each"),
        (["D3", "F3", "--audio", "x.txt"], ".wav"),
        (["D3", "F3", "--picture", "x"], ".svg"),
        (["C9"], "C1 to C8"),
        (["C4"] * 13, "at most 12"),
        (["C4", "--prime-limit", "11"], "'3', '5', '7'"),
    ],
)
def test_wrong_usage_says_what_is_allowed(run: Run, arguments: list[str], words: str) -> None:
    done = run("chord", *arguments)
    assert done.code == 2
    assert done.out == ""
    assert words in " ".join(done.err.split())


@pytest.mark.parametrize(
    ("arguments", "code", "words"),
    [
        (["--from", "HYMN"], 2, "--at BAR:BEAT"),
        (["D3", "--from", "HYMN", "--at", "1"], 2, "not both"),
        (["--from", "HYMN", "--at", "99"], 2, "numbered 1 to 26"),
        (["--from", "HYMN", "--at", "1:9"], 2, "bar 1 has no beat 9"),
        (["--from", "HYMN", "--at", "1", "--pass", "2"], 2, "played once"),
        (["--from", "HYMN", "--at", "1", "--root", "D"], 2, "--root goes with pitches"),
        (["--from", "missing.xml", "--at", "1"], 1, "no such file"),
    ],
)
def test_wrong_places_in_scores(
    run: Run, hymn: Path, arguments: list[str], code: int, words: str
) -> None:
    done = run("chord", *[hymn if one == "HYMN" else one for one in arguments])
    assert done.code == code
    assert words in " ".join(done.err.split())


def test_sound_and_picture_are_written_together(run: Run, tmp_path: Path) -> None:
    audio, picture = tmp_path / "tenth.wav", tmp_path / "tenth.svg"
    done = run("chord", "C3", "E4", "--audio", audio, "--picture", picture, "--vowel", "o")
    assert done.code == 0, done.err
    assert {name for name in tree(tmp_path) if not name.startswith(".")} == {
        "tenth.wav", "tenth.svg",
    }  # fmt: skip
    assert soundfile.info(io.BytesIO(audio.read_bytes())).duration > 40
    assert b"<svg" in picture.read_bytes()[:1000]
    told = " ".join(done.err.split())
    assert "equal 0:00, just 0:06" in told
    assert "volume low" in told
    assert "stop if it hurts" in told
    # Its own file may be written again, somebody else's may not.
    assert run("chord", "C3", "E4", "--audio", audio).code == 0
    audio.write_bytes(b"mine")
    refused = run("chord", "C3", "E4", "--audio", audio)
    assert refused.code == 1
    assert audio.read_bytes() == b"mine"


def test_quiet_writes_without_a_word(run: Run, tmp_path: Path) -> None:
    done = run("chord", "C4", "--picture", tmp_path / "c.png", "--quiet")
    assert (done.code, done.err) == (0, "")
    assert (tmp_path / "c.png").is_file()
