"""Rehearsal notes: the places hardest to tune, why, and what to listen for.

Every reason is a figure of the tuned score: how far a note stands from where a piano has it, how
far the chords on either side of it pull it apart, how much two readings of a chord differ. Which
reasons count, and how much one weighs against another, is our choice; what cannot be heard is
left out (chords held for less than half a second: handbook, voice.md 6).

Conventions
-----------
* `severity` is in cents, or in what a director would trade for cents: it ranks and no more.
* Cents in `text` are whole; + and "higher" are sharp.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from enum import StrEnum
from fractions import Fraction

from retune.tuning.model import TunedScore

MOST_NOTES = 12
"""As many as a director goes through in a rehearsal (our choice)."""


class Reason(StrEnum):
    """Why a place is hard to tune."""

    HELD = "held note"
    REPEATED = "repeated note"
    LEAP = "leap"
    THIRD = "exposed third"
    DOUBT = "doubtful chord"
    SEVENTH = "other seventh"
    ENTRY = "entry"
    RANGE = "edge of the range"


@dataclass(frozen=True, slots=True)
class RehearsalNote:
    """One place, or several that are alike, for one part or all.

    Parameters
    ----------
    reason : Reason
    onsets : tuple of Fraction
        In quarter notes as played, of all such places, in order; a bar sung twice stands once.
    bars : tuple of str
        Their printed numbers.
    beat : Fraction
        Of the first.
    parts : tuple of int
        Whom it concerns; empty for everybody.
    severity : float
    text, listen : str
        Why it is hard, and what to listen for.
    """

    reason: Reason
    onsets: tuple[Fraction, ...]
    bars: tuple[str, ...]
    beat: Fraction
    parts: tuple[int, ...]
    severity: float
    text: str
    listen: str

    @property
    def onset(self) -> Fraction:
        """Where the first such place begins."""
        return self.onsets[0]


def rehearsal_notes(tuned: TunedScore, most: int = MOST_NOTES) -> tuple[RehearsalNote, ...]:
    """The places hardest to tune, the hardest first, spread over parts, reasons and bars."""
    return hardest(hard_places(tuned), most)


def hard_places(tuned: TunedScore) -> tuple[RehearsalNote, ...]:
    """Every place that any reason finds, in order; places that are alike stand once."""
    from retune.page.rehearsal_reasons import found

    return tuple(_alike(_strongest_each(found(tuned))))


def hardest(places: Iterable[RehearsalNote], most: int) -> tuple[RehearsalNote, ...]:
    """The hardest of some places, spread over parts, reasons and bars."""
    return tuple(_spread(tuple(places), most))


def concerning(places: Iterable[RehearsalNote], part: int) -> tuple[RehearsalNote, ...]:
    """What a part must know of: its own places and everybody's, in their order."""
    return tuple(note for note in places if not note.parts or part in note.parts)


def _strongest_each(notes: Iterable[RehearsalNote]) -> list[RehearsalNote]:
    """One note for each part and onset: further reasons make the strongest one stronger."""
    places: dict[tuple[Fraction, tuple[int, ...]], list[RehearsalNote]] = {}
    for note in notes:
        places.setdefault((note.onset, note.parts), []).append(note)
    kept = []
    for here in places.values():
        first, *others = sorted(here, key=lambda note: -note.severity)
        kept.append(
            replace(first, severity=first.severity + _AND * sum(o.severity for o in others))
        )
    return sorted(kept, key=lambda note: (note.onset, note.parts))


def _alike(notes: Sequence[RehearsalNote]) -> list[RehearsalNote]:
    """Places of which the same is to be said, as one note with all their bars."""
    groups: dict[tuple[Reason, tuple[int, ...], str], list[RehearsalNote]] = {}
    for note in notes:
        groups.setdefault((note.reason, note.parts, note.text), []).append(note)
    return [_joined(group) for group in groups.values()]


def _joined(group: Sequence[RehearsalNote]) -> RehearsalNote:
    onsets: dict[str, Fraction] = {}
    for note in group:
        onsets.setdefault(note.bars[0], note.onset)
    return replace(
        group[0],
        onsets=tuple(onsets.values()),
        bars=tuple(onsets),
        severity=max(note.severity for note in group),
    )


_AND = 0.3
_SAME_PART, _SAME_REASON, _SAME_BAR = 0.7, 0.75, 0.3
"""What is left of a severity for each note chosen already that is like it in this (our choice):
a director with twelve places to mend wants them from the whole choir and the whole piece."""


def _spread(notes: Sequence[RehearsalNote], most: int) -> list[RehearsalNote]:
    chosen: list[RehearsalNote] = []
    left = list(notes)
    while left and len(chosen) < most:
        best = max(left, key=lambda note: (_weight(note, chosen), -note.onset))
        left.remove(best)
        chosen.append(best)
    return chosen


def _weight(note: RehearsalNote, chosen: Iterable[RehearsalNote]) -> float:
    weight = note.severity
    for other in chosen:
        weight *= _SAME_PART if other.parts == note.parts else 1.0
        weight *= _SAME_REASON if other.reason is note.reason else 1.0
        weight *= _SAME_BAR if set(other.bars) & set(note.bars) else 1.0
    return weight
