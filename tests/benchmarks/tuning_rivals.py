"""Tunings to compare with: equal temperament, the best fixed just scale, chaining by common tones.

Conventions
-----------
* Each gives a `Pitching` (see `tuning_measures`) for a score and its harmony.
"""

from __future__ import annotations

from collections import defaultdict
from itertools import combinations, product

from tuning_measures import Pitching, cents, missed_pure

from retune.harmony.model import Degree, Harmony, Quality
from retune.score.model import Score

_SCALE = ["1", "16/15", "9/8", "6/5", "5/4", "4/3", "45/32", "3/2", "8/5", "5/3", "9/5", "15/8"]
_OTHERWISE = {1: "25/24", 2: "10/9", 6: "64/45", 8: "25/16", 10: "16/9"}
_TEMPLATES = {
    Quality.MAJOR: "1 5/4 3/2",
    Quality.MINOR: "1 6/5 3/2",
    Quality.DIMINISHED: "1 6/5 36/25",
    Quality.AUGMENTED: "1 5/4 25/16",
    Quality.DOMINANT_SEVENTH: "1 5/4 3/2 9/5",
    Quality.MAJOR_SEVENTH: "1 5/4 3/2 15/8",
    Quality.MINOR_SEVENTH: "1 6/5 3/2 9/5",
    Quality.HALF_DIMINISHED: "1 6/5 36/25 9/5",
    Quality.DIMINISHED_SEVENTH: "1 6/5 36/25 128/75",
    Quality.MINOR_MAJOR_SEVENTH: "1 6/5 3/2 15/8",
}
_NUMBER = {Degree.ROOT: 0, Degree.THIRD: 1, Degree.FIFTH: 2, Degree.SEVENTH: 3}


def _off(text: str) -> float:
    """A ratio's distance from the nearest tempered interval."""
    size = cents(text)
    return size - 100.0 * round(size / 100.0)


def _steady(score: Score, value: dict[int, float], tonic: int) -> Pitching:
    return [[(note.onset, note.end, value[(note.pitch.key - tonic) % 12])] for note in score.notes]


def equal(score: Score, harmony: Harmony) -> Pitching:
    """Equal temperament."""
    return _steady(score, dict.fromkeys(range(12), 0.0), 0)


def best_scale(score: Score, harmony: Harmony) -> Pitching:
    """Of 32 just scales on the home tonic, the one that leaves the consonances purest."""
    tonic = harmony.tonic.root.chroma
    weights: defaultdict[tuple[int, int], float] = defaultdict(float)
    for one in harmony.slices:
        for low, high in combinations(one.notes, 2):
            keys = score.notes[low].pitch.key, score.notes[high].pitch.key
            weights[(keys[0] - tonic) % 12, (keys[1] - tonic) % 12] += float(one.duration)

    def badness(value: dict[int, float]) -> float:
        return sum(
            weight * (missed_pure(high - low, value[high] - value[low]) or 0.0)
            for (low, high), weight in weights.items()
        )

    plain = {steps: _off(text) for steps, text in enumerate(_SCALE)}
    choices = product(
        *(((steps, _off(_SCALE[steps])), (steps, _off(text))) for steps, text in _OTHERWISE.items())
    )
    best = min((plain | dict(choice) for choice in choices), key=badness)
    return _steady(score, best, tonic)


def chained(score: Score, harmony: Harmony) -> Pitching:
    """Exact chords, each root placed by the notes held from the chord before, else common tones."""
    tones: list[dict[int, float]] = [{} for _ in harmony.chords]
    for fragment in harmony.fragments:
        chord = harmony.chords[fragment.chord]
        if fragment.degree in _NUMBER and chord.quality is not None:
            ratio = _TEMPLATES[chord.quality].split()[_NUMBER[fragment.degree]]
            tones[fragment.chord][fragment.note] = _off(ratio)
    plain = {steps: _off(text) for steps, text in enumerate(_SCALE)}
    tonic = harmony.tonic.root.chroma
    roots: list[float] = []
    before: dict[int, float] = {}  # by note: cents
    for chord, members in zip(harmony.chords, tones, strict=True):
        if chord.root is None:
            roots.append(roots[-1] if roots else 0.0)
            continue
        links = [before[note] - own for note, own in members.items() if note in before]
        if not links:
            chroma = {score.notes[note].pitch.key % 12: value for note, value in before.items()}
            links = [
                chroma[key] - own
                for note, own in members.items()
                if (key := score.notes[note].pitch.key % 12) in chroma
            ]
        if links:
            roots.append(sum(links) / len(links))
        else:
            place = plain[(chord.root.chroma - tonic) % 12]
            last = next((i for i in range(chord.index - 1, -1, -1) if harmony.chords[i].root), None)
            root = harmony.chords[last].root if last is not None else None
            apart = plain[(root.chroma - tonic) % 12] if root else place
            roots.append((roots[last] if last is not None else place) + place - apart)
        before = {note: roots[-1] + own for note, own in members.items()} or before
    found: Pitching = [[] for _ in score.notes]
    for fragment in harmony.fragments:
        chord, note = harmony.chords[fragment.chord], score.notes[fragment.note]
        own = tones[fragment.chord].get(fragment.note)
        if own is None and chord.root is not None:
            own = _off(_SCALE[(note.pitch.key - chord.root.chroma) % 12])
        first, last = harmony.slices[fragment.first], harmony.slices[fragment.last - 1]
        stretch = (first.onset, last.onset + last.duration, roots[fragment.chord] + (own or 0.0))
        found[fragment.note].append(stretch)
    return [
        own or [(note.onset, note.end, 0.0)] for own, note in zip(found, score.notes, strict=True)
    ]
