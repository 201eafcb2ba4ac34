"""`retune show --rehearsal-notes` as a director meets it."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from tests.cli.conftest import FIXTURES, Run

SCORES = sorted(FIXTURES.glob("*.musicxml"))


@pytest.mark.parametrize("score", SCORES, ids=lambda path: path.stem)
def test_notes_stand_by_part_in_order_of_bars(run: Run, score: Path) -> None:
    done = run("show", score, "--rehearsal-notes", "-q")
    assert done.code == 0, done.err
    lines = done.out.splitlines()
    assert max(map(len, lines)) <= 80
    starts = [int(found[1]) for line in lines if (found := re.match(r" *(\d+):\S+ \S", line))]
    assert 1 <= len(starts) <= 12
    sections = [line for line in lines if re.match(r" [A-Z]\S*(?: \S+)*$", line)]
    assert sections
    assert "Purity" not in done.out


def test_part_and_bars_narrow_them(run: Run, hymn: Path) -> None:
    alto = run("show", hymn, "--rehearsal-notes", "-q", "--part", "alto").out
    assert "\n Alto\n" in alto
    assert "\n Soprano\n" not in alto
    bars = run("show", hymn, "--rehearsal-notes", "-q", "--bars", "9-11").out
    assert set(re.findall(r"^ *(\d+):", bars, re.MULTILINE)) <= {"9", "10", "11"}
    calm = run("show", hymn, "--rehearsal-notes", "-q", "--bars", "26").out
    assert "No place stands out" in calm


def test_unknown_part_is_wrong_usage(run: Run, hymn: Path) -> None:
    done = run("show", hymn, "--rehearsal-notes", "--part", "Oboe")
    assert done.code == 2
    assert "Oboe" in done.err
    assert "Alto" in done.err
    alone = run("show", hymn, "--part", "Alto")
    assert alone.code == 2
    assert "--rehearsal-notes" in alone.err
