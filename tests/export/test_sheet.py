"""The exporter `sheet`: pages that are read back, measured and rendered by other programs."""

from __future__ import annotations

import re
import shutil
import subprocess
from functools import cache
from itertools import pairwise
from pathlib import Path

import pytest
from lxml import etree

from retune.adapters.typesetting import Pages, Picture, pdf_of
from retune.errors import OutputError
from retune.export.notation import Parts
from retune.export.sheet import Format, Paper, SheetExporter, SheetOptions
from retune.export.sheet_layout import LEAST_GAP, MOST_GAP, set_pages
from retune.harmony import analyse
from retune.page.engrave import EngravingError, Wish, engraved, engravings
from retune.page.engrave_print import printed_systems
from retune.score.read import read_bytes
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.score.musicxml_text import note, part_text, score_text
from tests.tracks.pieces import FIXTURES, tuned

SVG = "{http://www.w3.org/2000/svg}"
FONTS = ("Libertinus Serif", "DejaVu Sans Mono")

needs_poppler = pytest.mark.skipif(
    shutil.which("pdftotext") is None, reason="needs poppler: apt install poppler-utils"
)


def files_of(piece: TunedScore, **wish: object) -> dict[str, bytes]:
    options = SheetOptions(**wish)  # type: ignore[arg-type]
    return {f.name: f.data for f in SheetExporter().export((Take(piece),), options)}


@cache
def pdf(name: str) -> bytes:
    return next(iter(files_of(tuned(name)).values()))


def said_by(program: str, data: bytes, folder: Path, *options: str) -> str:
    """What a program of poppler prints of a PDF."""
    file = folder / "a.pdf"
    file.write_bytes(data)
    target = ["-"] if program == "pdftotext" else []
    command = [program, *options, str(file), *target]
    return subprocess.run(command, check=True, capture_output=True, timeout=60).stdout.decode()


def own(data: bytes) -> TunedScore:
    score = read_bytes(data, "own.musicxml")
    return tune(score, analyse(score), Policy())


# --- how systems are set on pages ---------------------------------------------------------------


def test_systems_stay_in_order_on_as_few_pages_as_hold_them() -> None:
    heights = [60.0, 70, 80, 60, 90, 50, 60, 70, 80]
    pages = set_pages(heights, 200, 250)
    assert [i for p in pages for i in range(p.first, p.stop)] == list(range(9))
    for page in pages:
        room = 250 if page.first else 200
        inside = heights[page.first : page.stop]
        assert sum(inside) + page.gap * (len(inside) - 1) <= room + 1e-9
        assert LEAST_GAP <= page.gap <= MOST_GAP
    greedy, left = 1, 200.0
    for height in heights:
        if height > left:
            greedy, left = greedy + 1, 250.0
        left -= height + LEAST_GAP
    assert len(pages) == greedy


def test_a_system_higher_than_a_page_stands_on_its_own() -> None:
    assert [(p.first, p.stop) for p in set_pages([300, 40, 40], 200, 250)] == [(0, 1), (1, 3)]


# --- the pages ----------------------------------------------------------------------------------


def test_names_are_those_of_the_notation_folder() -> None:
    names = list(files_of(tuned("gull-song"), parts=Parts.YES))
    assert names == [
        "notation/Full score - gull-song.pdf",
        "notation/Soprano I/Soprano I - gull-song.pdf",
        "notation/Soprano II/Soprano II - gull-song.pdf",
        "notation/Alto/Alto - gull-song.pdf",
    ]


def test_the_same_score_gives_the_same_bytes() -> None:
    again = next(iter(files_of(tuned("harbour-hymn")).values()))
    assert again == pdf("harbour-hymn")
    assert again.startswith(b"%PDF-")


