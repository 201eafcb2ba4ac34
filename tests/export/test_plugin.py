"""Outputs from outside: a package installed beside the tool, and packages that misbehave."""

from __future__ import annotations

import csv
import os
import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from retune.cli import main

ROOT = Path(__file__).parents[2]
EXAMPLE = ROOT / "tests" / "plugin_example"
HYMN = ROOT / "fixtures" / "harbour-hymn.musicxml"


@pytest.fixture(scope="module")
def installed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The example package, built and installed without a network into a folder of its own."""
    source = tmp_path_factory.mktemp("source") / "example"
    shutil.copytree(EXAMPLE, source, ignore=shutil.ignore_patterns("__pycache__"))
    target = tmp_path_factory.mktemp("site")
    command = [sys.executable, "-m", "pip", "install", "--quiet", "--no-deps", "--no-index"]
    command += ["--disable-pip-version-check", "--no-build-isolation", "--target", str(target)]
    done = subprocess.run([*command, str(source)], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    return target


def retune(site: Path, *arguments: object) -> subprocess.CompletedProcess[str]:
    """The command line as a user with that package installed runs it."""
    environment = {**os.environ, "PYTHONPATH": str(site), "COLUMNS": "200", "NO_COLOR": "1"}
    command = [sys.executable, "-m", "retune", *map(str, arguments)]
    return subprocess.run(
        command, cwd=ROOT, env=environment, capture_output=True, text=True, check=False
    )


def test_an_installed_package_adds_its_output(installed: Path) -> None:
    done = retune(installed, "exporters")
    assert done.returncode == 0, done.stderr
    assert "cues (.cues.txt) from retune-cues 1.0" in done.stdout
    assert "--set cues.rest=0.0" in done.stdout
    assert "midi (.mid) from retune-choir" in done.stdout
    assert done.stderr == ""


def test_it_is_run_by_name_with_its_options(installed: Path, tmp_path: Path) -> None:
    arguments = ["--to", "cues", "--to", "notes", "-o", tmp_path, "--set", "cues.layout=tabs"]
    done = retune(installed, "export", HYMN, *arguments)
    assert done.returncode == 0, done.stderr
    assert "4 entries" in done.stderr
    text = (tmp_path / "cues" / "harbour-hymn.cues.txt").read_text("utf-8")
    cues = [line.split("\t") for line in text.splitlines()]
    # The note list is made by other code from the same tuned score.
    with (tmp_path / "notes" / "harbour-hymn.notes.csv").open(encoding="utf-8-sig") as stream:
        notes = list(csv.DictReader(stream))
    for part, bar, beat, pitch, cents in cues:
        first = next(row for row in notes if row["name"] == part)
        assert (bar, beat, pitch) == (
            f"bar {first['bar']}",
            f"beat {first['beat']}",
            first["pitch"],
        )
        assert float(cents.split()[0]) == pytest.approx(float(first["cents"]), abs=0.051)


def test_its_wrong_options_are_refused_as_those_of_any_output(
    installed: Path, tmp_path: Path
) -> None:
    out = tmp_path / "out"
    for setting, words in (
        ("cues.layout=tab", "Did you mean tabs?"),
        ("cues.rest=-1", "from 0 to 1000"),
        ("cues.rests=1", "Did you mean rest?"),
    ):
        done = retune(installed, "export", HYMN, "--to", "cues", "-o", out, "--set", setting)
        assert done.returncode == 2, done.stderr
        assert words in done.stderr
    assert not out.exists()


# The misbehaving packages: the body of a class called Bad, in a module of its own.

PROPER = """
    name = "bad"
    summary = "Misbehaves"
    suffixes = (".txt",)
    Options = Options
"""

MODULE = """
from dataclasses import dataclass
from retune.errors import OutputError, Place, WishError
from retune.export.base import LateFile, OutputFile
{options}
class Bad:
{body}
"""

OPTIONS = """
@dataclass(frozen=True)
class Options:
    size: int = 1
