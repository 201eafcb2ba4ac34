"""The exporter `sheet`: the score with its cents on pages to print, for all and for each singer."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from enum import StrEnum
from typing import ClassVar

from retune.adapters.typesetting import CHORD_FONT, TEXT_FONT, Pages, Picture, pdf_of, svgs_of
from retune.errors import OutputError, Place
from retune.export.base import OutputFile
from retune.export.howto import tuning_words
from retune.export.names import safe_name
from retune.export.notation import FOLDER, Parts, wanted_parts
from retune.export.notation_made import as_musicxml
from retune.export.options import require_allowed
from retune.export.sheet_layout import MOST_GAP, SetPage, set_pages
from retune.page.build import LEGEND
from retune.page.engrave import EngravingError, Wish, engravings
from retune.page.engrave_print import PrintedSystem, printed_systems
from retune.tracks.take import Take
from retune.tuning.model import TunedScore

_MARGIN, _TOP, _FOOT = 15.0, 15.0, 17.0
"""Millimetres that stay free at the sides, above and below."""

_HEADING, _TITLE_LINE, _PART_LINE, _LETTERS_A_LINE = 33.0, 8.0, 6.0, 44
_SPACE, _ALONE = 1.6, 1.15
"""Height of a staff space in millimetres, and how much larger it is in a part by itself."""
_SMALLER = 0.88
_LEAST_SPACE = 0.8
_MOST_TRIES = 4
_FONTS = (TEXT_FONT, CHORD_FONT)
_PIXELS = 1000
"""Width that is told to the engraver, wide enough for whole names of parts."""


class Format(StrEnum):
    """What the pages are written as."""

    PDF = "pdf"
    SVG = "svg"


class Paper(StrEnum):
    """Size of the pages."""

    A4 = "a4"
    LETTER = "letter"


# Width and height in millimetres: ISO 216, and 8.5 by 11 inches.
_SIZES = {Paper.A4: (210.0, 297.0), Paper.LETTER: (215.9, 279.4)}


@dataclass(frozen=True, slots=True)
class SheetOptions:
    """Options of the exporter."""

    format: Format = field(
        default=Format.PDF, metadata={"help": "one PDF, or an SVG picture for each page"}
    )
    paper: Paper = field(default=Paper.A4, metadata={"help": "size of the pages"})
    size: float = field(
        default=_SPACE,
        metadata={
            "help": "height of a staff space in millimetres; parts alone are larger",
            "least": _LEAST_SPACE,
            "most": 4,
        },
    )
    parts: Parts = field(
        default=Parts.AUTO,
        metadata={"help": "also pages for each part: yes, no, auto where it has learning tracks"},
    )


class SheetExporter:
    """Writes the engraved score as pages."""

    name: ClassVar[str] = "sheet"
    summary: ClassVar[str] = "The score with its cents as pages to print, PDF or SVG"
    suffixes: ClassVar[tuple[str, ...]] = (".pdf", ".svg")
    Options: ClassVar[type[SheetOptions]] = SheetOptions

    def export(self, takes: Sequence[Take], options: SheetOptions) -> Iterator[OutputFile]:
        """Yield the full score, then the parts.

        Raises
        ------
        OutputError
            There is no note, or the score cannot be engraved.
        """
        require_allowed(self.name, options)
        tuned = takes[0].tuned
        if not tuned.score.notes:
            raise OutputError("there is no note to print", Place(tuned.score.file))
        stem = safe_name(tuned.score.stem)
        wanted = list(wanted_parts(takes, options.parts))
        engraver = _Engraver(tuned, options)
        settings = engraver.settings([None, *(part.index for _, part in wanted)])
        names = [
            f"{FOLDER}/Full score - {stem}",
            *(f"{FOLDER}/{safe_name(title)}/{safe_name(title)} - {stem}" for title, _ in wanted),
        ]
        titles = ["", *(title for title, _ in wanted)]
        for name, title, setting in zip(names, titles, settings, strict=True):
            yield from self._files(name, engraver.pages(setting, title), options)

    def _files(self, name: str, pages: Pages, options: SheetOptions) -> Iterator[OutputFile]:
        if options.format is Format.PDF:
            count = 1 + sum(one.new_page for one in pages.pictures)
            note = f"{count} page{'s' if count > 1 else ''}"
            yield OutputFile(f"{name}.pdf", pdf_of(pages), note)
            return
        drawn = svgs_of(pages)
        digits = len(str(len(drawn)))
        for number, page in enumerate(drawn, 1):
            yield OutputFile(f"{name} {number:0{digits}d}.svg", page, series=name)


@dataclass(frozen=True, slots=True)
class _Setting:
    """One engraving for pages, its staff spaces `space` millimetres high.

    `too_high` is by how much its highest system exceeds a page, 1 where none does.
    """

    part: int | None
    space: float
    systems: tuple[PrintedSystem, ...]
    pages: tuple[SetPage, ...]
    too_high: float

    @property
    def loose(self) -> int:
        """How many pages before the last leave much of their height free."""
        return sum(page.gap >= MOST_GAP or page.stop - page.first == 1 for page in self.pages[:-1])

    @property
    def fault(self) -> tuple[float, int, int, float]:
        """What is wrong with it, to be compared; the larger of equals is better."""
        return self.too_high, len(self.pages), self.loose, -self.space


class _Engraver:
    """Engraves a score for pages of one size."""

    def __init__(self, tuned: TunedScore, options: SheetOptions) -> None:
        self._asked = tuned
        self._options = options
        self._tuned = tuned if tuned.score.format == "musicxml" else as_musicxml(tuned)
        width, height = _SIZES[options.paper]
        self._width = width - 2 * _MARGIN
        self._room = height - _TOP - _FOOT
        lines = max(-(-len(self._title) // _LETTERS_A_LINE), 1)
        self._heading = _HEADING + _TITLE_LINE * (lines - 1)

    @property
    def _title(self) -> str:
        return self._asked.score.title or self._asked.score.stem

    def settings(self, parts: Sequence[int | None]) -> list[_Setting]:
        """Every wished engraving, at the size that suits its pages; None is the full score.

        A system must fit its page, and where a little smaller saves a page it is that.
        """
        size = self._options.size
        wished = {part: size if part is None else size * _ALONE for part in parts}
        best: dict[int | None, _Setting] = {}
        for _ in range(_MOST_TRIES):
            again: dict[int | None, float] = {}
            for setting in self._engraved(wished):
                known = best.get(setting.part)
                if known is None or setting.fault < known.fault:
                    best[setting.part] = setting
                if setting.too_high > 1 and setting.space > _LEAST_SPACE:
                    smaller = 0.98 * setting.space / setting.too_high
                    again[setting.part] = max(smaller, _LEAST_SPACE)
                elif known is None and setting.loose:
                    again[setting.part] = max(_SMALLER * setting.space, _LEAST_SPACE)
            if not again:
                break
            wished = again
        return [best[part] for part in parts]

    def _engraved(self, wished: Mapping[int | None, float]) -> Iterator[_Setting]:
        wishes = [
            Wish(_PIXELS, part, _PIXELS * space / self._width) for part, space in wished.items()
        ]
        try:
            found = engravings(self._tuned, self._tuned.score.source, wishes)
        except EngravingError as error:
            where = replace(error.where, file=error.where.file or self._asked.score.file)
            hint = error.hint or "The output notation is for a notation program instead"
            raise OutputError(f"it cannot be printed: {error.what}", where, hint) from error
        played = {bar.written for bar in self._tuned.score.bars}
        for (part, space), picture in zip(wished.items(), found, strict=True):
            systems = tuple(s for s in printed_systems(picture, _FONTS) if s.bars & played)
            heights = [self._height(system) for system in systems]
            first = self._room - self._heading_of(part)
            excess = max([heights[0] / first, *(height / self._room for height in heights), 1.0])
            yield _Setting(part, space, systems, set_pages(heights, first, self._room), excess)

    def _height(self, system: PrintedSystem) -> float:
        return self._width * system.height / system.width

    def _heading_of(self, part: int | None) -> float:
        return self._heading + (0 if part is None else _PART_LINE)

    def pages(self, setting: _Setting, part: str) -> Pages:
        """The pages of an engraving; `part` is the name of the only part in it."""
        score, pictures = self._asked.score, []
        for page in setting.pages:
            for index in range(page.first, page.stop):
                system = setting.systems[index]
                new = index == page.first
                pictures.append(
                    Picture(system.svg, system.label, 0 if new else page.gap, new and index > 0)
                )
        return Pages(
            self._title,
            pictures,
            part=part,
            composer=score.composer,
            lyricist=score.lyricist,
            rights=score.copyright,
            legend=f"{LEGEND} {tuning_words(self._asked)}",
            paper=str(self._options.paper),
            margins=(_MARGIN, _TOP, _FOOT),
            heading=self._heading_of(setting.part),
        )
