"""The exporter `page`: the rehearsal page of a piece, and one for each part."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import partial
from threading import Lock
from typing import Any, ClassVar

from retune.errors import OutputError, Place
from retune.export.base import LateFile
from retune.export.howto import LISTENING, READING_CENTS, VOICE, tuning_words
from retune.export.names import safe_name
from retune.export.options import require_allowed
from retune.page.build import GRID_LEGEND, LEGEND, page, systems_markup
from retune.page.data import page_data
from retune.page.engrave import (
    Engraved,
    EngravingError,
    Wish,
    engravings,
    glyph_sheet,
    notehead_ids,
)
from retune.page.grid import grid
from retune.score.model import Part, Score
from retune.score.titles import part_titles
from retune.tracks.guides import sung_parts
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Drift, Temperament

PLAIN, NARROW, WIDE = 1000, 360, 1700
"""Widths that the score is engraved for, in pixels: laptop, phone, projector."""


@dataclass(frozen=True, slots=True)
class PageOptions:
    """Options of the exporter."""

    part_pages: bool = field(
        default=True, metadata={"help": "also a page for each part, with it chosen"}
    )
    widths: bool = field(default=True, metadata={"help": "also engraved for phone and projector"})
    part_lines: bool = field(default=True, metadata={"help": "also each part's own line, larger"})


class PageExporter:
    """Writes the rehearsal page."""

    name: ClassVar[str] = "page"
    summary: ClassVar[str] = "A page for any browser: the score with its cents, played as tuned"
    suffixes: ClassVar[tuple[str, ...]] = (".html",)
    Options: ClassVar[type[PageOptions]] = PageOptions

    def export(self, takes: Sequence[Take], options: PageOptions) -> Iterator[LateFile]:
        """Yield the page, then those of the parts that have learning tracks.

        Raises `OutputError` where there is no note.
        """
        require_allowed(self.name, options)
        tuned = takes[0].tuned
        if not tuned.score.notes:
            raise OutputError("there is no note to show", Place(tuned.score.file))
        titles = part_titles(tuned.score)
        wanted = {take.folder for take in takes if take.folder}
        parts = [
            part for part in sung_parts(tuned.score) if not wanted or titles[part.index] in wanted
        ]
        made = _Maker(tuned, options, parts)
        stem = safe_name(tuned.score.stem)
        yield LateFile(f"{stem}.html", partial(made.page, None))
        if options.part_pages:
            for part in parts:
                name = f"{stem} - {safe_name(titles[part.index])}.html"
                yield LateFile(name, partial(made.page, part.index))


class _Maker:
    """What all pages of a piece share; made when the first of them is wanted."""

    def __init__(self, tuned: TunedScore, options: PageOptions, parts: Sequence[Part]) -> None:
        self._tuned = tuned
        self._parts = parts
        self._options = options
        self._lock = Lock()
        self._shared: _Shared | None = None

    def page(self, part: int | None) -> bytes:
        """The page with a part chosen, or none."""
        with self._lock:
            if self._shared is None:
                self._shared = self._prepared()
        shared = self._shared
        name = "" if part is None else part_titles(self._tuned.score)[part]
        return page(shared.data, shared.score, shared.packed, shared.words, name)

    def _prepared(self) -> _Shared:
        tuned = self._tuned
        found, reason = self._engraved()
        policy = replace(tuned.policy, drift=Drift.FOLLOW, temperament=Temperament.JUST)
        follow = tune(tuned.score, tuned.harmony, policy)
        if not found:
            words = _words(tuned, GRID_LEGEND, reason)
            return _Shared(page_data(tuned, follow, {}), grid(tuned), {}, words)
        data = page_data(tuned, follow, notehead_ids(tuned.score.source))
        systems = {name: _played(tuned, picture) for name, picture in found.items()}
        plain = glyph_sheet(found.values()) + systems_markup(systems.pop("plain"))
        return _Shared(data, plain, systems, _words(tuned, LEGEND, ""))

    def _engraved(self) -> tuple[dict[str, Engraved], str]:
        """Pictures by name; none, and why, where the score cannot be engraved."""
        wishes = {"plain": Wish(PLAIN)}
        if self._options.widths:
            wishes |= {"narrow": Wish(NARROW), "wide": Wish(WIDE)}
        if self._options.part_lines:
            for part in self._parts:
                wishes[f"part{part.index}"] = Wish(PLAIN, part.index)
        try:
            found = engravings(self._tuned, self._tuned.score.source, tuple(wishes.values()))
        except EngravingError as error:
            return {}, error.what
        return dict(zip(wishes, found, strict=True)), ""


_BAR = re.compile(r'data-bar="(\d+)"')


def _played(tuned: TunedScore, picture: Engraved) -> tuple[str, ...]:
    """The systems that hold a bar that is played: not all do where an excerpt is."""
    written = {str(bar.written) for bar in tuned.score.bars}
    return tuple(one for one in picture.systems if written & set(_BAR.findall(one)))


@dataclass(frozen=True, slots=True)
class _Shared:
    data: Mapping[str, Any]
    score: str
    packed: Mapping[str, Sequence[str]]
    words: Mapping[str, str]


def _words(tuned: TunedScore, legend: str, reason: str) -> dict[str, str]:
    notice = ""
    if reason:
        notice = f"Shown as a grid of chords and parts, as {reason}."
    return {
        "byline": _byline(tuned.score),
        "policy": f"{tuning_words(tuned)} A4 is {tuned.policy.reference_hz:g} Hz.",
        "notice": notice,
        "legend": legend,
        "listening": LISTENING,
        "voice": VOICE,
        "reading": READING_CENTS,
    }


def _byline(score: Score) -> str:
    return " \u00b7 ".join(w for w in (score.composer, score.lyricist, score.copyright) if w)
