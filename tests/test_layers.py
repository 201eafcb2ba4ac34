"""The house keeps its one direction: a row imports only rows below it (DEVELOPERS.md)."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

import retune

ROOT = Path(retune.__file__).parent

# From the lowest row up. Files of one row may import each other only inside their own package.
ROWS: tuple[tuple[str, ...], ...] = (
    ("errors", "limits", "units"),
    ("pitch",),
    ("choices",),
    ("written",),
    ("adapters",),
    ("score",),
    ("harmony",),
    ("tuning",),
    ("tracks", "voice"),
    ("chordcard",),
    ("page", "choicesfile"),
    ("export",),
    ("pipeline",),
    ("play", "watch"),
    ("cli",),
    ("__main__",),
)
LEVEL = {name: level for level, row in enumerate(ROWS) for name in row}

# Each third-party world has one door; numpy is the language of the numeric layers, scipy that of
# signals.
DOORS = {
    "click": {"cli"},
    "lxml": {"adapters"},
    "mido": {"adapters"},
    "music21": {"adapters"},
    "numpy": {"adapters", "harmony", "tuning", "voice", "page", "export"},
    "scipy": {"adapters", "voice"},
    "soundfile": {"adapters"},
    "pyloudnorm": {"adapters"},
    "fluidsynth": {"adapters"},
    "verovio": {"adapters"},
    "typst": {"adapters"},
    "matplotlib": {"adapters"},
    "watchfiles": {"adapters"},
}

MODULES = sorted(ROOT.rglob("*.py"))


def house_of(path: Path) -> str:
    parts = path.relative_to(ROOT).with_suffix("").parts
    return parts[0]


def imported(path: Path) -> set[str]:
    names: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: relative imports hide the layer"
            names.add(node.module or "")
            if node.module == "retune":
                names.update(f"retune.{alias.name}" for alias in node.names)
    return names


@pytest.mark.parametrize("path", MODULES, ids=lambda p: str(p.relative_to(ROOT)))
def test_imports_point_down(path: Path) -> None:
    house = house_of(path)
    if house == "__init__":
        return
    assert house in LEVEL, f"{house} belongs to no row of the house"
    for name in imported(path):
        top, _, rest = name.partition(".")
        if top != "retune" or not rest:
            continue
        target = rest.split(".")[0]
        if target != house and target in LEVEL:
            assert LEVEL[target] < LEVEL[house], f"{path}: {house} must not import {target}"


@pytest.mark.parametrize("path", MODULES, ids=lambda p: str(p.relative_to(ROOT)))
def test_each_library_has_one_door(path: Path) -> None:
    for name in imported(path):
        allowed = DOORS.get(name.split(".")[0])
        assert allowed is None or house_of(path) in allowed, f"{path} must not import {name}"


@pytest.mark.parametrize("path", MODULES, ids=lambda p: str(p.relative_to(ROOT)))
def test_modules_stay_small(path: Path) -> None:
    assert len(path.read_text(encoding="utf-8").splitlines()) <= 400
