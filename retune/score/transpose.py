"""Transposing a whole score by one interval, spelled so that its keys stay simple."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import replace
from fractions import Fraction

from retune.errors import Finding, Weight, WishError
from retune.pitch import Pitch, PitchClass
from retune.score.model import Bar, ChordSymbol, Note, Score, Transposition
from retune.score.ranges import Beyond, beyond_range

FURTHEST = 24
"""Semitones; a choir that needs more sings another edition."""

_LAST_KEY = 127
_MOST_SIGNS = 7
_MOST_ALTER = 2


def transposed(score: Score, semitones: int) -> Score:
    """A score moved by semitones, with a finding for each part that leaves its usual range.

    All of it moves by one interval, `Score.transposition`, which adds up where a score is moved
    again.

    Raises
    ------
    WishError
        More than two octaves, or a note would leave the keys of MIDI.
    """
    if abs(semitones) > FURTHEST:
        raise WishError(
            f"cannot transpose by {semitones} semitones",
            hint=f"-{FURTHEST} to {FURTHEST} is allowed",
        )
    if not semitones:
        return score
    _check_keys(score, semitones)
    by = _interval(score, semitones)
    pitches = {pitch: _pitch(pitch, by) for pitch in {note.pitch for note in score.notes}}
    before = score.transposition
    after = replace(
        score,
        notes=tuple(replace(note, pitch=pitches[note.pitch]) for note in score.notes),
        bars=tuple(_bar(bar, by) for bar in score.bars),
        chord_symbols=tuple(_symbol(one, by) for one in score.chord_symbols),
        transposition=Transposition(before.semitones + by.semitones, before.fifths + by.fifths),
    )
    return replace(after, findings=(*after.findings, *_leaving(score, after)))


def moved(pitch: PitchClass, by: Transposition) -> PitchClass:
    """A pitch class moved by an interval; where that needs three signs, its enharmonic twin.

    >>> moved(PitchClass("C"), Transposition(1, -5)).name
    'Db'
    >>> moved(PitchClass("F", 2), Transposition(1, 7)).name
    'G#'
    """
    there = by.pitch_class(pitch)
    while abs(there.alter) > _MOST_ALTER:
        there = PitchClass.from_fifths(there.fifths - (12 if there.alter > 0 else -12))
    return there


def _check_keys(score: Score, semitones: int) -> None:
    """Raise `WishError` where the note furthest that way would leave the keys of MIDI."""
    if not score.notes:
        return
    if semitones > 0:
        furthest = max(score.notes, key=_key)
        room, way = _LAST_KEY - _key(furthest), "up"
    else:
        furthest = min(score.notes, key=_key)
        room, way = _key(furthest), "down"
    if abs(semitones) > room:
        raise WishError(
            f"{furthest.pitch} moved {way} by {abs(semitones)} semitones leaves the keys of MIDI",
            score.place(furthest.onset, furthest.part),
            f"At most {room} semitone{'s' * (room != 1)} {way} is possible",
        )


def _key(note: Note) -> int:
    return note.pitch.key


def _interval(score: Score, semitones: int) -> Transposition:
    """Of the spellings of an interval, the one with the fewest signs where it leads to.

    Signs are counted in the key signatures; in the notes where no signature has any, as in
    MIDI files that give none.
    """
    if semitones % 12 == 0:
        return Transposition(semitones, 0)
    signed = any(bar.key[0] for bar in score.bars)
    lengths: defaultdict[int, Fraction] = defaultdict(Fraction)
    if signed:
        for bar in score.bars:
            lengths[bar.key[0]] += bar.duration
    else:
        for note in score.notes:
            lengths[note.pitch.pitch_class.fifths] += note.duration

    def signs(fifths: int) -> tuple[Fraction, int]:
        used = sum(
            (
                length * abs(at + fifths if signed else PitchClass.from_fifths(at + fifths).alter)
                for at, length in lengths.items()
            ),
            Fraction(0),
        )
        # Of equal ones flats, which are more usual (common practice, no source).
        return used, fifths

    nearest = (7 * semitones + 6) % 12 - 6
    other = nearest - 12 if nearest > 0 else nearest + 12
    return Transposition(semitones, min((nearest, other), key=signs))


def _pitch(pitch: Pitch, by: Transposition) -> Pitch:
    return Pitch.at_key(pitch.key + by.semitones, moved(pitch.pitch_class, by))


def _bar(bar: Bar, by: Transposition) -> Bar:
    fifths, mode = bar.key
    there = fifths + by.fifths
    if abs(there) > _MOST_SIGNS:
        there -= 12 if there > 0 else -12
    return replace(bar, key=(there, mode))


def _symbol(one: ChordSymbol, by: Transposition) -> ChordSymbol:
    bass = None if one.bass is None else moved(one.bass, by)
    return replace(one, root=moved(one.root, by), bass=bass)


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
