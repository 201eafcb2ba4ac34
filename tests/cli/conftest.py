"""Running the command line in this process, as a user would, with bundled scores."""

from __future__ import annotations

import io
import os
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from retune.cli import main

FIXTURES = Path(__file__).parents[2] / "fixtures"


@dataclass(frozen=True)
class Outcome:
    """What a command left behind."""

    code: int
    out: str
    err: str


Run = Callable[..., Outcome]


@pytest.fixture
def run(capfd: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> Run:
    """Call `retune ARGUMENTS`; returns exit code, standard output and standard error."""
    monkeypatch.setenv("COLUMNS", "80")
    monkeypatch.setenv("NO_COLOR", "1")

    def call(*arguments: object, stdin: bytes = b"") -> Outcome:
        monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(stdin)))
        with pytest.raises(SystemExit) as ended:
            main([str(argument) for argument in arguments])
        captured = capfd.readouterr()
        code = ended.value.code
        assert isinstance(code, int)
        return Outcome(code, captured.out, captured.err)

    return call


@pytest.fixture
def hymn() -> Path:
    """The bundled hymn."""
    return FIXTURES / "harbour-hymn.musicxml"


def tree(folder: Path) -> set[str]:
    """Every file below a folder, hidden ones too, with / between folders."""
    return {
        str(path.relative_to(folder)).replace(os.sep, "/")
        for path in folder.rglob("*")
        if path.is_file()
    }
