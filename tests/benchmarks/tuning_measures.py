"""Measures of a tuned piece, defined from its pitches alone and on their own tables.

Nothing here knows how the pitches were found, and nothing is taken from the package's own
figures, so a wrong solver is exposed.

Conventions
-----------
* A `Pitching` gives for every note its stretches of steady pitch: onset, end, cents off equal
  temperament. Notes are numbered as in `Score.notes`; grace notes are left out.
* Pairs are weighted by the quarter notes they sound together; each held link, step and repeated
  note counts once.
"""

from __future__ import annotations

import math
from collections import defaultdict
from dataclasses import dataclass
from fractions import Fraction
from itertools import combinations, pairwise

from retune.harmony.model import Degree, Harmony, Quality
from retune.score.model import Score

Pitching = list[list[tuple[Fraction, Fraction, float]]]

# Pure consonances by semitones, octaves left out: 5-limit, and what limit 7 adds or 3 puts there.
PURE = {
    3: {0: "1/1", 3: "32/27", 4: "81/64", 5: "4/3", 7: "3/2", 8: "128/81", 9: "27/16"},
    5: {0: "1/1", 3: "6/5", 4: "5/4", 5: "4/3", 7: "3/2", 8: "8/5", 9: "5/3"},
    7: {0: "1/1", 3: "6/5 7/6", 4: "5/4", 5: "4/3", 7: "3/2", 8: "8/5", 9: "5/3 12/7"},
}
# Just melodic sizes by semitones: tone 9/8 or 10/9; semitone 16/15, 25/24, 27/25 or 135/128.
STEPS = {
    1: "16/15 25/24 27/25 135/128",
    2: "9/8 10/9",
    3: "6/5 32/27",
    4: "5/4",
    5: "4/3 27/20",
    6: "45/32 64/45 25/18 36/25",
    7: "3/2 40/27",
    8: "8/5",
    9: "5/3 27/16",
    10: "16/9 9/5",
    11: "15/8 50/27",
}
SEPTIMAL_STEPS = {
    1: "21/20 15/14",
    2: "8/7",
    3: "7/6",
    5: "21/16",
    6: "7/5 10/7",
    7: "32/21",
    9: "12/7",
    10: "7/4",
    11: "28/15 40/21",
}
PYTHAGOREAN_STEPS = {
    1: "256/243 2187/2048",
    2: "9/8",
    3: "32/27",
    4: "81/64",
    5: "4/3",
    6: "729/512 1024/729",
    7: "3/2",
    8: "128/81",
    9: "27/16",
    10: "16/9",
    11: "243/128",
}
TRIADS = (Quality.MAJOR, Quality.MINOR)


def cents(text: str) -> float:
    """Cents of a ratio such as 3/2."""
    top, _, bottom = text.partition("/")
    return 1200.0 * math.log2(int(top) / int(bottom or 1))


def _sizes(table: dict[int, str]) -> dict[int, list[float]]:
    return {steps: [cents(one) for one in text.split()] for steps, text in table.items()}


_PURE = {limit: _sizes(table) for limit, table in PURE.items()}
_SEVENTH_STEPS = {steps: f"{text} {SEPTIMAL_STEPS.get(steps, '')}" for steps, text in STEPS.items()}
_STEPS = {3: _sizes(PYTHAGOREAN_STEPS), 5: _sizes(STEPS), 7: _sizes(_SEVENTH_STEPS)}


def missed_pure(semitones: int, deviation: float, limit: int = 5) -> float | None:
    """Cents by which a consonance misses its pure size; None for a dissonance."""
    steps = semitones % 12
    sizes = _PURE[limit].get(steps)
    if sizes is None:
        return None
    return min(abs(100.0 * steps + deviation - size) for size in sizes)


def missed_step(semitones: int, deviation: float, limit: int = 5) -> float:
    """Cents by which a melodic interval of `semitones` > 0 misses the nearest just size."""
    steps = semitones % 12
    sizes = _STEPS[limit].get(steps, [0.0])
    return min(abs(100.0 * steps + deviation - size) for size in sizes)


@dataclass
class Tally:
    """Weighted sums of what was missed, in cents."""

    weight: float = 0.0
    total: float = 0.0
    squares: float = 0.0
    near: float = 0.0
    far: float = 0.0
    most: float = 0.0

    def add(self, missed: float, weight: float = 1.0, near: float = 1.0, far: float = 5.0) -> None:
        self.weight += weight
        self.total += weight * missed
        self.squares += weight * missed * missed
        self.near += weight * (missed <= near)
        self.far += weight * (missed > far)
        self.most = max(self.most, missed)

    def over(self, value: float) -> float:
        return value / self.weight if self.weight else 0.0

    @property
    def mean(self) -> float:
        return self.over(self.total)

    @property
    def rms(self) -> float:
        return math.sqrt(self.over(self.squares))


@dataclass(frozen=True)
class Measured:
    """One piece under one tuning; cents, and shares in per cent."""

    vk_mean: float
    vk_rms: float
    vx_mean: float
    vx_rms: float
    vx_within_1: float
    held_mean: float
    held_most: float
    held_over_5: int
    melody_mean: float
    melody_over_10: float
    repeated_over_5: float
    drift_most: float
    drift_end: float


