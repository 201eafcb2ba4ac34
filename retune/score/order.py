"""The playing order: repeats, endings and jumps played out.

Conventions
-----------
* A jump (D.C., D.S.) is taken once, on the last pass of the section it stands in; after it,
  sections that were played already are played once, with their last ending (common practice,
  no source).
* Fine, D.C., D.S. and To Coda take effect at the end of their bar; segno and coda stand at the
  start of theirs, or of the next one where they are printed in its second half.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from retune.errors import LimitError, Place, Weight
from retune.score.bars import Frame
from retune.score.ledger import Ledger
from retune.score.sections import Section, find_sections
from retune.written import Mark, MarkKind


@dataclass(frozen=True, slots=True)
class Step:
    """One bar as played: a written bar, the pass of its section, and how often it was met.

    `turn` decides the verse: it is the pass, or the number of times that the bar has been
    played so far where that is more.
    """

    written: int
    run: int = 1
    turn: int = 1


def playing_order(
    frames: Sequence[Frame],
    notes: Sequence[int],
    max_notes: int,
    ledger: Ledger,
    repeats: bool = True,
) -> tuple[Step, ...]:
    """The bars in the order in which they are played.

    Parameters
    ----------
    frames : sequence of Frame
    notes : sequence of int
        Notes in each frame; an empty bar counts as one note against the limit.
    max_notes : int
    ledger : Ledger
    repeats : bool
        False plays every bar once, as written.

    Raises
    ------
    LimitError
        Where the repeats lead past `max_notes`.
    """
    if repeats:
        played = _Player(frames, find_sections(frames, ledger), ledger).steps()
    else:
        played = (Step(frame.index, min(frame.ending, default=1)) for frame in frames)
    steps: list[Step] = []
    total = 0
    for step in played:
        total += max(notes[step.written], 1)
        if total > max_notes:
            raise LimitError(
                f"more than {max_notes} notes once repeats are played out",
                Place(bar=frames[step.written].number),
                "Read it without repeats, or raise the limit on notes",
            )
        steps.append(step)
    _report_unplayed(frames, steps, ledger)
    return tuple(steps)


def _report_unplayed(frames: Sequence[Frame], steps: Sequence[Step], ledger: Ledger) -> None:
    played = {step.written for step in steps}
    for frame in frames:
        if frame.index not in played:
            ledger.add(Weight.LOSS, "no repeat or jump leads here; not played", bar=frame.index)


class _Player:
    """Walks through the bars, with the state that repeats and jumps need."""

    def __init__(
        self, frames: Sequence[Frame], sections: Sequence[Section], ledger: Ledger
    ) -> None:
        self._frames = frames
        self._sections = sections
        self._starting = _by_start(sections)
        self._endings = {
            ending.first: (section, ending) for section in sections for ending in section.endings
        }
        self._turning = {bar: section for section in sections for bar in section.turns}
        self._innermost = _innermost(sections, len(frames))
        self._ledger = ledger
        self._run = dict.fromkeys(sections, 1)
        self._visited: set[Section] = set()
        self._spent: set[Section] = set()
        self._met = [0] * len(frames)
        self._jumped_from: set[int] = set()
        self._jump: Mark | None = None
        self._segnos = self._landings(MarkKind.SEGNO)
        self._codas = self._landings(MarkKind.CODA)
        self._to_codas = self._bars_with(MarkKind.TO_CODA)
        self._fines = self._bars_with(MarkKind.FINE)

    def steps(self) -> Iterator[Step]:
        index = 0
        returning: Section | None = None
        while index < len(self._frames):
            self._enter(index, returning)
            returning = None
            opened = self._endings.get(index)
            if opened is not None and opened[0].ending_for(self._run[opened[0]]) != opened[1]:
                index = opened[1].last + 1
                continue
            yield self._step(index)
            if self._ends_at_fine(index):
                return
            target = self._jump_target(index)
            if target is not None:
                index = target
                continue
            turning = self._turning.get(index)
            if turning is not None and self._run[turning] < turning.times:
                self._run[turning] += 1
                returning, index = turning, turning.start
                continue
            index += 1

    def _enter(self, index: int, returning: Section | None) -> None:
        for section in self._starting.get(index, ()):
            if section is not returning:
                self._run[section] = section.times if section in self._spent else 1
                self._visited.add(section)

    def _step(self, index: int) -> Step:
        section = self._innermost[index]
        run = 1 if section is None else self._run[section]
        self._met[index] += 1
        return Step(index, run, max(run, self._met[index]))

    def _sign(self, index: int, kind: MarkKind) -> Mark | None:
        return next((mark for mark in self._frames[index].jumps if mark.kind is kind), None)

    def _bars_with(self, kind: MarkKind) -> frozenset[int]:
        indices = range(len(self._frames))
        return frozenset(index for index in indices if self._sign(index, kind) is not None)

    def _ends_at_fine(self, index: int) -> bool:
        return self._jump is not None and self._jump.value != "coda" and index in self._fines

    def _jump_target(self, index: int) -> int | None:
        """Where the music goes on after a bar, if a jump is taken there."""
        if self._jump is not None and self._jump.value != "fine":
            coda = self._coda_after(index)
            if coda is not None:
                self._jump = Mark(self._jump.kind, self._jump.onset, "fine")
                return coda
        for kind in (MarkKind.DA_CAPO, MarkKind.DAL_SEGNO):
            sign = self._sign(index, kind)
            if sign is None or index in self._jumped_from or not self._on_last_pass(index):
                continue
            target = 0 if kind is MarkKind.DA_CAPO else self._segno_for(index)
            self._jumped_from.add(index)
            if target is None:
                self._ledger.add(
                    Weight.LOSS, "D.S. without a segno; the jump was left out", bar=index
                )
                continue
            self._jump = sign
            self._spent |= self._visited
            self._run.update((section, section.times) for section in self._spent)
            self._doubt(sign, index)
            return target
        return None

    def _doubt(self, sign: Mark, index: int) -> None:
        """Note a jump whose end is named but nowhere printed."""
        beyond = any(self._coda_after(bar) is not None for bar in range(len(self._frames)))
        if sign.value == "coda" and not beyond:
            what = "al Coda, without a coda sign to leave at or to go to; played to the end"
            self._ledger.add(Weight.DOUBT, what, bar=index)
        if sign.value == "fine" and not self._fines:
            what = "al Fine, without a Fine; played to the end"
            self._ledger.add(Weight.DOUBT, what, bar=index)

    def _on_last_pass(self, index: int) -> bool:
        """A jump waits for the last pass, unless it stands in an ending of its own."""
        section = self._innermost[index]
        if section is None or self._run[section] >= section.times:
            return True
        return any(ending.first <= index <= ending.last for ending in section.endings)

    def _segno_for(self, index: int) -> int | None:
        """The segno before a bar."""
        return max((bar for bar in self._segnos if bar <= index), default=None)

    def _landings(self, kind: MarkKind) -> list[int]:
        """The bars that signs of a kind lead to."""
        bars = []
        for frame in self._frames:
            sign = self._sign(frame.index, kind)
            if sign is not None:
                late = 2 * sign.onset > frame.length and frame.index + 1 < len(self._frames)
                bars.append(frame.index + late)
        return bars

    def _leaves_for_coda(self, index: int) -> bool:
        if self._to_codas:
            return index in self._to_codas
        # Two coda signs alone: the first one is where to leave.
        return len(self._codas) > 1 and index + 1 == self._codas[0]

    def _coda_after(self, index: int) -> int | None:
        """The coda, if the music leaves for it at the end of this bar."""
        if not self._leaves_for_coda(index):
            return None
        beyond = [bar for bar in self._codas if bar > index]
        return beyond[-1] if beyond else None


def _by_start(sections: Sequence[Section]) -> dict[int, list[Section]]:
    starting: dict[int, list[Section]] = {}
    for section in sections:
        starting.setdefault(section.start, []).append(section)
    return starting


def _innermost(sections: Sequence[Section], count: int) -> list[Section | None]:
    """The shortest section around each bar."""
    around: list[Section | None] = [None] * count
    for section in sorted(sections, key=lambda section: section.start - section.stop):
        around[section.start : section.stop + 1] = [section] * (section.stop + 1 - section.start)
    return around
