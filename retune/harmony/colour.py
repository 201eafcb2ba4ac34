"""Tones added to a chord: sixths, ninths, and the fourths and seconds of suspended chords.

Conventions
-----------
* A tone is added where it is no member of the chord, sounds for at least `LASTING` of the
  chord's time, and has no other reason to be there: a tone with a textbook role (suspension,
  passing, neighbour, anticipation, appoggiatura, pedal) is never called added.
* A fourth or second is added only where the third never sounds, so that it stands in its place
  (common practice, no source); a sixth only to a chord without a seventh.
* A chord with added tones keeps its root and quality; its symbol tells the rest.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from fractions import Fraction

from retune.harmony.model import Chord, Degree, Fragment, Quality, Role
from retune.score.model import Score

LASTING = Fraction(2, 3)
"""Share of the chord's time."""

_SEVENTHS = frozenset(quality for quality in Quality if "seventh" in quality or "half" in quality)
_PLAIN = frozenset((Quality.MAJOR, Quality.MINOR))


def add_tones(
    score: Score,
    boundaries: Sequence[Fraction],
    chords: Sequence[Chord],
    fragments: Sequence[Fragment],
) -> tuple[tuple[Chord, ...], tuple[Fragment, ...]]:
    """Chords with their added tones, and fragments in which those are chord tones.

    `boundaries` are the onsets of the slices and the end of the last.
    """
    added: dict[tuple[int, int], Degree] = {}
    for index, strangers in _unexplained(score, fragments).items():
        heard = {f.degree for f in strangers.members if f.degree is not None}
        for chroma, spans in strangers.spans.items():
            degree = _degree(chords[index], chroma, heard)
            lasting = _time(spans, boundaries) >= LASTING * chords[index].duration
            if degree is not None and lasting:
                added[index, chroma] = degree
    return _named(chords, added), tuple(_told(score, f, added) for f in fragments)


class _Strangers:
    """What sounds in one chord: its members, and the spans of unexplained tones by chroma."""

    def __init__(self) -> None:
        self.members: list[Fragment] = []
        self.spans: dict[int, list[tuple[int, int]]] = {}
        self.explained: set[int] = set()


def _unexplained(score: Score, fragments: Sequence[Fragment]) -> dict[int, _Strangers]:
    """By chord: tones of no textbook role; only chords that have some."""
    suspects = {f.chord for f in fragments if f.role is Role.OTHER}
    found = {index: _Strangers() for index in suspects}
    for fragment in fragments:
        if fragment.chord not in suspects:
            continue
        strangers, chroma = found[fragment.chord], _chroma(score, fragment)
        if fragment.role is Role.CHORD_TONE:
            strangers.members.append(fragment)
        elif fragment.role is Role.OTHER:
            strangers.spans.setdefault(chroma, []).append((fragment.first, fragment.last))
        else:
            strangers.explained.add(chroma)
    for strangers in found.values():
        for chroma in strangers.explained:
            strangers.spans.pop(chroma, None)
    return found


def _degree(chord: Chord, chroma: int, heard: set[Degree]) -> Degree | None:
    """What a tone is above a chord's root, if it may be added to it."""
    if chord.root is None or chord.quality is None or len(heard) < 2:
        return None
    above = (chroma - chord.root.chroma) % 12
    seventh, third = chord.quality in _SEVENTHS, Degree.THIRD in heard
    perfect = chord.quality in _PLAIN or seventh
    if above == 2:
        if third:
            return Degree.NINTH
        return Degree.SECOND if chord.quality in _PLAIN else None
    if above == 5 and not third and perfect and Degree.FIFTH in heard:
        return Degree.FOURTH
    return Degree.SIXTH if above == 9 and third and chord.quality in _PLAIN else None


def _time(spans: Iterable[tuple[int, int]], boundaries: Sequence[Fraction]) -> Fraction:
    """Quarter notes in which at least one of these spans of slices sounds."""
    slices = {index for first, last in spans for index in range(first, last)}
    return sum((boundaries[i + 1] - boundaries[i] for i in slices), Fraction(0))


def _named(chords: Sequence[Chord], added: dict[tuple[int, int], Degree]) -> tuple[Chord, ...]:
    by_chord: dict[int, list[Degree]] = {}
    for (index, _), degree in added.items():
        by_chord.setdefault(index, []).append(degree)
    order = list(Degree).index
    return tuple(
        replace(chord, added=tuple(sorted(by_chord[chord.index], key=order)))
        if chord.index in by_chord
        else chord
        for chord in chords
    )


def _told(score: Score, fragment: Fragment, added: dict[tuple[int, int], Degree]) -> Fragment:
    if fragment.role is not Role.OTHER:
        return fragment
    degree = added.get((fragment.chord, _chroma(score, fragment)))
    if degree is None:
        return fragment
    return replace(fragment, role=Role.CHORD_TONE, degree=degree)


def _chroma(score: Score, fragment: Fragment) -> int:
    return score.notes[fragment.note].pitch.key % 12
