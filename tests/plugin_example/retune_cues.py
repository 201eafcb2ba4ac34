"""An exporter in a package of its own: singers' cues, where each part enters and on which note.

Install it beside retune (``pip install .``) and it is there: ``retune exporters`` lists it, and
``retune export hymn.musicxml --to cues -o out`` writes ``cues/hymn.cues.txt``.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from enum import StrEnum
from fractions import Fraction
from typing import ClassVar

from retune.export.base import OutputFile
from retune.export.names import safe_name
from retune.tracks.take import Take
from retune.tuning.model import TunedNote, TunedScore


class Layout(StrEnum):
    """How a cue is set out."""

    WORDS = "words"
    TABS = "tabs"


@dataclass(frozen=True, slots=True)
class CuesOptions:
    """Options of the exporter; each has a default and a line of help."""

    layout: Layout = field(
        default=Layout.WORDS, metadata={"help": "words to read, or tabs for a spreadsheet"}
    )
    rest: float = field(
        default=0.0,
        metadata={
            "help": "also entries after so many quarter notes of rest; 0 for the first alone",
            "least": 0,
            "most": 1000,
        },
    )


class CuesExporter:
    """Writes one text for a piece."""

    name: ClassVar[str] = "cues"
    summary: ClassVar[str] = "Singers' cues: where each part enters, and its tuned pitch there"
    suffixes: ClassVar[tuple[str, ...]] = (".cues.txt",)
    Options: ClassVar[type[CuesOptions]] = CuesOptions

    def export(self, takes: Sequence[Take], options: CuesOptions) -> Iterator[OutputFile]:
        """Yield the text; all takes have the same music, so the first is enough."""
        tuned = takes[0].tuned
        lines = [_line(tuned, note, options.layout) for note in _entries(tuned, options.rest)]
        text = "".join(f"{line}\n" for line in lines)
        name = f"cues/{safe_name(tuned.score.stem)}.cues.txt"
        yield OutputFile(name, text.encode("utf-8"), f"{len(lines)} entries")


def _entries(tuned: TunedScore, rest: float) -> Iterator[TunedNote]:
    """Part by part, the first note and those after a rest of that many quarter notes."""
    for part in tuned.score.parts:
        silent_from: Fraction | None = None
        for note in tuned.notes:
            if note.note.part != part.index:
                continue
            if silent_from is None or (rest and note.note.onset - silent_from >= rest):
                yield note
            silent_from = max(silent_from or note.note.end, note.note.end)


def _line(tuned: TunedScore, entry: TunedNote, layout: Layout) -> str:
    score, note = tuned.score, entry.note
    cells = (
        score.parts[note.part].name,
        f"bar {score.bar_at(note.onset).number}",
        f"beat {score.beat_at(note.onset)}",
        note.pitch.name,
        f"{entry.segments[0].cents:+.1f} cents",
    )
    return "\t".join(cells) if layout is Layout.TABS else f"{cells[0]}: {', '.join(cells[1:])}"
