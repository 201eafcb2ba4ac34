"""How each chord is tuned, as cents of the twelve keys, and which chords are tuned alike.

Conventions
-----------
* Arrays have a row a chord and a column a pitch class, C first; cents are deviations from
  equal temperament at the reference pitch; nan stands where nothing of the kind sounds.
* A chord tone's value is the mean of its pitch over the chord by duration, in all octaves, of
  the voices; of the accompaniment where no voice sings it.
* Weights are sounding times in seconds.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from retune.harmony.model import Chord, Role
from retune.harmony.symbols import chord_symbol
from retune.tuning.model import TunedScore

Floats = npt.NDArray[np.float64]

WITHIN = 0.4
"""Chords tuned alike differ from their table by no more than this, in cents. The promise is
0.5; the rest is room for writing a ratio in place of its cents."""


@dataclass(frozen=True)
class ChordTunings:
    """The tuning of every chord of a piece.

    `tones` and `others` hold the values of chord tones and non-chord tones, `weights` and
    `other_weights` their sounding times; `ratios` maps pitch classes of a chord's tones to
    their ratio above its root.
    """

    tones: Floats
    weights: Floats
    others: Floats
    other_weights: Floats
    ratios: tuple[Mapping[int, Fraction], ...]

    @property
    def sounding(self) -> list[int]:
        """Indices of the chords with at least one chord tone."""
        return np.flatnonzero(self.weights.any(axis=1)).tolist()


def chord_tunings(tuned: TunedScore) -> ChordTunings:
    """Collect the tuning of every chord."""
    count, parts = len(tuned.harmony.chords), tuned.score.parts
    # One layer each for chord tones of voices, of accompaniment, and all other tones.
    values, weights = np.zeros((3, count, 12)), np.zeros((3, count, 12))
    ratios: list[dict[int, Fraction]] = [{} for _ in range(count)]
    tempo = tuned.score.tempo
    for tuned_note in tuned.notes:
        note = tuned_note.note
        chroma, sung = note.pitch.key % 12, parts[note.part].tuned
        for segment in tuned_note.segments:
            is_tone = segment.role is Role.CHORD_TONE
            layer = (0 if sung else 1) if is_tone else 2
            seconds = tempo.seconds(segment.end) - tempo.seconds(segment.onset)
            weights[layer, segment.chord, chroma] += seconds
            values[layer, segment.chord, chroma] += seconds * segment.cents
            if is_tone and segment.ratio is not None:
                ratios[segment.chord][chroma] = segment.ratio
    means = np.divide(values, weights, out=np.full_like(values, np.nan), where=weights > 0)
    unsung = np.isnan(means[0])
    return ChordTunings(
        np.where(unsung, means[1], means[0]),
        np.where(unsung, weights[1], weights[0]),
        means[2],
        weights[2],
        tuple(ratios),
    )


def alike(tunings: ChordTunings, chords: tuple[Chord, ...]) -> list[list[int]]:
    """Chords of one symbol whose tones all lie within `WITHIN` of a common value, in order of
    their first appearance; silent chords are in no group."""
    by_symbol: dict[str, _Groups] = defaultdict(_Groups)
    for index in tunings.sounding:
        by_symbol[chord_symbol(chords[index])].add(index, tunings.tones[index])
    groups = [members for found in by_symbol.values() for members in found.members]
    return sorted(groups, key=lambda members: members[0])


class _Groups:
    """Groups of chords of one symbol, each with the range of every tone."""

    def __init__(self) -> None:
        self.members: list[list[int]] = []
        self._low = np.empty((0, 12))
        self._high = np.empty((0, 12))

    def add(self, index: int, tones: Floats) -> None:
        """Put a chord into the group it widens least, or into a new one."""
        count = len(self.members)
        low = np.fmin(self._low[:count], tones)
        high = np.fmax(self._high[:count], tones)
        width = np.nan_to_num(high - low).max(axis=1)
        place = int(width.argmin()) if count and width.min() <= 2 * WITHIN else count
        if place < count:
            self.members[place].append(index)
            self._low[place], self._high[place] = low[place], high[place]
            return
        self.members.append([index])
        if count == len(self._low):
            room = np.full((count + 8, 12), np.nan)
            self._low, self._high = np.vstack([self._low, room]), np.vstack([self._high, room])
        self._low[count] = self._high[count] = tones
