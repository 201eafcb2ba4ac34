"""The package as a whole: public names, light imports, values that are values."""

from __future__ import annotations

import dataclasses
import importlib
import inspect
import pkgutil
import subprocess
import sys
from collections.abc import Iterator

import pytest

import retune

HEAVY = ("music21", "scipy", "numpy", "lxml", "mido")


def modules() -> list[str]:
    return [m.name for m in pkgutil.walk_packages(retune.__path__, "retune.")]


VALUE_MODULES = (
    "errors",
    "export.base",
    "harmony.model",
    "limits",
    "pitch",
    "score.model",
    "score.options",
    "score.tempo",
    "tracks.take",
    "tuning.model",
    "tuning.policy",
    "written",
)
"""Modules whose dataclasses are values that travel between the rows."""


def value_classes() -> Iterator[type]:
    for name in (f"retune.{module}" for module in VALUE_MODULES):
        module = importlib.import_module(name)
        for found in vars(module).values():
            own = isinstance(found, type) and found.__module__ == name
            if own and dataclasses.is_dataclass(found):
                yield found


@pytest.mark.parametrize("name", retune.__all__)
def test_public_names_load(name: str) -> None:
    assert getattr(retune, name).__doc__


def test_public_names_are_listed() -> None:
    assert {name for name in dir(retune) if not name.startswith("_")} == set(retune.__all__)
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        retune.nothing  # noqa: B018  # the access is what is tested


@pytest.mark.parametrize("cls", list(value_classes()), ids=lambda c: c.__qualname__)
def test_public_values_are_frozen(cls: type) -> None:
    parameters = cls.__dataclass_params__  # type: ignore[attr-defined]  # set by dataclass
    assert parameters.frozen, f"{cls.__qualname__} can change after it is made"


@pytest.mark.parametrize("name", modules())
def test_every_module_and_public_function_is_described(name: str) -> None:
    module = importlib.import_module(name)
    assert module.__doc__, name
    for key, found in vars(module).items():
        own = getattr(found, "__module__", None) == name and not key.startswith("_")
        if own and (inspect.isroutine(found) or inspect.isclass(found)):
            assert found.__doc__, f"{name}.{key} has no docstring"


def loaded_by(code: str) -> set[str]:
    script = f"import sys\n{code}\nprint(*sorted(m for m in sys.modules if '.' not in m))"
    done = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=True
    )
    return set(done.stdout.splitlines()[-1].split())


@pytest.mark.parametrize(
    "code",
    [
        "import retune",
        "from retune.cli import _run\n_run(['--help'])",
        "from retune.cli import _run\n_run(['show', '--help'])",
        "from retune.cli import _run\n_run(['make', '--help'])",
    ],
)
def test_help_and_import_stay_light(code: str) -> None:
    assert not loaded_by(code).intersection(HEAVY)


def test_main_job_does_not_load_music21() -> None:
    assert "music21" not in loaded_by("import retune.pipeline, retune.adapters.xml")
