"""The exporter `notation`: the user's own MusicXML with the cents written in.

Conventions
-----------
* The file stays in its own key and plays its own bars, whatever is transposed or cut out for
  practising: labels stand where what was asked for is.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from enum import StrEnum
from typing import ClassVar

from retune.adapters.mxl import is_compressed, packed, repacked, unpacked
from retune.adapters.xml_editing import EditedDocument
from retune.errors import OutputError, Place, RetuneError
from retune.export.base import OutputFile
from retune.export.names import safe_name
from retune.export.notation_edit import Additions, Edited, with_additions
from retune.export.notation_heads import Cents
from retune.export.notation_made import as_musicxml
from retune.export.notation_marks import without_additions
from retune.export.notation_part import PartCutter
from retune.export.options import require_allowed
from retune.limits import Limits
from retune.score.model import Part
from retune.score.musicxml import noteheads
from retune.score.musicxml.layout import read_layout
from retune.score.musicxml.log import Log
from retune.score.titles import part_titles
from retune.tracks.guides import sung_parts
from retune.tracks.take import Take
from retune.tuning.model import TunedScore

FOLDER = "notation"


class Container(StrEnum):
    """How the file is packed."""

    AUTO = "auto"
    MXL = "mxl"
    MUSICXML = "musicxml"


class Parts(StrEnum):
    """Whether each singer gets a file: auto where learning tracks are made."""

    AUTO = "auto"
    YES = "yes"
    NO = "no"


@dataclass(frozen=True, slots=True)
class NotationOptions:
    """Options of the exporter."""

    cents: Cents = field(
        default=Cents.ROOT,
        metadata={
            "help": "cents at the notes: from the root of the chord, from equal temperament, none"
        },
    )
    least: int = field(
        default=0,
        metadata={
            "help": "write only cents of at least so many, up or down",
            "least": 0,
            "most": 100,
        },
    )
    chords: bool = field(
        default=False, metadata={"help": "chord names above, where the score has none"}
    )
    accidentals: bool = field(
        default=False,
        metadata={"help": "accidentals with an arrow for each comma from the chord's root"},
    )
    play: bool = field(
        default=True, metadata={"help": "the exact cents of each note, for programs"}
    )
    parts: Parts = field(
        default=Parts.AUTO,
        metadata={"help": "also a file for each part: yes, no, auto where it has learning tracks"},
    )
    container: Container = field(
        default=Container.AUTO,
        metadata={"help": "compressed or plain file, or auto as the score came"},
    )


class NotationExporter:
    """Writes the user's MusicXML with cents."""

    name: ClassVar[str] = "notation"
    summary: ClassVar[str] = "Your own MusicXML with the cents at the notes, each part's too"
    suffixes: ClassVar[tuple[str, ...]] = (".musicxml", ".mxl")
    Options: ClassVar[type[NotationOptions]] = NotationOptions

    def export(self, takes: Sequence[Take], options: NotationOptions) -> Iterator[OutputFile]:
        """Yield the full score, then the parts.

        Raises
        ------
        OutputError
            There is no note, or the score cannot be edited or made.
        """
        require_allowed(self.name, options)
        tuned = takes[0].tuned
        if not tuned.score.notes:
            raise OutputError("there is no note to write cents at", Place(tuned.score.file))
        source = _Source(tuned, options)
        stem = safe_name(tuned.score.stem)
        ending = source.ending
        yield OutputFile(f"{FOLDER}/Full score - {stem}.{ending}", *source.full())
        for title, part in wanted_parts(takes, options.parts):
            name = safe_name(title)
            # Made at once: they are quick, and one that fails must not take other outputs along.
            data = source.part_file(part.index)
            yield OutputFile(f"{FOLDER}/{name}/{name} - {stem}.{ending}", data)


def wanted_parts(takes: Sequence[Take], wish: Parts) -> Iterator[tuple[str, Part]]:
    """The parts that get a file of their own, with their titles."""
    score = takes[0].tuned.score
    titles = part_titles(score)
    tracks = {take.folder for take in takes if take.folder}
    for part in sung_parts(score):
        title = titles[part.index]
        if wish is Parts.YES or (wish is Parts.AUTO and title in tracks):
            yield title, part


class _Source:
    """The user's score, ready to be edited for the whole and for each part."""

    def __init__(self, tuned: TunedScore, options: NotationOptions) -> None:
        self._wish = Additions(
            options.cents, options.least, options.chords, options.accidentals, options.play
        )
        self._asked = tuned
        self._limits = Limits(max_bytes=max(Limits().max_bytes, 2 * len(tuned.score.source)))
        with self._guarded():
            made = tuned if tuned.score.format == "musicxml" else as_musicxml(tuned)
            self._tuned, self._file = made, made.score.source
            compressed = options.container is Container.MXL or (
                options.container is Container.AUTO and is_compressed(self._file)
            )
            self.ending = "mxl" if compressed else "musicxml"
            whole = unpacked(self._file, self._limits)
            plain, self._labels_left = without_additions(whole, self._limits)
            self._document = EditedDocument(plain, self._limits)
            self._named = dict(noteheads(self._document.root))
            self._cutter: PartCutter | None = None

    def full(self) -> tuple[bytes, str]:
        """The whole score, and what to tell of it."""
        with self._guarded():
            document = self._document
            bars = max(len(one.bars) for one in read_layout(document.root, Log()))
            edited = with_additions(self._tuned, document, self._named, self._wish)
            packed_there = is_compressed(self._file) and self.ending == "mxl"
            data = (
                repacked(self._file, edited.data, self._limits)
                if packed_there
                else self._packed(edited.data)
            )
        return data, "; ".join(self._told(edited, bars))

    def part_file(self, index: int) -> bytes:
        """One part's own line."""
        part = self._tuned.score.parts[index]
        with self._guarded():
            if self._cutter is None:
                self._cutter = PartCutter(self._tuned, self._document, self._named, self._limits)
            alone, named = self._cutter.alone(part)
            edited = with_additions(self._tuned, alone, named, self._wish, part)
            return self._packed(edited.data)

    def _packed(self, score: bytes) -> bytes:
        return packed("score.musicxml", score) if self.ending == "mxl" else score

    def _told(self, edited: Edited, bars: int) -> Iterator[str]:
        score = self._asked.score
        if score.format != "musicxml":
            yield "made anew, as the score is no MusicXML"
        if self._wish.cents is not Cents.NONE:
            yield f"cents at {edited.labels} notes"
        if score.format == "musicxml" and len({bar.written for bar in score.bars}) < bars:
            yield "only in the bars that are played; the others stay as they were"
        if score.transposition.semitones and score.format == "musicxml":
            yield "in the key it was written in: transposing leaves the cents as they are"
        if self._labels_left:
            yield (
                "labels of an earlier run have lost their marks and stay; take them out in the "
                "notation program, or give the score without them"
            )
        yield from edited.doubts

    @contextmanager
    def _guarded(self) -> Iterator[None]:
        """Say of what cannot be edited which file it is."""
        try:
            yield
        except OutputError:
            raise
        except RetuneError as error:
            where = replace(error.where, file=error.where.file or self._asked.score.file)
            raise OutputError(error.what, where, error.hint) from error
