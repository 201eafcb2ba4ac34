"""From written parts to lines: one line of singers, or one whole accompaniment part."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from statistics import fmean

from retune.errors import Weight
from retune.score.bars import Frame
from retune.score.division import Deal, deal, share, usual_voices
from retune.score.ledger import Ledger
from retune.score.model import PartKind
from retune.score.names import Label, read_name, tidy
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
    whole_staff: bool = True
    """False for a part that stays one line with all its staves."""

    @property
    def mean_key(self) -> float:
        """Mean key number of the notes, each counted once."""
        return fmean(note.pitch.key for bar in self.bars for note in bar)


def whole_part(index: int, part: WrittenPart, kind: PartKind, frames: Sequence[Frame]) -> Line:
    """A part that stays one line, with all its staves and voices."""
    bars = tuple(bar.notes for bar in part.bars)
    bars += ((),) * (len(frames) - len(bars))
    return Line(
        index, Label(display_name(part)), kind, 1, "1", bars, singers=False, whole_staff=False
    )


def display_name(part: WrittenPart) -> str:
    """What to call a part of the file; never empty."""
    names = [tidy(name) for name in (part.name, part.instrument, part.abbreviation)]
    telling = (name for name in names if name and not read_name(name).generic)
    return next(telling, names[0] or part.id or "Part")


def _own_name(part: WrittenPart, groups: int) -> str:
    """The name of lines whose part's name names no voices; "" where it says nothing."""
    name = tidy(part.name)
    empty = "musicxml" in name.casefold() or (groups > 1 and name[-1:].isdigit())
    return "" if read_name(name).generic and empty else name


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
            count = usual_voices(bars)
            groups = [Label(_own_name(part, count * len(staves)))] * count
        owners = owners_of(part, staff, bars, groups)
        dealt = deal(bars, len(groups), owners)
        _report(part, groups, dealt, ledger)
        entries = [
            label for label, size in zip(groups, dealt.sizes, strict=True) for _ in range(size)
        ]
        lines.extend(
            Line(index, label, PartKind.VOICE, staff, _voice(notes), notes, singers)
            for label, notes in zip(entries, dealt.lines, strict=True)
            if any(notes)
        )
    return lines


def _voice(bars: LineBars) -> str:
    """The voice of the file that a line mostly is."""
    return Counter(note.voice for bar in bars for note in bar).most_common(1)[0][0]


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
