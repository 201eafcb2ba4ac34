"""What is written at each notehead and when it sounds, in the first pass of each written bar.

Conventions
-----------
* Noteheads are named as `Note.sources` names them.
* Label cents are relative to the tuned root of the chord, against equal temperament, rounded.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from fractions import Fraction

from retune.tuning.model import Segment, TunedNote, TunedScore

SHORTEST_CHORD = 0.5
"""Seconds below which a chord's cents are not written: nobody tunes so short a chord."""

SMALL = 5
"""Cents up to which a label is small: about the least difference that is heard."""


@dataclass(frozen=True, slots=True)
class Head:
    """A notehead as first played: its part, onset and the cents to write at it, one a chord."""

    part: int
    onset: Fraction
    cents: tuple[int, ...]

    @property
    def text(self) -> str:
        """The label, such as "−14" or "+2›−12"; empty for none.

        >>> Head(0, Fraction(0), (2, -12)).text
        '+2›−12'
        """
        return "›".join(signed(value) for value in self.cents)


def is_small(label: str) -> bool:
    """Whether no value of a label is large.

    >>> is_small("+2›−5"), is_small("0›−14")
    (True, False)
    """
    return all(abs(int(value.replace("−", "-"))) <= SMALL for value in label.split("›"))


def signed(cents: int) -> str:
    """Whole cents with a true minus sign; 0 without a sign.

    >>> [signed(value) for value in (-14, 0, 2)]
    ['−14', '0', '+2']
    """
    return f"{cents:+d}".replace("-", "−") if cents else "0"


def heads_of(tuned: TunedScore, lengths: Mapping[str, Fraction]) -> dict[str, Head]:
    """Every notehead that sounds, as the first note that uses it plays it.

    `lengths` are written lengths of noteheads in quarter notes. Where those of a tied note do
    not add up to it, all its cents stand at its first notehead.
    """
    heads: dict[str, Head] = {}
    for note in tuned.notes:
        sources = note.note.sources
        values = list(_values(tuned, note))
        for source, start, end in _spans(note, lengths):
            if source in heads:
                continue
            here = [
                cents
                for segment, cents in values
                if segment.onset < end and segment.end > start and cents is not None
            ]
            if source != sources[0] and here and _held_over(values, start):
                here = here[1:]
            heads[source] = Head(note.note.part, start, _without_repeats(here))
    return heads


def _values(tuned: TunedScore, note: TunedNote) -> Iterator[tuple[Segment, int | None]]:
    """The segments of a note with their cents; None where none are to be written."""
    sung = tuned.score.parts[note.note.part].tuned and not note.note.grace
    for segment in note.segments:
        chord = tuned.harmony.chords[segment.chord]
        root = tuned.root_cents[segment.chord]
        long = tuned.seconds(chord.end) - tuned.seconds(chord.onset) >= SHORTEST_CHORD
        shown = sung and long and root is not None and segment.ratio is not None
        yield segment, round(segment.cents - root) if shown and root is not None else None


def _spans(
    note: TunedNote, lengths: Mapping[str, Fraction]
) -> Iterator[tuple[str, Fraction, Fraction]]:
    """The noteheads of a note with the time each stands for."""
    sources, start, end = note.note.sources, note.note.onset, note.note.end
    known = [lengths.get(source, Fraction(0)) for source in sources]
    if len(sources) > 1 and sum(known) == note.note.duration + note.note.stolen and all(known):
        for source, length in zip(sources, known, strict=True):
            yield source, start, min(start + length, end)
            start += length
    else:
        for index, source in enumerate(sources):
            yield source, start, end if index == 0 else start


def _held_over(values: list[tuple[Segment, int | None]], start: Fraction) -> bool:
    """Whether what sounds at a tied notehead began before it and is written there."""
    return any(s.onset < start < s.end and cents is not None for s, cents in values)


def _without_repeats(values: list[int]) -> tuple[int, ...]:
    return tuple(v for i, v in enumerate(values) if i == 0 or v != values[i - 1])
