"""Which parts are voices, which cannot move, and which only double others."""

from __future__ import annotations

import difflib
from collections.abc import Container, Iterator, Sequence
from dataclasses import dataclass, replace

from retune.errors import Place, Weight, WishError
from retune.score.bars import Frame
from retune.score.ledger import Ledger
from retune.score.lines import Line, LineBars, display_name, split_part, whole_part
from retune.score.model import PartKind
from retune.score.names import NameReading, Role, plain_label, read_name
from retune.score.naming import named
from retune.score.options import ReadOptions
from retune.score.reductions import DOUBLING, doubled_share
from retune.written import MarkKind, WrittenPart, WrittenScore

FIXED_ROLES = (Role.KEYBOARD, Role.FIXED)

# General MIDI programs, counted from 0. Pianos are no evidence: programs write them by default.
_FIXED_PROGRAMS = frozenset({*range(6, 22), 24, 25, 46, 47})
_PIANO_PROGRAMS = frozenset(range(6))


@dataclass(frozen=True, slots=True)
class Casting:
    """The lines of a score with their names, and the names of parts that do not sound."""

    lines: tuple[Line, ...]
    left_out: tuple[str, ...] = ()


def cast_parts(
    written: WrittenScore, frames: Sequence[Frame], options: ReadOptions, ledger: Ledger
) -> Casting:
    """Split the parts of a file into named lines, and leave reductions out.

    Raises
    ------
    WishError
        A part that the user names is not in the score.
    """
    wishes = {name.strip().casefold() for name in options.accompaniment}
    voices = {name.strip().casefold() for name in options.voices}
    doubled = {name.strip().casefold() for name in options.doubled}
    sounding = [
        (index, part) for index, part in enumerate(written.parts) if any(b.notes for b in part.bars)
    ]
    readings = {index: understand(part) for index, part in sounding}
    only_fixed = all(reading.role in FIXED_ROLES for reading in readings.values())
    lines: list[Line] = []
    for index, part in sounding:
        reading = readings[index]
        name = display_name(part).casefold()
        wished, sung = name in wishes, name in voices
        if sung:
            lines.extend(split_part(index, part, reading.labels, True, frames, ledger))
        elif reading.role in FIXED_ROLES and (wished or not only_fixed):
            lines.append(whole_part(index, part, PartKind.ACCOMPANIMENT, frames))
        else:
            singers = reading.role is not Role.INSTRUMENT
            lines.extend(split_part(index, part, reading.labels, singers, frames, ledger))
            if reading.role in FIXED_ROLES:
                what = "the score has no part for voices; the lines of this one are tuned instead"
                ledger.add(Weight.DOUBT, what, display_name(part))
    lines = _fixed_on_wish(named(lines, ledger), written, wishes, options, ledger.file)
    kept, reductions = _without_reductions(lines, written, readings, wishes, doubled, ledger)
    return Casting(tuple(kept), (*reductions, *_unpitched(written, readings, ledger)))


def _unpitched(written: WrittenScore, sounding: Container[int], ledger: Ledger) -> Iterator[str]:
    """Names of parts that have nothing but unpitched notes; all unpitched notes are noted."""
    for index, part in enumerate(written.parts):
        if part.unpitched:
            plural = "" if part.unpitched == 1 else "s"
            what = f"{part.unpitched} unpitched note{plural} left out"
            ledger.add(Weight.LOSS, what, display_name(part))
            if index not in sounding:
                yield display_name(part)


def understand(part: WrittenPart) -> NameReading:
    """What a part is, by its name, else its abbreviation, instrument, program and notes."""
    reading = read_name(part.name)
    if reading.role is Role.UNKNOWN:
        reading = _by_other_evidence(part, reading)
    if "continuo" in part.name.casefold() and part.staves > 1:
        return replace(reading, role=Role.KEYBOARD)
    return reading


