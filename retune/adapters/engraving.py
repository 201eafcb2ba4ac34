"""Music engraved as SVG by Verovio, in a process of its own.

Verovio is native code and some damaged scores end it, so it never runs in this process: the
child may crash, hang or write to its standard error without harm. One child draws all pictures
asked for at once. Run as a module, this file is that child.
"""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Sequence
from dataclasses import dataclass

from retune.errors import RetuneError

MAX_SECONDS = 120
"""How long one child may take for all its pictures."""

_MUSIC = 'class="measure"'
"""What every picture of music holds; what is no music is drawn as an empty page."""


class EngravingError(RetuneError):
    """A score that cannot be engraved; its other outputs can still be made."""


@dataclass(frozen=True, slots=True)
class Sheet:
    """One picture to draw.

    `document` is MusicXML ordered by parts. `width` is that of a system in Verovio's units, a
    tenth of what the SVG counts in: 18 to a staff space. `transpose` is an interval such as
    "-M2", empty for none. Noteheads keep their `id`; verses bear `data-n`, their number.
    """

    document: str
    width: int
    transpose: str = ""


def drawn(sheets: Sequence[Sheet]) -> tuple[tuple[str, ...], ...]:
    """Each sheet as SVG texts, one a system, the same bytes every time.

    Raises `EngravingError` where Verovio refuses a document, crashes on it or does not end.
    """
    orders = [[sheet.document, _options(sheet)] for sheet in sheets]
    command = [sys.executable, "-P", "-m", __name__]
    try:
        child = subprocess.run(
            command,
            input=json.dumps(orders).encode(),
            capture_output=True,
            timeout=MAX_SECONDS,
            check=False,
        )
    except subprocess.TimeoutExpired:
        raise EngravingError(f"engraving it did not end in {MAX_SECONDS} seconds") from None
    except OSError as error:
        raise EngravingError(f"no process could be started to engrave it: {error}") from None
    if child.returncode != 0:
        raise EngravingError(_reason(child.stderr.decode(errors="replace")))
    pictures = tuple(
        tuple(page for page in pages if _MUSIC in page) for pages in json.loads(child.stdout)
    )
    if not all(pictures):
        raise EngravingError("the engraver found no music in the score")
    return pictures


def _reason(noise: str) -> str:
    if "No module named 'verovio'" in noise:
        return "the package verovio, which engraves it, is not installed"
    return "the engraver cannot take the score"


def _options(sheet: Sheet) -> dict[str, object]:
    return {
        "inputFrom": "xml",
        "breaks": "auto",
        "systemMaxPerPage": 1,
        "adjustPageHeight": True,
        "header": "none",
        "footer": "none",
        "pageWidth": sheet.width,
        "pageHeight": 60_000,
        "pageMarginTop": 0,
        "pageMarginBottom": 0,
        "pageMarginLeft": 0,
        "pageMarginRight": 0,
        "lyricVerseCollapse": True,
        # Full lines are squeezed a little: without this, words come to touch.
        "lyricWordSpace": 2.4,
        "mnumInterval": 0,
        "transpose": sheet.transpose,
        "smuflTextFont": "none",
        "svgRemoveXlink": True,
        "svgFormatRaw": True,
        "svgViewBox": True,
        "svgAdditionalAttribute": ["verse@n"],
        "xmlIdSeed": 1,
    }


def _draw() -> int:
    """The child: orders from standard input, pictures to standard output."""
    import verovio

    verovio.enableLog(verovio.LOG_OFF)
    pictures: list[list[str]] = []
    for document, options in json.load(sys.stdin.buffer):
        engraver = verovio.toolkit()
        engraver.setOptions(options)
        found = engraver.loadData(document)
        pages = range(1, engraver.getPageCount() + 1) if found else ()
        pictures.append([engraver.renderToSVG(page) for page in pages])
    json.dump(pictures, sys.stdout)
    return 0


if __name__ == "__main__":
    sys.exit(_draw())