def _pitch_at(pitching: Pitching, score: Score, harmony: Harmony) -> list[dict[int, float]]:
    """Cents of every sounding note in every slice."""
    found: list[dict[int, float]] = [{} for _ in harmony.slices]
    places: defaultdict[int, int] = defaultdict(int)
    for index, one in enumerate(harmony.slices):
        for note in one.notes:
            stretches = pitching[note]
            while places[note] + 1 < len(stretches) and stretches[places[note]][1] <= one.onset:
                places[note] += 1
            found[index][note] = stretches[places[note]][2]
    return found


_OWN = (Degree.ROOT, Degree.THIRD, Degree.FIFTH, Degree.SEVENTH)


def _chord_tones(harmony: Harmony) -> list[dict[int, int]]:
    """By chord: the notes that are its own tones, none added, with nothing but the fact."""
    found: list[dict[int, int]] = [{} for _ in harmony.chords]
    for fragment in harmony.fragments:
        if fragment.degree in _OWN:
            found[fragment.chord][fragment.note] = 1
    return found


def _vertical(
    score: Score, harmony: Harmony, sounding: list[dict[int, float]], limit: int
) -> tuple[Tally, Tally]:
    every, triads = Tally(), Tally()
    tones = _chord_tones(harmony)
    chord_at = [c.index for c in harmony.chords for _ in range(c.first, c.last)]
    for one, pitches in zip(harmony.slices, sounding, strict=True):
        chord = harmony.chords[chord_at[one.index]]
        voices = [note for note in one.notes if score.parts[score.notes[note].part].tuned]
        for low, high in combinations(voices, 2):
            apart = score.notes[high].pitch.key - score.notes[low].pitch.key
            missed = missed_pure(apart, pitches[high] - pitches[low], limit)
            if missed is None:
                continue
            every.add(missed, float(one.duration))
            members = tones[chord.index]
            if chord.quality in TRIADS and low in members and high in members:
                triads.add(missed, float(one.duration))
    return every, triads


def _held(score: Score, harmony: Harmony, sounding: list[dict[int, float]]) -> Tally:
    moved = Tally()
    for before, after in pairwise(sounding):
        for note, value in after.items():
            if note in before and score.parts[score.notes[note].part].tuned:
                moved.add(abs(value - before[note]))
    return moved


def _melodic(score: Score, pitching: Pitching, limit: int) -> tuple[Tally, Tally]:
    steps, repeated = Tally(), Tally()
    ended: dict[tuple[int, Fraction], list[int]] = defaultdict(list)
    for index, note in enumerate(score.notes):
        if not note.grace and score.parts[note.part].tuned:
            ended[note.part, note.analysed_end].append(index)
    for index, note in enumerate(score.notes):
        before = ended.get((note.part, note.onset), [])
        if note.grace or not before or not score.parts[note.part].tuned:
            continue
        near = min(before, key=lambda one: abs(score.notes[one].pitch.key - note.pitch.key))
        apart = note.pitch.key - score.notes[near].pitch.key
        change = pitching[index][0][2] - pitching[near][-1][2]
        if apart == 0:
            repeated.add(abs(change))
        else:
            size, direction = abs(apart), 1 if apart > 0 else -1
            steps.add(missed_step(size, direction * change, limit), far=10.0)
    return steps, repeated


def _tonic(
    score: Score, harmony: Harmony, sounding: list[dict[int, float]], tonic: int
) -> list[float]:
    """Mean cents of the sounding tonic in each chord on the home tonic."""
    found = []
    for chord in harmony.chords:
        if chord.root is None or chord.root.chroma != tonic:
            continue
        tally = Tally()
        for index in range(chord.first, chord.last):
            for note, value in sounding[index].items():
                voice = score.parts[score.notes[note].part].tuned
                if voice and score.notes[note].pitch.key % 12 == tonic:
                    tally.weight += float(harmony.slices[index].duration)
                    tally.total += value * float(harmony.slices[index].duration)
        if tally.weight:
            found.append(tally.mean)
    return found


def measure(score: Score, harmony: Harmony, pitching: Pitching, limit: int = 5) -> Measured:
    """All measures of one piece under one tuning."""
    sounding = _pitch_at(pitching, score, harmony)
    every, triads = _vertical(score, harmony, sounding, limit)
    held = _held(score, harmony, sounding)
    steps, repeated = _melodic(score, pitching, limit)
    tonic = _tonic(score, harmony, sounding, harmony.tonic.root.chroma)
    away = [abs(value - tonic[0]) for value in tonic] or [0.0]
    return Measured(
        vk_mean=every.mean,
        vk_rms=every.rms,
        vx_mean=triads.mean,
        vx_rms=triads.rms,
        vx_within_1=100.0 * triads.over(triads.near) if triads.weight else 100.0,
        held_mean=held.mean,
        held_most=held.most,
        held_over_5=round(held.far),
        melody_mean=steps.mean,
        melody_over_10=100.0 * steps.over(steps.far),
        repeated_over_5=100.0 * repeated.over(repeated.far),
        drift_most=max(away),
        drift_end=away[-1],
    )
