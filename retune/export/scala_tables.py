"""Tables of twelve keys: from the chords that share one to a scale and its place in Hz.

Conventions
-----------
* A table gives the cents of all twelve pitch classes, C first, as deviations from equal
  temperament at the reference pitch.
* Its 1/1 is the root where all its chords have one, else the home tonic.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from retune.export.chord_tunings import WITHIN, ChordTunings, Floats
from retune.pitch import PitchClass
from retune.tuning.fixed import temperament
from retune.tuning.model import TunedScore
from retune.tuning.ratios import scale_cents
from retune.units import hz_of, ratio_to_cents

EXACT = 0.1
"""An interval closer than this to its ratio, in cents, is written as the ratio: held notes
leave the pure chord by hundredths of a cent, which no synth and no ear can tell."""

_MIDDLE_KEY = 60


@dataclass(frozen=True, slots=True)
class Table:
    """Twelve keys: 1/1, cents and names by pitch class, and exact ratios above 1/1."""

    base: PitchClass
    cents: tuple[float, ...]
    names: tuple[str, ...]
    ratios: Mapping[int, Fraction]

    @property
    def first_key(self) -> int:
        """The key of 1/1 nearest to middle C."""
        return _MIDDLE_KEY + (self.base.chroma + 5) % 12 - 5

    def hz(self, reference_hz: float) -> float:
        """Frequency of 1/1 on that key."""
        return hz_of(self.first_key, self.cents[self.base.chroma], reference_hz)

    def degrees(self) -> list[int]:
        """Pitch classes of the scale's pitches from above 1/1 to the octave."""
        return [(self.base.chroma + step) % 12 for step in range(1, 13)]

    def pitches(self) -> list[Fraction | float]:
        """The scale's pitches: ratios where they are exact, else cents above 1/1."""
        base = self.cents[self.base.chroma]
        above: list[Fraction | float] = [
            self.ratios.get(chroma, 100.0 * step + self.cents[chroma] - base)
            for step, chroma in enumerate(self.degrees()[:-1], start=1)
        ]
        return [*above, Fraction(2)]


class TableMaker:
    """Makes tables of one piece."""

    def __init__(self, tuned: TunedScore, tunings: ChordTunings) -> None:
        self._tuned = tuned
        self._tunings = tunings
        self._tonic = tuned.harmony.tonic.root
        names = _names(tuned)
        self._names = tuple(names[chroma].name for chroma in range(12))
        cents_of = _home_scale(tuned)
        self._scale = np.array([cents_of(names[chroma]) for chroma in range(12)])

    def table(self, chords: Sequence[int], close: bool = True) -> Table:
        """The table of some chords.

        `close` says that they are tuned alike, so that no tone may lie further than `WITHIN`
        from its table; else each key is the mean by sounding time.
        """
        tones = self._tones(chords, close)
        base = self._base(chords, tones)
        others = _means(self._tunings.others[chords], self._tunings.other_weights[chords])
        cents = np.where(np.isnan(tones), others, tones)
        cents = np.where(np.isnan(cents), self._scale + self._shift(tones), cents)
        names = list(self._names)
        names[base.chroma] = base.name
        exact = self._exact(chords, base, cents)
        for chroma, (_, pure) in exact.items():
            cents[chroma] = pure
        ratios = {chroma: ratio for chroma, (ratio, _) in exact.items()}
        return Table(base, tuple(cents.tolist()), tuple(names), ratios)

    def _tones(self, chords: Sequence[int], close: bool) -> Floats:
        values = self._tunings.tones[chords]
        means = _means(values, self._tunings.weights[chords])
        if close:
            low, high = np.fmin.reduce(values), np.fmax.reduce(values)
            means = np.clip(means, high - WITHIN, low + WITHIN)
        root = self._common_root(chords)
        if root is not None and np.isnan(means[root.chroma]):
            means[root.chroma] = np.mean([self._tuned.root_cents[chord] for chord in chords])
        return means

    def _common_root(self, chords: Sequence[int]) -> PitchClass | None:
        roots = {self._tuned.harmony.chords[chord].root for chord in chords}
        return roots.pop() if len(roots) == 1 else None

    def _base(self, chords: Sequence[int], tones: Floats) -> PitchClass:
        root = self._common_root(chords)
        return self._tonic if root is None or np.isnan(tones[root.chroma]) else root

    def _shift(self, tones: Floats) -> float:
        """How far these chords stand from the scale on the home tonic: the median of tones."""
        apart = (tones - self._scale)[~np.isnan(tones)]
        return float(np.median(apart)) if len(apart) else 0.0

    def _exact(
        self, chords: Sequence[int], base: PitchClass, cents: Floats
    ) -> dict[int, tuple[Fraction, float]]:
        """Ratios above 1/1 that all chords agree on and the cents bear out, with the pure cents."""
        if base != self._common_root(chords):
            return {}
        agreed: dict[int, set[Fraction]] = {}
        for chord in chords:
            for chroma, ratio in self._tunings.ratios[chord].items():
                agreed.setdefault(chroma, set()).add(ratio)
        exact = {}
        for chroma, ratios in agreed.items():
            ratio, steps = min(ratios), (chroma - base.chroma) % 12
            pure = float(cents[base.chroma]) + ratio_to_cents(ratio) - 100.0 * steps
            if steps and len(ratios) == 1 and abs(cents[chroma] - pure) <= EXACT:
                exact[chroma] = (ratio, pure)
        return exact


def _means(values: Floats, weights: Floats) -> Floats:
    """Means of columns by weight; nan where nothing sounds."""
    total = weights.sum(axis=0)
    summed = np.where(weights > 0, weights * values, 0.0).sum(axis=0)
    means: Floats = np.divide(summed, total, out=np.full(12, np.nan), where=total > 0)
    return means


def _names(tuned: TunedScore) -> dict[int, PitchClass]:
    """A spelling for each pitch class: the piece's commonest, else the nearest to the tonic."""
    tonic = tuned.harmony.tonic.root.fifths
    near = [PitchClass.from_fifths(tonic + place) for place in (*range(6, -6, -1),)]
    names = {pitch.chroma: pitch for pitch in near}
    counted = Counter(note.pitch.pitch_class for note in tuned.score.notes)
    for pitch, _ in reversed(counted.most_common()):
        names[pitch.chroma] = pitch
    return names


def _home_scale(tuned: TunedScore) -> Callable[[PitchClass], float]:
    """Cents of a pitch class in the scale of the home tonic, which stands at 0."""
    tonic, policy = tuned.harmony.tonic.root, tuned.policy
    fixed = temperament(policy.temperament, tonic)
    if fixed is not None:
        return fixed
    return lambda pitch: scale_cents(pitch.fifths - tonic.fifths, policy.prime_limit)
