"""Agreement with human analysts on the development set (see tests/benchmarks/roots.py)."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "benchmarks"))

import corpus
import roots

from retune.harmony import analyse

PIECES = {piece.name: piece for piece in corpus.development()}


def tally_of(*names: str) -> roots.Tally:
    total = roots.Tally()
    for name in names:
        score, labels = roots.read_piece(PIECES[name])
        total.add(roots.judge(score, analyse(score), labels))
    return total


def test_three_chorales_agree_with_the_analyst() -> None:
    figures = tally_of("R006", "R010", "R018").figures()
    assert figures["supported"] >= 0.96
    assert figures["supported"] > figures["baseline supported"] + 0.03
    assert figures["quality"] >= 0.9


def test_home_tonics_of_chorales() -> None:
    """The keys the human analyses begin with."""
    keys = {"R002": ("A", False), "R008": ("F", True), "R018": ("G", False), "R020": ("D", False)}
    for name, (root, minor) in keys.items():
        score, _ = roots.read_piece(PIECES[name])
        tonic = analyse(score).tonic
        assert (tonic.root.name, tonic.minor) == (root, minor), name


@pytest.mark.slow
@pytest.mark.parametrize(("group", "least"), [("chorales", 0.97), ("madrigals", 0.895)])
def test_development_set(group: str, least: float) -> None:
    figures = tally_of(*(n for n, p in PIECES.items() if p.group == group)).figures()
    assert figures["supported"] >= least
    assert figures["quality"] >= 0.9


def test_import_brings_no_scipy() -> None:
    code = "import sys, retune.harmony; sys.exit('scipy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
