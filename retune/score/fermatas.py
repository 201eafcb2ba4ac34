"""Where fermatas stand: spans of a bar that are stretched, once for all parts.

A fermata stretches the notes that bear it. Where several overlap, as in a chord of notes of
different lengths, they are one: from the last of their onsets to the last of their ends.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from fractions import Fraction

from retune.score.bars import Frame
from retune.score.options import Hold
from retune.written import MarkKind, WrittenBar, WrittenNote, WrittenRest, WrittenScore

STRETCH = Fraction(7, 4)
"""How much longer a fermata lasts (common practice, no source: near double)."""

Span = tuple[Fraction, Fraction]
HeldSpan = tuple[Fraction, Fraction, Fraction]
"""Start and stop inside the bar, and how many times as long it lasts."""


def held_spans(
    written: WrittenScore, frames: Sequence[Frame], holds: Sequence[Hold]
) -> list[tuple[HeldSpan, ...]]:
    """For each bar the spans that are stretched: its fermatas, with those that are wished."""
    found = [dict.fromkeys(spans, STRETCH) for spans in fermata_spans(written, frames)]
    for hold in holds:
        own = found[hold.written]
        span = next((one for one in own if one[0] <= hold.inside < one[1]), None)
        if span is None:
            span = (hold.inside, _end_of_sounding(written, frames[hold.written], hold.inside))
        own[span] = hold.times
    return [
        tuple((*span, times) for span, times in sorted(spans.items()) if times != 1)
        for spans in found
    ]


def _end_of_sounding(written: WrittenScore, frame: Frame, inside: Fraction) -> Fraction:
    """Where the first of the notes that sound at a place ends, no later than its bar."""
    ends = [
        note.onset + note.duration
        for part in written.parts
        for note in part.bars[frame.index].notes
        if note.onset <= inside < note.onset + note.duration
    ]
    return min([*ends, frame.length])


def fermata_spans(written: WrittenScore, frames: Sequence[Frame]) -> list[tuple[Span, ...]]:
    """For each bar the spans that fermatas stretch, as (start, stop) inside the bar."""
    found: list[list[Span]] = [[] for _ in frames]
    for part in written.parts:
        for index, bar in enumerate(part.bars):
            found[index].extend(_on_notes(bar))
            for onset in _on_bar_lines(bar):
                place = index if onset > 0 or index == 0 else index - 1
                stop = onset if place == index else frames[place].length
                beat = Fraction(4, frames[place].metre[1])
                found[place].append((max(stop - beat, Fraction(0)), stop))
    return [
        tuple(_as_one(spans, frame.length)) if spans else ()
        for spans, frame in zip(found, frames, strict=True)
    ]


def _on_notes(bar: WrittenBar) -> Iterator[Span]:
    items: tuple[WrittenNote | WrittenRest, ...] = (*bar.notes, *bar.rests)
    for item in items:
        if item.marks and "fermata" in item.marks and item.duration > 0:
            yield item.onset, item.onset + item.duration


def _on_bar_lines(bar: WrittenBar) -> Iterator[Fraction]:
    return (mark.onset for mark in bar.marks if mark.kind is MarkKind.FERMATA)


def _as_one(spans: Sequence[Span], length: Fraction) -> Iterator[Span]:
    """Overlapping spans made one, none beyond the bar, none empty."""
    clusters: list[list[Fraction]] = []
    for start, stop in sorted(spans):
        if clusters and start < clusters[-1][2]:
            clusters[-1] = [clusters[-1][0], start, max(stop, clusters[-1][2])]
        else:
            clusters.append([start, start, stop])
    for _, start, stop in clusters:
        if start < min(stop, length):
            yield start, min(stop, length)
