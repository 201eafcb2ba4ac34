"""Whether a keyboard part only doubles the voices."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from fractions import Fraction

from retune.written import WrittenNote

DOUBLING = 0.9
"""Share of its sounding time from which on a part only doubles others."""

Span = tuple[Fraction, Fraction]


def doubled_share(
    bars: Sequence[Sequence[WrittenNote]], others: Sequence[Sequence[Sequence[WrittenNote]]]
) -> float:
    """Share of a part's sounding time in which another line sounds the same key, 0 to 1."""
    total = doubled = Fraction(0)
    for index, notes in enumerate(bars):
        voices = _spans(note for line in others for note in line[index])
        for key, spans in _spans(notes).items():
            for start, stop in spans:
                total += stop - start
                doubled += _overlap(start, stop, voices.get(key, ()))
    return float(doubled / total) if total else 0.0


def _spans(notes: Iterable[WrittenNote]) -> dict[int, list[Span]]:
    """Where each key sounds in a bar; overlapping notes of one key are joined."""
    by_key: dict[int, list[Span]] = defaultdict(list)
    for note in notes:
        if note.duration > 0:
            by_key[note.pitch.key].append((note.onset, note.onset + note.duration))
    return {key: _joined(spans) for key, spans in by_key.items()}


def _joined(spans: list[Span]) -> list[Span]:
    if len(spans) == 1:
        return spans
    joined: list[Span] = []
    for start, stop in sorted(spans):
        if joined and start <= joined[-1][1]:
            joined[-1] = (joined[-1][0], max(stop, joined[-1][1]))
        else:
            joined.append((start, stop))
    return joined


def _overlap(start: Fraction, stop: Fraction, spans: Iterable[Span]) -> Fraction:
    return sum(
        (max(min(stop, end) - max(start, begin), Fraction(0)) for begin, end in spans), Fraction(0)
    )
