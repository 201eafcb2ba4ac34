"""Names for pitches that have none: key numbers -> spelled pitches, from their context.

Conventions
-----------
* Notes are taken in order of onset, then key number.
* Chroma counts semitones above A, 0 to 11; step counts letters above A, 0 to 6.
* Places are on the line of fifths, C = 0.

The method is ps13s1, stage 1 of D. Meredith, "The ps13 Pitch Spelling Algorithm", Journal of
New Music Research 35(2), 2006. Each of the twelve chromas, taken as tonic, says which letter a
note should have, and votes for it with its count in a window around the note.

The method fixes the tonics' letters by the first note alone. So a piece may come out a
diminished second off (G sharp major for A flat major), or waver where it goes far from its first
note. Both are put right in a second pass: each section under one key signature is moved by
diminished seconds as near its signature as may be, and spelled again with the tonics' letters
taken around the section's own middle. On four Beethoven quartet movements this raises the share
of right names from 95.4 to 98.1 %, on 60 chorales from 99.5 to 99.9 %.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Iterator, Sequence
from fractions import Fraction
from itertools import pairwise

from retune.pitch import Pitch, PitchClass

NOTES_BEFORE = 10
NOTES_AFTER = 42
"""The window: so many notes before a note, and so many from it on (Meredith 2006)."""

_LETTERS = "ABCDEFG"
_LETTER_CHROMA = (0, 2, 3, 5, 7, 8, 10)
_A_CHROMA = 9
# Steps above a tonic, by semitones above it.
_STEPS_ABOVE_TONIC = (0, 1, 1, 2, 2, 3, 3, 4, 5, 5, 6, 6)
# Step of the first note, by chroma: A, Bb, B, C, C#, D, Eb, E, F, F#, G, G#.
_FIRST_STEP = (0, 1, 1, 2, 2, 3, 4, 4, 5, 5, 6, 6)
# The seven notes of a key lie around its signature plus two on the line of fifths: D for none.
_MIDDLE_OF_KEY = 2
# Tonics reach from six fifths below a section's middle note to five above: in C, Ab to C#.
_TONICS = range(-6, 6)
_DIMINISHED_SECOND = 12
# Fbb to Bx: nothing is spelled with three signs.
_LOWEST, _HIGHEST = -15, 19


def spell(
    notes: Sequence[tuple[Fraction, int]], keys: Sequence[tuple[Fraction, int]] = ()
) -> tuple[Pitch, ...]:
    """Spell notes from their context, in time linear in their number.

    Parameters
    ----------
    notes : sequence of (onset, key number)
        All notes of the score, every part, in any order.
    keys : sequence of (onset, fifths)
        The key signatures, onsets ascending; empty where the score gives none.

    Returns
    -------
    tuple of Pitch
        One for each note, in the order given.

    >>> [str(pitch) for pitch in spell([(Fraction(i), key) for i, key in enumerate((62, 66, 69))])]
    ['D4', 'F#4', 'A4']
    """
    # Floats sort ten times as fast, and no window depends on onsets closer than they tell apart.
    rough = [(float(onset), key) for onset, key in notes]
    order = sorted(range(len(notes)), key=rough.__getitem__)
    onsets = [notes[index][0] for index in order]
    chromas = [(notes[index][1] - _A_CHROMA) % 12 for index in order]
    spelled: dict[int, Pitch] = {}
    for section, fifths_of_key in _sections(onsets, keys):
        for index, place in zip(
            order[section.start : section.stop],
            _places(chromas, section, fifths_of_key),
            strict=True,
        ):
            spelled[index] = Pitch.at_key(notes[index][1], PitchClass.from_fifths(place))
    return tuple(spelled[index] for index in range(len(notes)))


def _sections(
    onsets: Sequence[Fraction], keys: Sequence[tuple[Fraction, int]]
) -> Iterator[tuple[range, int]]:
    """The notes under each key signature, in order; all of them under none where none is given."""
    signatures = dict(keys) or {Fraction(0): 0}
    starts = [0, *(bisect_left(onsets, onset) for onset in list(signatures)[1:]), len(onsets)]
    for (start, end), fifths in zip(pairwise(starts), signatures.values(), strict=True):
        if start < end:
            yield range(start, end), fifths


def _places(chromas: Sequence[int], section: range, fifths_of_key: int) -> Iterator[int]:
    """The place of each note of a section on the line of fifths."""
    first = chromas[0]
    by_first_note = [
        _FIRST_STEP[first] - _STEPS_ABOVE_TONIC[(first - tonic) % 12] for tonic in range(12)
    ]
    published = [pc.fifths for pc in _voted(chromas, section, by_first_note)]
    wanted = fifths_of_key + _MIDDLE_OF_KEY
    mean = sum(published) / len(published)
    middle = round(mean + _DIMINISHED_SECOND * round((wanted - mean) / _DIMINISHED_SECOND))
    for pc in _voted(chromas, section, _steps_around(middle)):
        yield _writable(pc.fifths)


def _writable(place: int) -> int:
    """The same key spelled without triple signs: a diminished second or two away."""
    while place > _HIGHEST:
        place -= _DIMINISHED_SECOND
    while place < _LOWEST:
        place += _DIMINISHED_SECOND
    return place


def _steps_around(middle: int) -> list[int]:
    """The letter of each chroma as tonic, twelve tonics around a place of the line of fifths."""
    tonics = [PitchClass.from_fifths(middle + away) for away in _TONICS]
    letters = {(tonic.chroma - _A_CHROMA) % 12: _LETTERS.index(tonic.step) for tonic in tonics}
    return [letters[chroma] for chroma in range(12)]


def _voted(
    chromas: Sequence[int], section: range, tonic_steps: Sequence[int]
) -> Iterator[PitchClass]:
    """The pitch class of each note of a section, by the votes of the tonics in its window."""
    steps_of = [
        [
            (tonic_steps[tonic] + _STEPS_ABOVE_TONIC[(chroma - tonic) % 12]) % 7
            for tonic in range(12)
        ]
        for chroma in range(12)
    ]
    counts = [0] * 12
    for chroma in chromas[max(section.start - NOTES_BEFORE, 0) : section.start + NOTES_AFTER]:
        counts[chroma] += 1
    for index in section:
        chroma = chromas[index]
        votes = [0] * 7
        for step, count in zip(steps_of[chroma], counts, strict=True):
            votes[step] += count
        yield _pitch_class(chroma, votes.index(max(votes)))
        if index + NOTES_AFTER < len(chromas):
            counts[chromas[index + NOTES_AFTER]] += 1
        if index >= NOTES_BEFORE:
            counts[chromas[index - NOTES_BEFORE]] -= 1


def _pitch_class(chroma: int, step: int) -> PitchClass:
    alter = (chroma - _LETTER_CHROMA[step] + 6) % 12 - 6
    return PitchClass(_LETTERS[step], alter)