@needs_poppler
def test_the_pages_hold_title_names_words_page_numbers_and_cents(tmp_path: Path) -> None:
    text = said_by("pdftotext", pdf("tide-motet"), tmp_path, "-layout")
    pages = text.rstrip("\f").split("\f")
    assert len(pages) == 2
    for number, page in enumerate(pages, 1):
        assert "Lumenna maris" in page
        assert re.search(rf"\b{number} ?/ ?2\b", page)
    assert "Corvin Aldesey" in pages[0]
    assert "words: the chapel book" in pages[0]
    assert "Tuned in just intonation" in pages[0]
    # The cents of the page: as many labels as the engraving of the page has.
    shown = engraved(tuned("tide-motet"), tuned("tide-motet").score.source, 1000)
    wanted = re.findall(r'class="cents[^>]*>([^<]*)<', "".join(shown.systems))
    found = re.findall(r"(?<![\d=/])[+−]\d+(?:›[+−]?\d+)?", text)
    assert len(found) >= len([label for label in wanted if label != "0"])


@needs_poppler
@pytest.mark.parametrize(
    ("paper", "size"), [(Paper.A4, "595.2756 x 841.8898"), (Paper.LETTER, "612 x 792")]
)
def test_pages_have_the_size_of_the_paper(paper: Paper, size: str, tmp_path: Path) -> None:
    # ISO 216 A4 is 210 by 297 mm, letter 8.5 by 11 inches, in points of 1/72 inch.
    data = next(iter(files_of(tuned("gull-song"), paper=paper).values()))
    stated = re.search(r"Page size:\s+([\d.]+) x ([\d.]+)", said_by("pdfinfo", data, tmp_path))
    assert stated is not None
    wanted = [float(n) for n in size.split(" x ")]
    assert [float(n) for n in stated.groups()] == pytest.approx(wanted, abs=0.1)


@needs_poppler
def test_every_font_is_in_the_file(tmp_path: Path) -> None:
    lines = said_by("pdffonts", pdf("harbour-hymn"), tmp_path).splitlines()[2:]
    assert lines
    for line in lines:
        assert re.search(r"\byes\s+yes\s+yes\s+\d+\s+\d+$", line), line
        assert "Libertinus" in line or "DejaVu" in line


def test_nothing_is_drawn_beyond_the_margins_and_no_system_on_another() -> None:
    """The SVG pages, measured: pictures are inside the page and below each other."""
    for page in files_of(tuned("regatta-day"), format=Format.SVG).values():
        root = etree.fromstring(page)
        width, height = (float(n) for n in root.get("viewBox").split()[2:])
        assert (width, height) == pytest.approx((595.28, 841.89), abs=0.1)
        boxes = sorted(_images(root, 0.0, 0.0))
        assert boxes
        for top, bottom, left, right in boxes:
            assert top >= 0
            assert bottom <= height - 30
            assert left == pytest.approx(15 / 25.4 * 72, abs=1)
            assert right == pytest.approx(width - 15 / 25.4 * 72, abs=1)
        assert all(upper[1] <= lower[0] for upper, lower in pairwise(boxes))


_MOVE = re.compile(
    r"(?:translate\(([-\d.]+)[ ,]+([-\d.]+)\)"
    r"|matrix\(1[ ,]0[ ,]0[ ,]1[ ,]([-\d.]+)[ ,]([-\d.]+)\))"
)


def _images(element: etree._Element, x: float, y: float) -> list[tuple[float, ...]]:
    """Top, bottom, left and right of every picture, by the moves above it."""
    move = _MOVE.fullmatch(element.get("transform", ""))
    if move is not None:
        dx, dy = (float(n) for n in move.groups() if n is not None)
        x, y = x + dx, y + dy
    found: list[tuple[float, ...]] = []
    if element.tag == f"{SVG}image":
        width, height = float(element.get("width")), float(element.get("height"))
        found.append((y, y + height, x, x + width))
    for child in element:
        found += _images(child, x, y)
    return found


