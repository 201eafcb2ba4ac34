"""The notes as played: bars laid out in playing order, ties joined, grace notes placed."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import replace
from fractions import Fraction

from retune.errors import Weight
from retune.score.bars import Frame
from retune.score.dynamics import Loudness, loudness, start_times
from retune.score.grace import with_graces
from retune.score.ledger import Ledger
from retune.score.lines import Line, display_name
from retune.score.model import Note, PartKind
from retune.score.order import Step
from retune.score.ties import Notehead, join_ties
from retune.score.verses import Verses
from retune.written import WrittenScore


def sounding_notes(
    written: WrittenScore,
    frames: Sequence[Frame],
    steps: Sequence[Step],
    lines: Sequence[Line],
    ledger: Ledger,
) -> tuple[Note, ...]:
    """All notes of the lines as played, sorted by onset, then part, then key."""
    by_part: defaultdict[int, list[int]] = defaultdict(list)
    for index, line in enumerate(lines):
        by_part[line.written].append(index)
    heads = _noteheads(written, frames, steps, lines, ledger)
    notes: list[Note] = []
    for written_index, indices in by_part.items():
        name = display_name(written.parts[written_index])
        joined = _joined([heads[index] for index in indices], steps, frames, name, ledger)
        for index in indices:
            graces = [head for head in heads[index] if head.written.grace]
            notes.extend(_without_overlaps(with_graces(joined.get(index, []), graces)))
    notes.sort(key=lambda note: (float(note.onset), note.part, note.pitch.key))
    return tuple(notes)


def _noteheads(
    written: WrittenScore,
    frames: Sequence[Frame],
    steps: Sequence[Step],
    lines: Sequence[Line],
    ledger: Ledger,
) -> list[list[Notehead]]:
    """For each line its noteheads in playing order, sorted by onset."""
    levels = _levels(written, frames, lines)
    verses = [Verses(line.bars) for line in lines]
    starts = start_times(frames)
    heads: list[list[Notehead]] = [[] for _ in lines]
    onset = Fraction(0)
    for index, step in enumerate(steps):
        bar = step.written
        for place, line in enumerate(lines):
            level, words = levels[place], verses[place]
            for note in line.bars[bar]:
                heads[place].append(
                    Notehead(
                        line=place,
                        onset=onset + note.onset,
                        written=note,
                        step=index,
                        bar=bar,
                        velocity=level.velocity(note, starts[bar] + float(note.onset)),
                        lyric=words.words(note, bar, step.turn) if note.lyrics else "",
                    )
                )
        onset += frames[bar].length
    for line_heads in heads:
        line_heads.sort(key=lambda head: float(head.onset))
    _report_verses(lines, verses, ledger)
    return heads


def _report_verses(lines: Sequence[Line], verses: Sequence[Verses], ledger: Ledger) -> None:
    unsung = set().union(*(line.printed for line in verses)) - set().union(
        *(line.sung for line in verses)
    )
    if unsung:
        numbers = ", ".join(str(number) for number in sorted(unsung) if number)
        what = (
            f"verse {numbers} has no repeat to be sung in"
            if numbers
            else "a named verse is not sung"
        )
        ledger.add(Weight.NOTE, what)


def _levels(
    written: WrittenScore, frames: Sequence[Frame], lines: Sequence[Line]
) -> list[Loudness]:
    """The dynamics of each line: its own, else those of its part, else of its neighbours."""
    own = [
        loudness(written.parts[line.written], line.staff if line.singers else None, frames)
        for line in lines
    ]
    of_part = {line.written: loudness(written.parts[line.written], None, frames) for line in lines}
    voices = [place for place, line in enumerate(lines) if line.kind is PartKind.VOICE]
    found = []
    for place, line in enumerate(lines):
        level = own[place] or of_part[line.written]
        if level is None:
            nearest = sorted(voices, key=lambda other: (abs(other - place), other))
            level = next((own[other] for other in nearest if own[other] is not None), None)
        found.append(level or Loudness())
    return found


def _joined(
    heads: Iterable[Sequence[Notehead]],
    steps: Sequence[Step],
    frames: Sequence[Frame],
    name: str,
    ledger: Ledger,
) -> dict[int, list[Note]]:
    """The notes of one written part, by line."""
    mains = [head for line in heads for head in line if not head.written.grace]
    mains.sort(key=lambda head: float(head.onset))

    def in_a_row(before: int, after: int) -> bool:
        return steps[after].written - steps[before].written == after - before

    joined = join_ties(mains, in_a_row)
    by_line: dict[int, list[Note]] = {}
    for note in joined.notes:
        by_line.setdefault(note.part, []).append(note)
    for loose, what in (
        (joined.loose_starts, "tie that leads to no note of the same pitch"),
        (joined.loose_stops, "tied note without its first note; sung anew"),
    ):
        for head in loose:
            beat = frames[head.bar].beat(head.written.onset)
            ledger.add(Weight.DOUBT, what, name, head.bar, beat)
    return by_line


def _without_overlaps(notes: Sequence[Note]) -> list[Note]:
    """A line's notes without two of one key that sound at once.

    Where a key is struck again while it sounds, the first note ends there; equal onsets make
    one note.
    """
    result: list[Note] = []
    latest: dict[int, int] = {}
    for note in sorted(notes, key=lambda note: float(note.onset)):
        place = latest.get(note.pitch.key)
        if place is not None and result[place].end > note.onset:
            before = result[place]
            end = max(before.end, note.end)
            if before.onset == note.onset:
                result[place] = replace(
                    before, duration=end - note.onset, sources=before.sources + note.sources
                )
                continue
            result[place] = replace(before, duration=note.onset - before.onset, stolen=Fraction(0))
            note = replace(note, duration=end - note.onset)
        latest[note.pitch.key] = len(result)
        result.append(note)
    return result
