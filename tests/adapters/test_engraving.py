"""The engraver in its own process: steady pictures, and plain words where there are none."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from retune.adapters import engraving
from retune.adapters.engraving import EngravingError, Sheet, drawn
from retune.adapters.engraving_font import glyph_outline, glyph_width, text_width

FIXTURES = Path(__file__).parents[2] / "fixtures"
HYMN = (FIXTURES / "harbour-hymn.musicxml").read_text(encoding="utf-8")
GULL = (FIXTURES / "gull-song.musicxml").read_text(encoding="utf-8")


def test_pictures_are_the_same_every_time_and_keep_the_names_of_noteheads() -> None:
    once, again = drawn([Sheet(HYMN, 2000), Sheet(HYMN, 2000)])
    assert once == again
    assert drawn([Sheet(HYMN, 2000)]) == (once,)
    written = re.findall(r'<note [^>]*\bid="([^"]+)"', HYMN)
    shown = re.findall(r'<g id="([^"]+)" class="note"', "".join(once))
    assert written
    assert set(shown) <= set(written)
    assert len(shown) == len(set(shown))


def test_a_narrow_sheet_has_more_systems() -> None:
    wide, narrow = drawn([Sheet(GULL, 2600), Sheet(GULL, 900)])
    assert len(narrow) > len(wide)


def test_one_system_stands_in_each_picture() -> None:
    (pages,) = drawn([Sheet(GULL, 900)])
    assert all(len(re.findall(r'class="system"', page)) == 1 for page in pages)


@pytest.mark.parametrize("document", ["", "no markup", "<score-partwise/>", "<html/>"])
def test_what_cannot_be_engraved_is_an_error_with_a_reason(
    document: str, capfd: pytest.CaptureFixture[str]
) -> None:
    with pytest.raises(EngravingError, match="no music"):
        drawn([Sheet(document, 1000)])
    assert capfd.readouterr() == ("", "")


def test_an_engraver_that_does_not_end_is_stopped(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(engraving, "MAX_SECONDS", 0.001)
    with pytest.raises(EngravingError, match=r"did not end in 0\.001 seconds"):
        drawn([Sheet(GULL, 1000)])


def test_an_engraver_that_crashes_is_an_error(capfd: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(EngravingError, match="the engraver cannot take the score"):
        drawn([Sheet(None, 1000)])  # type: ignore[arg-type]
    assert capfd.readouterr() == ("", "")


def test_no_process_is_an_error(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setattr(engraving.sys, "executable", str(tmp_path / "nothing"))
    with pytest.raises(EngravingError, match="no process could be started"):
        drawn([Sheet(GULL, 1000)])


def test_font_files_give_outlines_and_widths() -> None:
    # SMuFL 1.4: U+ECA5 is metNoteQuarterUp; U+F8FF is none of its code points.
    assert glyph_outline("ECA5").startswith("M")
    assert 0.2 < glyph_width("ECA5") < 0.6
    assert glyph_outline("F8FF") == ""
    # Times, from its published metrics (from memory): a 444, C 667, m 778 thousandths of an em.
    for letter, width in (("a", 444), ("C", 667), ("m", 778)):
        assert text_width(letter, 1000) == pytest.approx(width, abs=2)
    assert text_width("Calm", 1000, bold=True) > text_width("alm", 1000, bold=True) + 500
