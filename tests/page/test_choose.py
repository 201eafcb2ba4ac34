"""The chord card's lines for the choices, as a director settles a root or a ratio by ear."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from playwright.sync_api import Browser, Page

from retune.export.page import PageExporter, PageOptions
from retune.tracks.take import Take
from tests.choicesfile.helpers import HYMN, at, tuned_with
from tests.page.browser import chromium, needs_chromium, opened

pytestmark = needs_chromium


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with chromium() as made:
        yield made


@pytest.fixture
def hymn(browser: Browser, tmp_path: Path) -> Iterator[Page]:
    page = opened(browser, _page(tmp_path, None))
    yield page
    assert page.faults == []  # type: ignore[attr-defined]
    page.context.close()


def _page(folder: Path, text: str | None, transpose: int = 0) -> Path:
    piece = tuned_with(HYMN, text, transpose=transpose)
    for file in PageExporter().export([Take(piece)], PageOptions()):
        (folder / file.name).write_bytes(file.data)
    return folder / f"{piece.score.stem}.html"


def _open(page: Page, bar: str, beat: str) -> None:
    page.evaluate(
        f"rehearsal.card.open(rehearsal.piece.chords.findIndex("
        f"(one) => one.bar === '{bar}' && one.beat === '{beat}'))"
    )
    page.locator("details.choose summary").click()


def test_a_root_chosen_on_the_card_is_the_root_that_is_read(hymn: Page) -> None:
    _open(hymn, "9", "1")
    hymn.select_option("#chooseroot", "Ab")
    hymn.select_option("#choosequality", "major seventh")
    lines = hymn.locator("details.choose pre").inner_text()
    assert at(tuned_with(HYMN, lines), "9", "1") == ("Ab", "major seventh")
    # Its anchor is that of the place: a bar number that is wrong does not matter.
    moved = lines.replace('at = "9:1"', 'at = "7:1"')
    assert at(tuned_with(HYMN, moved), "9", "1") == ("Ab", "major seventh")


def test_a_ratio_chosen_on_the_card_is_heard_and_read(hymn: Page) -> None:
    _open(hymn, "12", "3")
    before = hymn.evaluate("rehearsal.piece.chords[rehearsal.card.index].tones.map((t) => t.hz)")
    hymn.evaluate(
        "rehearsal.player.hold = (tones) =>"
        " { if (tones) globalThis.held = tones.map((t) => t.hz); }"
    )
    options = hymn.locator("#chooseratio option").all_inner_texts()
    (wanted,) = [one for one in options if one.startswith("Bass") and one.endswith("7/4")]
    hymn.select_option("#chooseratio", label=wanted)
    hymn.locator("details.choose button", has_text="Hear it so").click()
    held = hymn.evaluate("held")
    changed = [(a, b) for a, b in zip(before, held, strict=True) if a != b]
    ((old, new),) = changed
    # 9/5 becomes 7/4, 35:36; the chord as tuned is within a cent of its ratios.
    assert new / old == pytest.approx(35 / 36, rel=0.0008)
    lines = hymn.locator("details.choose pre").inner_text()
    tuned = tuned_with(HYMN, lines)
    assert any(str(s.ratio) == "7/4" for n in tuned.notes for s in n.segments)


def test_the_lines_are_copied(hymn: Page) -> None:
    _open(hymn, "9", "1")
    hymn.locator("details.choose button", has_text="Copy the lines").click()
    assert hymn.locator("details.choose [role=status]").inner_text() != ""
    assert hymn.evaluate("String(getSelection())").startswith("[[chord]]")


def test_a_decided_chord_says_so_and_notes_stand_on_the_page(
    browser: Browser, tmp_path: Path
) -> None:
    text = (
        '[[chord]]\nat = "9:1"\nroot = "Ab"\n[[note_to_singers]]\nbars = "5-6"\n'
        'parts = ["Tenor"]\ntext = "Under <b>the</b> alto."\n'
    )
    page = opened(browser, _page(tmp_path, text))
    page.evaluate("rehearsal.card.open(rehearsal.piece.chords.findIndex((one) => one.bar === '9'))")
    assert "The director decided this chord" in page.locator("#card").inner_text()
    told = page.locator("#adviceview li", has_text="Under <b>the</b> alto.")
    assert "Tenor" in told.inner_text()
    assert "from your director" in told.inner_text()
    assert page.faults == []  # type: ignore[attr-defined]
    page.context.close()


def test_a_page_in_another_key_offers_no_lines(browser: Browser, tmp_path: Path) -> None:
    page = opened(browser, _page(tmp_path, None, transpose=2))
    page.evaluate("rehearsal.card.open(3)")
    assert page.locator("details.choose").count() == 0
    page.context.close()
