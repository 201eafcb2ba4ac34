"""Pages for print, set by Typst: a heading, pictures one below the other, page numbers.

Typst brings its fonts; those of the system only fill in for scripts that these lack.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from importlib.resources import files
from typing import Any, Literal, cast

from retune.errors import OutputError

TEXT_FONT = "Libertinus Serif"
CHORD_FONT = "DejaVu Sans Mono"
"""Fonts that Typst brings with it; the second has flats and sharps in bold print."""


@dataclass(frozen=True, slots=True)
class Picture:
    """An SVG document that takes the width of the page, and what it shows in words.

    `gap` is millimetres from the one before; `new_page` begins a page.
    """

    svg: bytes
    label: str
    gap: float = 0
    new_page: bool = False


@dataclass(frozen=True, slots=True)
class Pages:
    """What is to be set; words that are empty are left out.

    `paper` is a4 or letter; `margins` (at the sides, above, below) and the height of the
    heading are millimetres.
    """

    title: str
    pictures: Sequence[Picture]
    part: str = ""
    composer: str = ""
    lyricist: str = ""
    rights: str = ""
    legend: str = ""
    paper: str = "a4"
    margins: tuple[float, float, float] = (15, 15, 17)
    heading: float = 40


def pdf_of(pages: Pages) -> bytes:
    """One PDF, the same bytes every time; raises `OutputError` where it cannot be set."""
    return _set(pages, "pdf")[0]


def svgs_of(pages: Pages) -> tuple[bytes, ...]:
    """An SVG document a page, with letters as outlines; raises `OutputError`."""
    return _set(pages, "svg")


def _set(pages: Pages, kind: Literal["pdf", "svg"]) -> tuple[bytes, ...]:
    try:
        import typst
    except ImportError:
        raise OutputError(
            "the package typst, which sets pages, is not installed", hint="pip install typst"
        ) from None

    names = [f"{index}.svg" for index in range(len(pages.pictures))]
    said = {
        "title": pages.title,
        "part": pages.part,
        "composer": pages.composer,
        "lyricist": pages.lyricist,
        "rights": pages.rights,
        "legend": pages.legend,
        "paper": pages.paper,
        "margins": pages.margins,
        "heading": pages.heading,
        "font": TEXT_FONT,
        "systems": [
            {"file": name, "label": one.label, "gap": one.gap, "new_page": one.new_page}
            for name, one in zip(names, pages.pictures, strict=True)
        ],
    }
    sources: Mapping[str, bytes] = {
        "main": files("retune.adapters").joinpath("sheet.typ").read_bytes(),
        "piece.json": json.dumps(said, ensure_ascii=True).encode(),
        **dict(zip(names, (one.svg for one in pages.pictures), strict=True)),
    }
    try:
        # Its annotations do not know of several sources, its documentation does.
        made: Any = typst.compile(cast(Any, sources), format=kind, timestamp=0)
    except (typst.TypstError, RuntimeError, ValueError) as fault:
        reason = str(fault).splitlines()[0][:200]
        raise OutputError(f"the pages cannot be set: {reason}") from fault
    return tuple(made) if isinstance(made, list) else (made,)
