"""The notes as played: bars laid out in playing order, ties joined, grace notes placed."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace
from fractions import Fraction

from retune.errors import Weight
from retune.score.bars import Frame
from retune.score.dynamics import Loudness, loudness_of_lines, start_times
from retune.score.grace import with_graces
from retune.score.grid import Grid
from retune.score.ledger import Ledger
from retune.score.lines import Line, display_name
from retune.score.model import Note
from retune.score.order import Step
from retune.score.ties import Chain, Notehead, join_ties, without_overlaps
from retune.score.verses import Verses, report_unsung
from retune.written import WrittenScore


def sounding_notes(
    written: WrittenScore,
    frames: Sequence[Frame],
    steps: Sequence[Step],
    lines: Sequence[Line],
    ledger: Ledger,
) -> tuple[Note, ...]:
    """All notes of the lines as played, sorted by onset, then part, then key."""
    grid = Grid.of(_times(frames, lines))
    verses = [Verses(line.bars) for line in lines]
    levels = loudness_of_lines(written, frames, lines)
    heads = [
        list(_noteheads(place, line, level, words, frames, steps, grid))
        for place, (line, level, words) in enumerate(zip(lines, levels, verses, strict=True))
    ]
    report_unsung(verses, ledger)
    chains: list[list[Chain]] = [[] for _ in lines]
    for part, places in _by_part(lines).items():
        mains = [head for place in places for head in heads[place] if not head.written.grace]
        mains.sort(key=lambda head: head.onset)
        name = display_name(written.parts[part])
        for chain in _joined(mains, steps, frames, name, ledger):
            chains[chain.line].append(chain)
    notes: list[Note] = []
    for line_heads, line_chains in zip(heads, chains, strict=True):
        notes.extend(_notes_of_line(line_heads, line_chains, grid))
    notes.sort(key=lambda note: (float(note.onset), note.part, note.pitch.key))
    return tuple(notes)


def _times(frames: Sequence[Frame], lines: Sequence[Line]) -> Iterator[Fraction]:
    for frame in frames:
        yield frame.length
    for line in lines:
        for bar in line.bars:
            for note in bar:
                yield note.onset
                yield note.duration


def _by_part(lines: Sequence[Line]) -> dict[int, list[int]]:
    """The lines of each written part, as places in the list."""
    places: defaultdict[int, list[int]] = defaultdict(list)
    for place, line in enumerate(lines):
        places[line.written].append(place)
    return places


def _noteheads(
    place: int,
    line: Line,
    level: Loudness,
    words: Verses,
    frames: Sequence[Frame],
    steps: Sequence[Step],
    grid: Grid,
) -> Iterator[Notehead]:
    """The noteheads of a line in playing order."""
    starts = start_times(frames)
    bars = [
        [
            (
                grid.ticks(note.onset),
                grid.ticks(note.duration),
                level.velocity(note, starts[index] + float(note.onset)),
                note,
            )
            for note in bar
        ]
        for index, bar in enumerate(line.bars)
    ]
    start = 0
    for index, step in enumerate(steps):
        bar = step.written
        for onset, length, velocity, note in bars[bar]:
            lyric = words.words(note, bar, step.turn) if note.lyrics else ""
            begin = start + onset
            yield Notehead(place, begin, begin + length, note, index, bar, velocity, lyric)
        start += grid.ticks(frames[bar].length)


def _joined(
    heads: Sequence[Notehead],
    steps: Sequence[Step],
    frames: Sequence[Frame],
    name: str,
    ledger: Ledger,
) -> Iterable[Chain]:
    """The noteheads of one written part with their ties joined."""

    def in_a_row(before: int, after: int) -> bool:
        return steps[after].written - steps[before].written == after - before

    joined = join_ties(heads, in_a_row)
    for loose, what in (
        (joined.loose_starts, "tie that leads to no note of the same pitch"),
        (joined.loose_stops, "tied note without its first note; sung anew"),
    ):
        for head in loose:
            beat = frames[head.bar].beat(head.written.onset)
            ledger.add(Weight.DOUBT, what, name, head.bar, beat)
    return joined.chains


def _notes_of_line(
    heads: Sequence[Notehead], chains: Sequence[Chain], grid: Grid
) -> Sequence[Note]:
    notes = [chain.note(grid) for chain in without_overlaps(chains)]
    graces = [
        replace(Chain([head], head.end).note(grid), grace=True)
        for head in sorted(heads, key=lambda head: head.onset)
        if head.written.grace
    ]
    return with_graces(notes, graces) if graces else notes
