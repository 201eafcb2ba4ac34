"""What README shows is what the tool prints, and its Python runs."""

from __future__ import annotations

import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")

SHOWN = re.findall(r"```text\n\$ (retune .*)\n((?:.*\n)*?)```", README)
"""Commands shown with their output: a text block that begins with `$ retune ...`."""


NUMBER = re.compile(r"[-+]?\d+(?:\.\d+)?")


def call(command: str, folder: Path) -> str:
    """Standard error and output of a shown command, run in a copy of the bundled scores."""
    (folder / "fixtures").symlink_to(ROOT / "fixtures")
    environment = {**os.environ, "COLUMNS": "80", "NO_COLOR": "1"}
    done = subprocess.run(
        [sys.executable, "-m", *shlex.split(command)],
        cwd=folder,
        env=environment,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        check=True,
    )
    return done.stdout


def test_readme_shows_the_main_job() -> None:
    assert [command.split()[1] for command, _ in SHOWN] == ["make", "show", "show", "chord"]


@pytest.mark.parametrize(("command", "output"), SHOWN, ids=lambda text: text.split("\n")[0][:20])
def test_shown_output_is_real(command: str, output: str, tmp_path: Path) -> None:
    real = call(command, tmp_path).rstrip()
    assert NUMBER.sub("n", real) == NUMBER.sub("n", output.rstrip())
    # Another processor may round a solve differently in its last digits.
    shown = [float(number) for number in NUMBER.findall(output)]
    assert [float(number) for number in NUMBER.findall(real)] == pytest.approx(shown, abs=1.1)


def test_python_example_runs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (code,) = re.findall(r"```python\n(.*?)```", README, re.DOTALL)
    (tmp_path / "fixtures").symlink_to(ROOT / "fixtures")
    monkeypatch.chdir(tmp_path)
    exec(code, {})
    assert list((tmp_path / "out").rglob("*.mid"))


def test_every_linked_file_exists() -> None:
    for name in re.findall(r"fixtures/[\w-]+\.\w+", README):
        assert (ROOT / name).is_file(), name


def test_the_example_of_choices_holds_for_the_bundled_hymn() -> None:
    from retune.choicesfile.read import loads
    from retune.pipeline import retuned
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy

    text = README.partition("```toml\n")[2].partition("```")[0]
    hymn = ROOT / "fixtures" / "harbour-hymn.musicxml"
    file = loads(text, Path("harbour-hymn.choices.toml"))
    tuned = retuned(hymn, str(hymn), ReadOptions(), Policy(), file)
    assert tuned.score.title == "For the Blessing of the Nets"
    lost = [f for f in (*tuned.score.findings, *tuned.findings) if f.where.line]
    assert not lost
    assert sum(chord.decided for chord in tuned.harmony.chords) == 1
    assert any(str(s.ratio) == "7/4" for n in tuned.notes for s in n.segments)
