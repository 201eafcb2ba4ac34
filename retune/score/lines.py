"""From written parts to lines: one line of singers, or one whole accompaniment part."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from statistics import fmean

from retune.errors import Weight
from retune.score.bars import Frame
from retune.score.division import Deal, deal, share, usual_voices
from retune.score.ledger import Ledger
from retune.score.model import PartKind
from retune.score.names import Label, tidy
from retune.score.owners import owners_of
from retune.score.staves import read_staff
from retune.written import WrittenNote, WrittenPart

LineBars = tuple[tuple[WrittenNote, ...], ...]


@dataclass(frozen=True, slots=True)
class Line:
    """One line as written, its final name still to be found.

    `written` is the part's index in the file, `label` the name that the file suggests ("" where
    it suggests none), `bars` the notes by written bar.
    """

    written: int
    label: Label
    kind: PartKind
    staff: int
    voice: str
    bars: LineBars
    singers: bool = True

    @property
    def mean_key(self) -> float:
        """Mean key number of the notes, each counted once."""
        return fmean(note.pitch.key for bar in self.bars for note in bar)


def whole_part(index: int, part: WrittenPart, kind: PartKind, frames: Sequence[Frame]) -> Line:
    """A part that stays one line, with all its staves and voices."""
    bars = tuple(bar.notes for bar in part.bars)
    bars += ((),) * (len(frames) - len(bars))
    return Line(index, Label(display_name(part)), kind, 1, "1", bars, singers=False)


def display_name(part: WrittenPart) -> str:
    """What to call a part of the file."""
    return tidy(part.name) or tidy(part.instrument) or tidy(part.abbreviation) or part.id


def split_part(
    index: int,
    part: WrittenPart,
    labels: Sequence[Label],
    singers: bool,
    frames: Sequence[Frame],
    ledger: Ledger,
) -> list[Line]:
    """The lines of a part of singers (or of an instrument that can move), from the top."""
    staves = sorted({note.staff for bar in part.bars for note in bar.notes})
    lines: list[Line] = []
    for staff, places in zip(staves, share(len(labels), len(staves)), strict=True):
        bars = read_staff(part, staff, frames)
        groups = [labels[place] for place in places]
        if not groups:
            groups = [Label(tidy(part.name))] * usual_voices(bars)
        owners = owners_of(part, staff, bars, groups)
        dealt = deal(bars, len(groups), owners)
        _report(part, groups, dealt, ledger)
        voices = [voice.voice for bar in bars for voice in bar.voices]
        entries = [
            label for label, size in zip(groups, dealt.sizes, strict=True) for _ in range(size)
        ]
        lines.extend(
            Line(index, label, PartKind.VOICE, staff, voices[0] if voices else "1", notes, singers)
            for label, notes in zip(entries, dealt.lines, strict=True)
        )
    return [line for line in lines if any(line.bars)]


def _report(part: WrittenPart, groups: Sequence[Label], dealt: Deal, ledger: Ledger) -> None:
    name = display_name(part)
    names = list(dict.fromkeys(label.name for label in groups if label.name))
    singers = " and ".join(names) if len(names) > 1 else "all lines of the staff"
    for bar in dealt.shared:
        ledger.add(Weight.NOTE, f"one voice on the staff, sung by {singers}", name, bar)
    for label, size, bars in zip(groups, dealt.sizes, dealt.divided, strict=True):
        for bar in bars:
            what = (
                f"{label.name or name} is divided into {size} lines, which sing the same elsewhere"
            )
            ledger.add(Weight.NOTE, what, name, bar)
