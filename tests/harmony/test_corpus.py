"""Agreement with human analysts on the development set (see tests/benchmarks/roots.py)."""

from __future__ import annotations

import subprocess
import sys
import time
from dataclasses import replace
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "benchmarks"))

import corpus
import roots

from retune.harmony import analyse
from retune.score.model import Bar, Note

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


@pytest.mark.slow
def test_a_hundred_thousand_notes_in_fifteen_seconds() -> None:
    score, _ = roots.read_piece(PIECES["R008"])
    notes: list[Note] = []
    bars: list[Bar] = []
    for i in range(100_000 // len(score.notes)):
        notes.extend(replace(note, onset=note.onset + i * score.end) for note in score.notes)
        bars.extend(replace(bar, onset=bar.onset + i * score.end) for bar in score.bars)
    started = time.process_time()
    analyse(replace(score, notes=tuple(notes), bars=tuple(bars)))
    assert time.process_time() - started < 15


def test_import_brings_no_scipy() -> None:
    code = "import sys, retune.harmony; sys.exit('scipy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