"""

Install = Callable[..., None]
Call = Callable[..., tuple[int, str, str]]


@pytest.fixture
def install(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Install:
    """Put a package on the path as an installer would: a module and its dist-info."""

    def install(
        body: str, options: str = OPTIONS, name: str = "bad", of: str = "misbehaving"
    ) -> None:
        site = tmp_path / "site"
        info = site / f"{of}-2.0.dist-info"
        info.mkdir(parents=True)
        module = f"{of}_{abs(hash((str(tmp_path), body, options)))}"
        (site / f"{module}.py").write_text(MODULE.format(body=body, options=options))
        (info / "METADATA").write_text(f"Metadata-Version: 2.1\nName: {of}\nVersion: 2.0\n")
        (info / "entry_points.txt").write_text(f"[retune.exporters]\n{name} = {module}:Bad\n")
        monkeypatch.syspath_prepend(site)

    return install


@pytest.fixture
def call(capfd: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> Call:
    """Exit code, output and errors of the command line in this process."""
    monkeypatch.setenv("COLUMNS", "400")
    monkeypatch.setenv("NO_COLOR", "1")

    def call(*arguments: object) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as ended:
            main([str(argument) for argument in arguments])
        captured = capfd.readouterr()
        assert isinstance(ended.value.code, int)
        return ended.value.code, captured.out, captured.err

    return call


def exporting(*lines: str) -> str:
    """A class that keeps the contract but for what its export does."""
    inside = "\n".join(f"        {line}" for line in lines)
    return f"{PROPER}\n    def export(self, takes, options):\n{inside}\n"


FAULTS = {
    "raises": (["raise KeyError('no such chord')"], "failed: KeyError: 'no such chord'"),
    "raises after a file": (
        ["yield OutputFile('a.txt', b'')", "raise ZeroDivisionError('division by zero')"],
        "failed: ZeroDivisionError: division by zero",
    ),
    "exits": (["raise SystemExit(0)"], "failed: SystemExit: 0"),
    "returns nothing": (["return None"], "failed: TypeError: 'NoneType' object is not iterable"),
    "yields text": (["yield 'a.txt'"], "made a str where a file was expected"),
    "yields the file's name only": (["return ['a', 'b']"], "made a str where a file was expected"),
    "name is no text": (["yield OutputFile(7, b'')"], "made a file whose name is a int, not text"),
    "note is no text": (
        ["yield OutputFile('a.txt', b'', None)"],
        "made a file whose note is a NoneType, not text",
    ),
    "contents are no bytes": (
        ["yield OutputFile('a.txt', 'words')"],
        "made a file that holds a str, not bytes: a.txt",
    ),
    "late contents are no bytes": (
        ["yield LateFile('a.txt', lambda: None)"],
        "made a file that holds a NoneType, not bytes: a.txt",
    ),
    "late contents raise": (
        ["yield OutputFile('b.txt', b'b')", "yield LateFile('a.txt', lambda: {}['x'])"],
        "failed at a.txt: KeyError: 'x'",
    ),
    "check raises": (
        ["yield OutputFile('a.txt', b'', check=lambda data: data[0])"],
        "failed at a.txt: IndexError: index out of range",
    ),
    "check says no text": (
        ["yield OutputFile('a.txt', b'1', check=lambda data: data[0])"],
        "made a file that is checked with a int, not str: a.txt",
    ),
    "check cannot be called": (
        ["yield OutputFile('a.txt', b'', check='yes')"],
        "made a file whose check is a str: a.txt",
    ),
    "up and out": (
        ["yield OutputFile('../a.txt', b'')"],
        "made what cannot be written: the output name '../a.txt' has a part that leads out",
    ),
    "from the root": (["yield OutputFile('/tmp/a.txt', b'')"], "has an empty part"),
    "by another separator": (["yield OutputFile('up\\\\a.txt', b'')"], "some systems forbid"),
    "hidden": (["yield OutputFile('.profile', b'')"], "has a hidden name"),
    "twice": (
        ["yield OutputFile('a.txt', b'1')", "yield OutputFile('A.txt', b'2')"],
        "two files would be called 'A.txt' and 'a.txt'",
    ),
}


LATE = {"late contents are no bytes", "late contents raise", "check raises", "check says no text"}
"""Faults that are met while files are written, which are all written together or not at all."""


@pytest.mark.parametrize("case", FAULTS)
def test_a_fault_names_output_and_distribution_and_none_of_its_files_is_written(
    install: Install, call: Call, tmp_path: Path, case: str
) -> None:
    lines, words = FAULTS[case]
    install(exporting(*lines))
    out = tmp_path / "out"
    code, _, err = call("export", HYMN, "--to", "notes", "--to", "bad", "-o", out)
    assert code == 1, err
    assert "Error: the output bad of misbehaving 2.0 " in err
    assert words in err
    assert "Traceback" not in err
    assert "inside retune" not in err
    written = {path.name for path in out.rglob("*") if path.is_file() and path.name[0] != "."}
    notes = {"harbour-hymn.notes.csv", "harbour-hymn.notes.json"}
    assert written == (set() if case in LATE else notes)
    assert out.exists() == (case not in LATE)
    assert not (tmp_path / "a.txt").exists()


def test_debug_shows_where_a_foreign_output_failed(
    install: Install, call: Call, tmp_path: Path
) -> None:
    install(exporting("raise KeyError('no such chord')"))
    arguments = ["export", HYMN, "--to", "bad", "-o", tmp_path / "out", "--debug"]
    code, _, err = call(*arguments)
    assert code == 1
    assert "Traceback" in err
    assert "in export" in err


def test_an_output_may_itself_say_what_is_wrong(
    install: Install, call: Call, tmp_path: Path
) -> None:
    install(exporting("raise OutputError('no alto', Place('hymn', 'Alto', '3', '1'), 'Add one')"))
    code, _, err = call("export", HYMN, "--to", "bad", "-o", tmp_path / "out")
    assert (code, err) == (1, "Error: hymn: Alto, bar 3, beat 1: no alto\n  Add one.\n")


REFUSED = {
    "Options may change": (
        "\n@dataclass\nclass Options:\n    size: int = 1\n",
        "its Options is not frozen",
    ),
    "an option without a default": (
        "\n@dataclass(frozen=True)\nclass Options:\n    size: int\n",
        "its option size has no default",
    ),
    "an option that text cannot set": (
        "\n@dataclass(frozen=True)\nclass Options:\n    size: object = None\n",
        "its option size has a type that text cannot set",
    ),
    "Options that cannot be made": (
        OPTIONS + "    def __post_init__(self): raise ValueError('no size today')\n",
        "ValueError: no size today",
    ),
    "Options that are none": ("\nOptions = dict\n", "its Options is no dataclass"),
    "a module that fails": ("\nOptions = 1 / 0\n", "ZeroDivisionError: division by zero"),
}


@pytest.mark.parametrize("case", REFUSED)
def test_a_broken_plug_in_is_a_warning_with_its_name(
    install: Install, call: Call, tmp_path: Path, case: str
) -> None:
    options, words = REFUSED[case]
    install(exporting("yield OutputFile('a.txt', b'')"), options)
    code, out, err = call("exporters")
    assert code == 0
    assert "bad (.txt)" not in out
    assert f"the output bad of misbehaving 2.0 cannot be used: {words}" in err
    # It harms no other output, and is refused where it is asked for.
    assert call("export", HYMN, "--to", "notes", "-o", tmp_path / "out")[0] == 0
    code, _, err = call("export", HYMN, "--to", "bad", "-o", tmp_path / "none")
    assert code == 2
    assert words in err
    assert not (tmp_path / "none").exists()


def test_options_that_refuse_a_value_are_wrong_usage(
    install: Install, call: Call, tmp_path: Path
) -> None:
    post = "    def __post_init__(self):\n        if self.size > 3: raise ValueError('too large')\n"
    install(exporting("yield OutputFile('a.txt', b'')"), OPTIONS + post)
    arguments = ["export", HYMN, "--to", "bad", "-o", tmp_path / "out"]
    code, _, err = call(*arguments, "--set", "bad.size=4")
    assert (code, "the output bad refuses its options: too large" in err) == (2, True), err
    assert call(*arguments, "--set", "bad.size=3")[0] == 0
    assert (tmp_path / "out" / "a.txt").is_file()


def test_the_name_of_a_built_in_output_is_an_error_that_names_both(
    install: Install, call: Call, tmp_path: Path
) -> None:
    body = exporting("yield OutputFile('a.txt', b'')").replace('name = "bad"', 'name = "midi"')
    install(body, name="midi")
    for arguments in (["exporters"], ["export", HYMN, "--to", "midi", "-o", tmp_path / "out"]):
        code, _, err = call(*arguments)
        assert code == 1
        assert "two installed outputs are called midi: one of misbehaving 2.0" in err
        assert "one of retune-choir" in err
    assert not (tmp_path / "out").exists()