def _by_other_evidence(part: WrittenPart, reading: NameReading) -> NameReading:
    sung = any(note.lyrics for bar in part.bars for note in bar.notes)
    for text in (part.instrument.replace(".", " "), part.abbreviation) if reading.generic else ():
        other = read_name(text)
        if other.role is Role.SINGERS:
            return replace(other, labels=tuple(map(plain_label, other.labels)))
        if other.role in FIXED_ROLES and not sung and (part.staves > 1 or "iano" not in text):
            return other
        if other.role is Role.INSTRUMENT and not sung:
            return other
    by_program = part.program in _FIXED_PROGRAMS or (
        part.program in _PIANO_PROGRAMS and part.staves > 1
    )
    return NameReading(Role.KEYBOARD) if by_program and not sung else reading


def _fixed_on_wish(
    lines: Sequence[Line],
    written: WrittenScore,
    wishes: set[str],
    options: ReadOptions,
    file: str | None,
) -> list[Line]:
    """The lines, with those that the user names unable to move."""

    def names(line: Line) -> set[str]:
        part_name = display_name(written.parts[line.written])
        return {line.label.name.casefold(), part_name.casefold()}

    known = {name for line in lines for name in names(line)}
    for wish in options.accompaniment:
        if wish.strip().casefold() not in known:
            raise _no_such_part(wish, [line.label.name for line in lines], file)
    return [
        replace(line, kind=PartKind.ACCOMPANIMENT) if names(line) & wishes else line
        for line in lines
    ]


def _no_such_part(wish: str, names: Sequence[str], file: str | None) -> WishError:
    by_case = {name.casefold(): name for name in names}
    near = difflib.get_close_matches(wish.strip().casefold(), by_case, n=1)
    listed = ", ".join(dict.fromkeys(names))
    hint = f"Did you mean {by_case[near[0]]}? " if near else ""
    return WishError(
        f"the score has no part named '{wish}'", Place(file=file), f"{hint}Its parts are: {listed}"
    )


def _without_reductions(
    lines: Sequence[Line],
    written: WrittenScore,
    readings: dict[int, NameReading],
    wishes: set[str],
    doubled: set[str],
    ledger: Ledger,
) -> tuple[list[Line], list[str]]:
    """The lines that sound, and the names of the reductions that do not."""
    voices = [line.bars for line in lines if line.kind is PartKind.VOICE]
    kept: list[Line] = []
    left_out: list[str] = []
    for line in lines:
        part = written.parts[line.written]
        if _wished(line, part, doubled):
            left_out.append(line.label.name)
            ledger.add(Weight.NOTE, "left out: the choices say it is doubled", line.label.name)
            continue
        why = "" if _wished(line, part, wishes) else _reduction(line, part, readings, voices)
        if not why:
            kept.append(line)
            continue
        left_out.append(line.label.name)
        hint = f"name '{line.label.name}' as accompaniment to let it sound"
        ledger.add(Weight.NOTE, f"left out: {why}; {hint}", line.label.name)
    return kept, left_out


def _wished(line: Line, part: WrittenPart, wishes: set[str]) -> bool:
    return bool({line.label.name.casefold(), display_name(part).casefold()} & wishes)


def _reduction(
    line: Line,
    part: WrittenPart,
    readings: dict[int, NameReading],
    voices: Sequence[LineBars],
) -> str:
    """Why a keyboard part is taken for a reduction; empty where it is not."""
    if readings[line.written].role is not Role.KEYBOARD or line.kind is PartKind.VOICE:
        return ""
    if not voices:
        return ""
    if readings[line.written].reduction or _says_so(part):
        return "it is for rehearsal only"
    share = doubled_share(line.bars, voices)
    return f"it doubles the voices {share:.0%} of the time" if share >= DOUBLING else ""


def _says_so(part: WrittenPart) -> bool:
    """Whether words in the part's first bars call it a reduction."""
    return any(
        mark.kind is MarkKind.WORDS and read_name(str(mark.value)).reduction
        for bar in part.bars[:2]
        for mark in bar.marks
    )