def test_svg_pages_are_numbered_and_form_a_series() -> None:
    options = SheetOptions(format=Format.SVG)
    files = list(SheetExporter().export((Take(tuned("tide-motet")),), options))
    assert [f.name for f in files] == [
        f"notation/Full score - tide-motet {n}.svg" for n in range(1, len(files) + 1)
    ]
    assert {f.series for f in files} == {"notation/Full score - tide-motet"}
    for file in files:
        tree = etree.fromstring(file.data)
        # Letters are outlines: no font of the reader's system is needed.
        assert not list(tree.iter(f"{SVG}text"))


def test_systems_stand_by_themselves_with_their_glyphs() -> None:
    piece = tuned("harbour-hymn")
    picture = engravings(piece, piece.score.source, (Wish(1000, None, 9.0),))[0]
    for system in printed_systems(picture, FONTS):
        root = etree.fromstring(system.svg)
        there = {each.get("id") for each in root.iter(f"{SVG}path")} - {None}
        used = {each.get("href")[1:] for each in root.iter(f"{SVG}use")}
        assert used
        assert used == there
        assert {e.get("font-family") for e in root.iter()} - {None} <= set(FONTS)


def test_many_staves_are_made_smaller_until_they_fit_a_page() -> None:
    names = [f"Voice {n}" for n in range(1, 25)]
    parts = [part_text(*[note("C4", 16)] * 4, id=f"P{n}") for n in range(1, 25)]
    listed = "".join(
        f'<score-part id="P{n}"><part-name>{name}</part-name></score-part>'
        for n, name in enumerate(names, 1)
    )
    pages = files_of(own(score_text(*parts, part_list=listed)), format=Format.SVG)
    assert len(pages) == 1
    boxes = _images(etree.fromstring(next(iter(pages.values()))), 0, 0)
    assert [bottom <= 841.89 - 17 / 25.4 * 72 + 1 for _, bottom, _, _ in boxes] == [True]


@needs_poppler
def test_parts_show_their_name_tempo_and_own_cents_alone(tmp_path: Path) -> None:
    files = files_of(tuned("regatta-day"), parts=Parts.YES)
    text = said_by("pdftotext", files["notation/Bass/Bass - regatta-day.pdf"], tmp_path)
    assert "Bass" in text
    assert "Regatta Day" in text
    assert "Bright, with a swing of the oar" in text
    assert "Alto" not in text


@needs_poppler
def test_words_that_look_like_markup_are_printed_as_they_are(tmp_path: Path) -> None:
    title = '#panic("x") $a$ &lt;b&gt; *c* \\ "d" @e'
    data = score_text(
        part_text(note("C4", 16)),
        head=f"<work><work-title>{title}</work-title></work>",
    )
    made = next(iter(files_of(own(data)).values()))
    text = said_by("pdftotext", made, tmp_path, "-layout")
    assert '#panic("x") $a$ <b> *c* \\ "d" @e' in " ".join(text.split())


@needs_poppler
def test_other_formats_are_printed_too(tmp_path: Path) -> None:
    from tests.export.test_notation_made import KERN, of_bytes

    made = next(iter(files_of(of_bytes(KERN, "a.krn")).values()))
    assert "Soprano" in said_by("pdftotext", made, tmp_path)


def test_what_the_engraver_refuses_is_an_error_that_says_so(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    def refuse(*_: object) -> None:
        raise EngravingError("the engraver cannot take the score")

    monkeypatch.setattr("retune.export.sheet.engravings", refuse)
    with pytest.raises(OutputError, match="cannot be printed: the engraver"):
        files_of(tuned("gull-song"))


def test_a_picture_that_cannot_be_set_is_an_error() -> None:
    with pytest.raises(OutputError, match="cannot be set"):
        pdf_of(Pages("x", [Picture(b"<svg", "bars")]))


@pytest.mark.slow
def test_all_bundled_scores_are_set_on_every_paper() -> None:
    for file in sorted(FIXTURES.glob("*.musicxml")):
        for paper in Paper:
            assert all(files_of(tuned(file.stem), paper=paper, parts=Parts.YES).values())
