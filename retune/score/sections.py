"""Repeated sections: what repeat signs and endings of the written bars belong together.

Conventions
-----------
* Bars are indices into the frames, from 0; passes count from 1.
* A repeat without its start goes back to the end of the section before it, or to the first bar.
* Sections may stand inside each other; a repeat end closes the innermost open start.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from retune.errors import Weight
from retune.score.bars import Frame
from retune.score.ledger import Ledger


@dataclass(frozen=True, slots=True)
class Ending:
    """Bars `first` to `last` that are played in some passes only."""

    first: int
    last: int
    passes: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Section:
    """Bars `start` to `stop`, played `times` times.

    `turns` holds the bars after which the music goes back to `start`.
    """

    start: int
    stop: int
    times: int
    turns: frozenset[int]
    endings: tuple[Ending, ...] = ()

    def ending_for(self, run: int) -> Ending | None:
        """The ending of a pass; a pass that none names takes the one of the pass before."""
        if not self.endings or run > max(max(ending.passes) for ending in self.endings):
            return None
        reached = [ending for ending in self.endings if min(ending.passes) <= run]
        return max(reached, key=lambda ending: _closeness(ending, run), default=None)


def _closeness(ending: Ending, run: int) -> tuple[int, int]:
    return max(number for number in ending.passes if number <= run), -len(ending.passes)


def find_sections(frames: Sequence[Frame], ledger: Ledger) -> tuple[Section, ...]:
    """The repeated sections of a piece, inner ones before the ones around them."""
    sections: list[Section] = []
    starts: list[int] = []
    floor = 0
    groups = {group[0].first: group for group in _ending_groups(frames)}
    closing = {group[-1].last: group for group in groups.values()}
    inside = {
        ending.last for group in groups.values() for ending in group
    }  # A repeat end that closes an ending belongs to the whole group.
    for index, frame in enumerate(frames):
        if frame.repeat_start:
            starts.append(index)
        group = closing.get(index)
        if group is not None:
            start = _open_start(starts, group[0].first, floor)
            sections.append(_with_endings(start, group, frames))
            floor = index + 1
        elif frame.repeat_end and index not in inside:
            start = starts.pop() if starts else floor
            sections.append(Section(start, index, frame.repeat_end, frozenset({index})))
            floor = index + 1
    for start in starts:
        ledger.add(Weight.DOUBT, "a repeat starts here but never ends; played once", bar=start)
    return tuple(section for section in sections if section.times > 1 or section.endings)


def _open_start(starts: list[int], first: int, floor: int) -> int:
    """The innermost start that is open where the endings begin; later ones are dropped."""
    while starts and starts[-1] > first:
        starts.pop()
    return starts.pop() if starts else min(floor, first)


def _with_endings(start: int, group: tuple[Ending, ...], frames: Sequence[Frame]) -> Section:
    stop = group[-1].last
    times = max(number for ending in group for number in ending.passes)
    if len(group) == 1:
        # A lone ending is left out the last time, if anything leads back at all.
        times = times + 1 if frames[stop].repeat_end else 1
    turns = frozenset(ending.last for ending in group)
    return Section(start, stop, times, turns, group if times > 1 else ())


def _ending_groups(frames: Sequence[Frame]) -> list[tuple[Ending, ...]]:
    """Neighbouring endings drawn together; only groups that begin with a first pass count."""
    groups: list[list[Ending]] = []
    openings = [frame.index for frame in frames if frame.ending]
    for opening, following in pairwise([*openings, len(frames)]):
        ending = Ending(opening, _last_bar(frames, opening, following), frames[opening].ending)
        if groups and groups[-1][-1].last + 1 == opening and 1 not in ending.passes:
            groups[-1].append(ending)
        else:
            groups.append([ending])
    return [tuple(group) for group in groups if 1 in group[0].passes]


def _last_bar(frames: Sequence[Frame], opening: int, following: int) -> int:
    """The last bar of an ending: where it stops, else its repeat, else before the next one."""
    within = range(opening, following)
    for index in within:
        if frames[index].ending_stop:
            return index
    for index in within:
        if frames[index].repeat_end:
            return index
    return following - 1 if following < len(frames) else opening
