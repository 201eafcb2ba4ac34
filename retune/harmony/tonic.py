"""The home tonic of a piece: what its last chord, key signature and pitches agree on.

Conventions
-----------
* Keys are numbered by tonic pitch class, 0 to 11; rows are major, then minor.
* Profiles are Krumhansl and Kessler's probe-tone ratings (1982), correlated with the time that
  each pitch class sounds.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

import numpy as np

from retune.harmony.evidence import Evidence
from retune.harmony.model import Chord, Tonic
from retune.harmony.states import Floats
from retune.pitch import PitchClass
from retune.score.model import Score

# Ratings of Krumhansl & Kessler 1982, from the tonic up in semitones.
_PROFILES = np.array(
    [
        [6.35, 2.23, 3.48, 2.33, 4.38, 4.09, 2.52, 5.19, 2.39, 3.66, 2.29, 2.88],
        [6.33, 2.68, 3.52, 5.38, 2.60, 3.53, 2.54, 4.75, 3.98, 2.69, 3.34, 3.17],
    ]
)
_LAST_CHORD = 0.6
_SIGNATURE = 0.3
_MODE_GIVEN = 0.3


def find_tonic(
    score: Score, evidence: Evidence, chords: Sequence[Chord], given: PitchClass | None
) -> Tonic:
    """The home tonic, spelled, with its mode; a given one is kept and only its mode found."""
    ratings = _ratings(score, evidence, chords)
    if given is not None:
        return Tonic(given, bool(ratings[1, given.chroma] > ratings[0, given.chroma]))
    minor, chroma = divmod(int(ratings.argmax()), 12)
    return Tonic(_spelled(score, chroma, bool(minor)), bool(minor))


def _ratings(score: Score, evidence: Evidence, chords: Sequence[Chord]) -> Floats:
    """How well each key fits, shape (2, 12)."""
    ratings = np.zeros((2, 12))
    heard = evidence.held.sum(axis=0)
    if np.ptp(heard) > 0:
        for mode in range(2):
            for chroma in range(12):
                turned = np.roll(_PROFILES[mode], chroma)
                ratings[mode, chroma] = np.corrcoef(turned, heard)[0, 1]
    last = next((chord for chord in reversed(chords) if chord.root is not None), None)
    if last is not None and last.root is not None and last.quality is not None:
        ratings[:, last.root.chroma] += _LAST_CHORD * last.confidence
    fifths, mode_name = _signature(score)
    ratings[0, fifths * 7 % 12] += _SIGNATURE
    ratings[1, (fifths + 3) * 7 % 12] += _SIGNATURE
    if mode_name == "major":
        ratings[0, fifths * 7 % 12] += _MODE_GIVEN
    elif mode_name == "minor":
        ratings[1, (fifths + 3) * 7 % 12] += _MODE_GIVEN
    return ratings


def _signature(score: Score) -> tuple[int, str | None]:
    """The key signature that stands longest; the earliest of equals."""
    time: dict[tuple[int, str | None], float] = defaultdict(float)
    for bar in score.bars:
        time[bar.key] += float(bar.duration)
    return max(time, key=lambda key: time[key], default=(0, None))


def _spelled(score: Score, chroma: int, minor: bool) -> PitchClass:
    """The notated spelling of a pitch class, else the one nearest the key signature."""
    time: dict[PitchClass, float] = defaultdict(float)
    for note in score.notes:
        if note.pitch.key % 12 == chroma:
            time[note.pitch.pitch_class] += float(note.duration)
    if time:
        return max(time, key=lambda spelling: (time[spelling], -abs(spelling.fifths)))
    centre = _signature(score)[0] + (3 if minor else 0)
    near = [f for f in range(centre - 6, centre + 6) if f * 7 % 12 == chroma]
    return PitchClass.from_fifths(near[0])
