"""Spelled names for roots that were found as pitch classes.

Conventions
-----------
* Places on the line of fifths count from C = 0, so a perfect fifth up adds 1.
* The notated spelling of a sounding root wins; else the other chord tones vote for theirs.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable

from retune.harmony.model import Quality
from retune.harmony.states import TONES
from retune.pitch import PitchClass

FIFTHS_OF_INTERVAL = {0: 0, 3: -3, 4: 4, 6: -6, 7: 1, 8: 8, 9: -9, 10: -2, 11: 5}
"""Semitones above the root to places on the line of fifths, for every chord tone: minor and
major third, diminished, perfect and augmented fifth, diminished, minor and major seventh."""

_PLAINEST = range(-5, 7)
"""Db to F#: one spelling for each pitch class, for chords that nothing spells."""


def spell_root(root: int, quality: Quality, heard: Iterable[tuple[int, float]]) -> PitchClass:
    """Spell a root by what sounds.

    Parameters
    ----------
    root : int
        Pitch class, 0 to 11.
    heard : iterable of (int, float)
        Places on the line of fifths that sound in the chord, with their quarter notes.

    A# and C# sound, so the root of the major chord is F#, not Gb:

    >>> spell_root(6, Quality.MAJOR, [(10, 1.0), (7, 1.0)]).name
    'F#'
    """
    direct: dict[int, float] = defaultdict(float)
    implied: dict[int, float] = defaultdict(float)
    for fifths, quarters in heard:
        interval = (7 * fifths - root) % 12
        if interval == 0:
            direct[fifths] += quarters
        elif interval in TONES[quality]:
            implied[fifths - FIFTHS_OF_INTERVAL[interval]] += quarters
    votes = direct or implied or {next(f for f in _PLAINEST if 7 * f % 12 == root): 1.0}
    return PitchClass.from_fifths(max(votes, key=lambda f: (votes[f], -abs(f), f)))
