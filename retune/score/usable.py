"""Notes that cannot sound are left out before anything else, each with a finding."""

from __future__ import annotations

from dataclasses import replace

from retune.errors import Weight
from retune.score.ledger import Ledger
from retune.score.lines import display_name
from retune.written import WrittenBar, WrittenNote, WrittenPart, WrittenScore


def usable(written: WrittenScore, ledger: Ledger) -> WrittenScore:
    """The score without notes that have no length, no place or no key number."""
    parts = tuple(_usable_part(part, ledger) for part in written.parts)
    return replace(written, parts=parts)


def _usable_part(part: WrittenPart, ledger: Ledger) -> WrittenPart:
    bars = []
    for index, bar in enumerate(part.bars):
        faults = [fault for note in bar.notes if (fault := _fault(note))]
        for fault in faults:
            ledger.add(Weight.LOSS, f"left out: {fault}", display_name(part), index)
        bars.append(_without_faulty(bar) if faults else bar)
    return replace(part, bars=tuple(bars))


def _without_faulty(bar: WrittenBar) -> WrittenBar:
    return replace(bar, notes=tuple(note for note in bar.notes if not _fault(note)))


def _fault(note: WrittenNote) -> str:
    if note.duration.numerator <= 0 and not note.grace:
        return "note without length"
    if note.onset.numerator < 0:
        return "note before the start of its bar"
    if not 0 <= note.pitch.key <= 127:
        return "note outside the range of MIDI keys (0 to 127)"
    return ""
