"""Notation and pages through the command line."""

from __future__ import annotations

from pathlib import Path

import pytest
from lxml import etree

from tests.cli.conftest import FIXTURES, Run

HYMN = FIXTURES / "harbour-hymn.musicxml"


def test_one_file_goes_to_standard_output(run: Run) -> None:
    done = run("export", HYMN, "--to", "notation", "-o", "-")
    assert done.code == 0
    root = etree.fromstring(done.out.encode())
    assert root.findtext("movement-title") or root.findtext("work/work-title")
    assert len(root.findall(".//words[@font-size='7']")) == 209
    assert "cents at 209 notes" in done.err


def test_notation_and_pages_share_their_folder(run: Run, tmp_path: Path) -> None:
    wishes = ("--set", "notation.parts=yes", "--set", "sheet.parts=yes")
    done = run("export", HYMN, "--to", "notation", "--to", "sheet", *wishes, "-o", tmp_path)
    assert done.code == 0, done.err
    folder = tmp_path / "notation"
    for name in ("Full score", "Alto/Alto"):
        for ending in ("musicxml", "pdf"):
            assert (folder / f"{name} - harbour-hymn.{ending}").stat().st_size > 10_000


def test_both_outputs_are_listed_with_their_options(run: Run) -> None:
    done = run("exporters")
    assert done.code == 0
    for word in ("notation", "sheet", "accidentals", "container", "paper"):
        assert word in done.out


@pytest.mark.parametrize(
    ("wish", "hint"),
    [
        ("notation.cents=piano", "root, equal, none"),
        ("notation.least=500", "from 0 to 100"),
        ("sheet.paper=a3", "a4, letter"),
    ],
)
def test_options_that_are_not_there_are_wrong_usage(run: Run, wish: str, hint: str) -> None:
    name = wish.partition(".")[0]
    done = run("export", HYMN, "--to", name, "--set", wish, "-o", "-")
    assert done.code == 2
    assert hint in " ".join(done.err.split())


def test_a_labelled_score_can_be_given_again(run: Run, tmp_path: Path) -> None:
    first = run("export", HYMN, "--to", "notation", "-o", "-").out
    file = tmp_path / "harbour-hymn.musicxml"
    file.write_text(first, encoding="utf-8")
    again = run("export", file, "--to", "notation", "-o", "-")
    assert again.code == 0
    assert again.out == first
