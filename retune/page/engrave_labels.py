"""What is written at each notehead and when it sounds, in the first pass of each written bar.

Conventions
-----------
* Noteheads are named as `Note.sources` names them.
* Label cents are relative to the tuned root of the chord, against equal temperament, rounded.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
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
        values = label_values(tuned, note)
        for span in spans(note, lengths):
            if span.source not in heads:
                heads[span.source] = Head(
                    note.note.part, span.start, label_cents(note, values, span)
                )
    return heads


@dataclass(frozen=True, slots=True)
class Span:
    """A notehead of a note, and the time it stands for as played."""

    source: str
    start: Fraction
    end: Fraction


Values = Sequence[tuple[Segment, int | None]]
"""The segments of a note with their cents as labels say them; None where they say none."""


def label_values(tuned: TunedScore, note: TunedNote, equal: bool = False) -> Values:
    """What labels say of each segment of a note.

    Grace notes, parts that are not tuned and short chords bear none. Cents are relative to the
    root, where the chord has ratios; with `equal` to equal temperament, lone lines too.
    """
    sung = tuned.score.parts[note.note.part].tuned and not note.note.grace
    found: list[tuple[Segment, int | None]] = []
    for segment in note.segments:
        chord = tuned.harmony.chords[segment.chord]
        root = tuned.root_cents[segment.chord]
        long = tuned.seconds(chord.end) - tuned.seconds(chord.onset) >= SHORTEST_CHORD
        said: int | None = None
        if sung and long and equal:
            said = round(segment.cents)
        elif sung and long and root is not None and segment.ratio is not None:
            said = round(segment.cents - root)
        found.append((segment, said))
    return found


def label_cents(note: TunedNote, values: Values, span: Span) -> tuple[int, ...]:
    """The cents to write at a notehead: what sounds on from the one before is written there."""
    here = [
        cents
        for segment, cents in values
        if segment.onset < span.end and segment.end > span.start and cents is not None
    ]
    if span.source != note.note.sources[0] and here and _held_over(values, span.start):
        here = here[1:]
    return tuple(v for i, v in enumerate(here) if i == 0 or v != here[i - 1])


def spans(note: TunedNote, lengths: Mapping[str, Fraction]) -> Iterator[Span]:
    """The noteheads of a note with the time each stands for; `lengths` as in `heads_of`."""
    sources, start, end = note.note.sources, note.note.onset, note.note.end
    known = [lengths.get(source, Fraction(0)) for source in sources]
    if len(sources) > 1 and sum(known) == note.note.duration + note.note.stolen and all(known):
        for source, length in zip(sources, known, strict=True):
            yield Span(source, start, min(start + length, end))
            start += length
    else:
        for index, source in enumerate(sources):
            yield Span(source, start, end if index == 0 else start)


def _held_over(values: Values, start: Fraction) -> bool:
    """Whether what sounds at a tied notehead began before it and is written there."""
    return any(s.onset < start < s.end and cents is not None for s, cents in values)
