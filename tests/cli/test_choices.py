"""`retune choices`, and choices on the command line, as a director uses them."""

from __future__ import annotations

import json
import re
import shutil
from pathlib import Path

import pytest
from click.testing import CliRunner

from retune.cli import cli
from retune.errors import OutputError, UnreadableError
from tests.choicesfile.helpers import HYMN, MOTET

RUNNER = CliRunner()


@pytest.fixture
def hymn(tmp_path: Path) -> Path:
    return Path(shutil.copy(HYMN, tmp_path / "hymn.musicxml"))


def run(*arguments: object) -> str:
    result = RUNNER.invoke(cli, [str(one) for one in arguments], catch_exceptions=False)
    assert result.exit_code == 0, result.output
    return result.output


def failure(*arguments: object) -> BaseException:
    result = RUNNER.invoke(cli, [str(one) for one in arguments])
    assert result.exit_code != 0
    assert result.exception is not None
    return result.exception


def notes(score: Path, folder: Path, *options: object) -> dict[str, object]:
    run("export", score, "--to", "notes", "-o", folder, *options)
    (path,) = (folder / "notes").glob("*.json")
    found: dict[str, object] = json.loads(path.read_text())
    return found


def roots(document: dict[str, object], bar: str) -> list[str]:
    chords = document["chords"]
    assert isinstance(chords, list)
    return [one["root"] for one in chords if one["bar"] == bar]


def test_a_wrong_root_is_put_right(hymn: Path, tmp_path: Path) -> None:
    """Written, edited by hand, heeded without being named."""
    run("choices", hymn)
    path = hymn.with_name("hymn.choices.toml")
    text = path.read_text()
    assert roots(notes(hymn, tmp_path / "a"), "9") == ["C", "F"]
    path.write_text(text + '\n[[chord]]\nat = "9:1"\nroot = "Ab"\n')
    assert roots(notes(hymn, tmp_path / "b"), "9") == ["Ab", "F"]
    assert roots(notes(hymn, tmp_path / "c", "--choices", "none"), "9") == ["C", "F"]
    # Brought up to date, the decision bears what sounds there.
    run("choices", hymn, "--update")
    assert re.search(r'root = "Ab"\nsounds = "[^|]+\| C3 [^|]+\|', path.read_text())


def test_it_never_overwrites_unasked(hymn: Path) -> None:
    path = hymn.with_name("hymn.choices.toml")
    path.write_text("# mine\n")
    error = failure("choices", hymn)
    assert isinstance(error, OutputError)
    assert path.read_text() == "# mine\n"
    run("choices", hymn, "--overwrite")
    assert "[parts.begins]" in path.read_text()


def test_to_standard_output(hymn: Path) -> None:
    result = RUNNER.invoke(cli, ["choices", str(hymn), "-o", "-", "-q"])
    assert result.stdout.startswith("# Choices for")
    assert not hymn.with_name("hymn.choices.toml").exists()


def test_nothing_to_update(hymn: Path) -> None:
    assert isinstance(failure("choices", hymn, "--update"), OutputError)


def test_settings_stand_in_for_defaults_and_options_before_settings(
    hymn: Path, tmp_path: Path
) -> None:
    hymn.with_name("hymn.choices.toml").write_text(
        'reference = 443\n[tuning]\ndrift = "follow"\nprime_limit = 7\nheld_shift = "any"\n'
        "[playing]\ntempo = 40\n"
    )
    document = notes(hymn, tmp_path / "a")
    policy = document["policy"]
    assert isinstance(policy, dict)
    assert (policy["drift"], policy["prime_limit"], policy["held_shift"]) == ("follow", 7, "any")
    assert document["reference_hz"] == 443.0
    listed = document["notes"]
    assert isinstance(listed, list)
    assert listed[0]["length_seconds"] == pytest.approx(float(listed[0]["duration"]) * 1.5)
    policy = notes(hymn, tmp_path / "b", "--drift", "anchored", "--prime-limit", "3")["policy"]
    assert isinstance(policy, dict)
    assert (policy["drift"], policy["prime_limit"]) == ("anchored", 3)


def test_track_settings(hymn: Path, tmp_path: Path) -> None:
    hymn.with_name("hymn.choices.toml").write_text(
        '[tracks]\naudio = "none"\nparts = ["Alto"]\nsides = true\ncount_in = 0\n'
    )
    run("tracks", hymn, "-o", tmp_path / "out")
    names = {path.name for path in (tmp_path / "out").rglob("*.mid")}
    assert any("left" in name for name in names)
    assert not any("Tenor" in name for name in names)


def test_mistakes_are_told_before_any_work(hymn: Path, tmp_path: Path) -> None:
    hymn.with_name("hymn.choices.toml").write_text("[[chord]]\nat = '1:1'\nrot = 'D'\n")
    error = failure("export", hymn, "--to", "notes", "-o", tmp_path / "out")
    assert isinstance(error, UnreadableError)
    assert "line 3, column 1" in error.what
    assert "did you mean 'root'" in error.what
    assert not (tmp_path / "out").exists()


def test_what_was_left_out_is_told(hymn: Path) -> None:
    hymn.with_name("hymn.choices.toml").write_text('[[chord]]\nat = "77:1"\nroot = "D"\n')
    assert "hymn.choices.toml, line 1" in run("show", hymn)


def test_doubtful_chords_come_first(tmp_path: Path) -> None:
    score = Path(shutil.copy(MOTET, tmp_path / "motet.musicxml"))
    run("choices", score)
    text = score.with_name("motet.choices.toml").read_text()
    sure = [int(found) for found in re.findall(r"(\d+)% sure", text)]
    assert sure
    assert sure == sorted(sure)
    assert text.index("% sure") < text.index("[tuning]")


def test_notes_to_singers_reach_the_note_list(hymn: Path, tmp_path: Path) -> None:
    hymn.with_name("hymn.choices.toml").write_text(
        '[[note_to_singers]]\nbars = "5-6"\nparts = ["Tenor"]\ntext = "Under the alto."\n'
    )
    told = notes(hymn, tmp_path / "out")["notes_to_singers"]
    assert told == [
        {"bars": "5-6", "onset": "16", "end": "24", "parts": [2], "text": "Under the alto."}
    ]
