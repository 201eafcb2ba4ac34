"""Transposing a whole score by one interval, spelled so that its keys stay simple."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from fractions import Fraction

from retune.errors import Finding, UnreadableError, Weight, WishError
from retune.pitch import Pitch, PitchClass
from retune.score.model import Bar, ChordSymbol, Note, Score, Transposition
from retune.score.ranges import Beyond, beyond_range

FURTHEST = 24
"""Semitones; a choir that needs more sings another edition."""

_MOST_SIGNS = 7
_MOST_ALTER = 2


def transposed(score: Score, semitones: int) -> Score:
    """A score moved by semitones, with a finding for each part that leaves its usual range.

    Raises
    ------
    WishError
        More than two octaves.
    UnreadableError
        A note would leave the keys of MIDI.
    """
    if abs(semitones) > FURTHEST:
        raise WishError(
            f"cannot transpose by {semitones} semitones",
            hint=f"-{FURTHEST} to {FURTHEST} is allowed",
        )
    if not semitones:
        return score
    by = _interval(score, semitones)
    moved = replace(
        score,
        notes=tuple(_note(score, note, by) for note in score.notes),
        bars=tuple(_bar(bar, by) for bar in score.bars),
        chord_symbols=tuple(_symbol(one, by) for one in score.chord_symbols),
        transposition=by,
    )
    return replace(moved, findings=(*moved.findings, *_leaving(score, moved)))


def _interval(score: Score, semitones: int) -> Transposition:
    """Of the spellings of an interval, the one with the fewest signs in the keys it leads to."""
    lengths: dict[int, Fraction] = {}
    for bar in score.bars:
        lengths[bar.key[0]] = lengths.get(bar.key[0], Fraction(0)) + bar.duration
    nearest = (7 * semitones + 6) % 12 - 6
    spellings = [Transposition(semitones, nearest + turn) for turn in (0, -12, 12)]

    def signs(by: Transposition) -> tuple[Fraction, int]:
        used = sum((abs(key + by.fifths) * length for key, length in lengths.items()), Fraction(0))
        # Of equal ones flats, which are more usual (D flat before C sharp).
        return used, by.fifths

    return min(spellings, key=signs)


def _note(score: Score, note: Note, by: Transposition) -> Note:
    pitch = note.pitch
    spelled = _spelled(pitch.pitch_class, by)
    key = pitch.key + by.semitones
    if not 0 <= key <= 127:
        raise UnreadableError(
            f"{pitch} transposed by {by.semitones} semitones leaves the keys of MIDI",
            score.place(note.onset, note.part),
            "Transpose by less",
        )
    return replace(note, pitch=Pitch.at_key(key, spelled))


def _spelled(pitch: PitchClass, by: Transposition) -> PitchClass:
    """A pitch class moved; where that needs three signs, its enharmonic twin."""
    fifths = pitch.fifths + by.fifths
    while PitchClass.from_fifths(fifths).alter > _MOST_ALTER:
        fifths -= 12
    while PitchClass.from_fifths(fifths).alter < -_MOST_ALTER:
        fifths += 12
    return PitchClass.from_fifths(fifths)


def _bar(bar: Bar, by: Transposition) -> Bar:
    fifths, mode = bar.key
    moved = fifths + by.fifths
    if abs(moved) > _MOST_SIGNS:
        moved -= 12 if moved > 0 else -12
    return replace(bar, key=(moved, mode))


def _symbol(one: ChordSymbol, by: Transposition) -> ChordSymbol:
    bass = None if one.bass is None else _spelled(one.bass, by)
    return replace(one, root=_spelled(one.root, by), bass=bass)


def _leaving(before: Score, after: Score) -> Iterator[Finding]:
    """A finding for each part and side whose notes go further outside than they did."""
    known = {(one.part.index, one.semitones > 0): one.semitones for one in beyond_range(before)}
    for one in beyond_range(after):
        was = known.get((one.part.index, one.semitones > 0), 0)
        if abs(one.semitones) > abs(was):
            yield Finding(Weight.DOUBT, _words(one), after.place(one.note.onset, one.part.index))


def _words(one: Beyond) -> str:
    count = abs(one.semitones)
    side = "above" if one.semitones > 0 else "below"
    return (
        f"{one.note.pitch} is {count} semitone{'s' * (count > 1)} {side} the usual range of "
        f"{_article(str(one.part.voice_type))}"
    )


def _article(voice: str) -> str:
    return f"an {voice}" if voice[0] in "aeiou" else f"a {voice}"
