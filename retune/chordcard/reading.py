"""Root and quality of pitches that stand alone, and the just ratio of each above the root.

A reading costs what it leaves unexplained: a tone that is not the chord's, a third that is
missing, a root that is not in the bass, a spelling that is another chord's. The cheapest one is
taken. A score is analysed otherwise (`harmony`), from what stands around the chord.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cache
from itertools import chain, combinations

from retune.harmony.model import Chord, Degree, Quality
from retune.harmony.symbols import chord_symbol
from retune.pitch import Pitch, PitchClass
from retune.tuning.ratios import (
    AUGMENTED_SIXTH,
    DEGREES,
    SPELLED,
    Template,
    just_intervals,
    templates,
    with_added,
)
from retune.units import ratio_to_cents

# What a reading costs (our choice). A complete chord with a stranger in it is still that chord;
# more strangers, or a tone missing besides, make it none.
_STRANGER, _SPELLING = 3.0, 0.4
_MISSING = {Degree.ROOT: 3.0, Degree.THIRD: 1.2, Degree.FIFTH: 0.4, Degree.SEVENTH: 2.0}
_IN_BASS = {Degree.ROOT: 0.0, Degree.SEVENTH: 0.9}
_OTHER_IN_BASS = 0.6
_ADDED = {Degree.SIXTH: 0.5, Degree.NINTH: 0.4, Degree.FOURTH: 0.3, Degree.SECOND: 0.45}
_LEAST_TONES = 3
_RARE = 0.01

_IN_PLACE_OF_THIRD = (Degree.FOURTH, Degree.SECOND)
_SUSPENDED = (Quality.MAJOR, Quality.DOMINANT_SEVENTH)
_WITH_SIXTH = (Quality.MAJOR, Quality.MINOR)


@dataclass(frozen=True, slots=True)
class Reading:
    """What a chord is taken for.

    Parameters
    ----------
    root : PitchClass
    quality : Quality or None
        None for what is no known chord: single tones, fifths, clusters.
    added : tuple of Degree
    degrees : tuple of Degree or None
        Which tone of the chord each pitch is; None for strangers.
    augmented_sixth : bool
        Whether the seventh is spelled as an augmented sixth.
    """

    root: PitchClass
    quality: Quality | None
    added: tuple[Degree, ...] = ()
    degrees: tuple[Degree | None, ...] = ()
    augmented_sixth: bool = False

    @property
    def symbol(self) -> str:
        """The chord's symbol, as Dm7; "" for no known chord.

        >>> Reading(PitchClass("D"), Quality.MINOR_SEVENTH).symbol
        'Dm7'
        """
        zero = Fraction(0)
        return chord_symbol(
            Chord(0, zero, zero, 0, 0, self.root, self.quality, 1.0, added=self.added)
        )

    def templates(self, limit: int) -> tuple[Template, ...]:
        """The templates that the chord may take within a prime limit, the preferred one first."""
        if self.quality is None:
            return ()
        found = templates(self.quality, limit, self.augmented_sixth)
        return tuple(with_added(template, self.added, limit) for template in found)

    def ratios(
        self, pitches: Sequence[Pitch], limit: int, template: Template | None = None
    ) -> tuple[Fraction | None, ...]:
        """The ratio of each pitch above the root, octave-reduced; None where it is tempered.

        Tones of the chord have those of the template; strangers, and the tones of what is no
        known chord, the simplest one of their spelling.
        """
        template = template or next(iter(self.templates(limit)), None)
        degrees = self.degrees or (None,) * len(pitches)
        return tuple(
            _simplest(self.root, pitch, limit)
            if degree is None or template is None
            else _of_template(template, degree)
            for pitch, degree in zip(pitches, degrees, strict=True)
        )


def _of_template(template: Template, degree: Degree) -> Fraction | None:
    return template.ratios[DEGREES.index(degree)] if template.ratios is not None else None


def _simplest(root: PitchClass, pitch: Pitch, limit: int) -> Fraction | None:
    """The simplest just size of a spelled interval, if it is near where the key is."""
    fifths = pitch.pitch_class.fifths - root.fifths
    best = min(just_intervals(fifths, limit), key=lambda one: one.numerator * one.denominator)
    return best if abs(off_equal(best, root, pitch)) <= _NEAR else None


_NEAR = 50.0


def off_equal(ratio: Fraction, root: PitchClass, pitch: Pitch) -> float:
    """Cents by which a ratio above a root is from the key of its pitch, root untempered.

    >>> round(off_equal(Fraction(5, 4), PitchClass("D"), Pitch("F", 1, 4)), 3)
    -13.686
    """
    tempered = 100.0 * ((pitch.key - root.chroma) % 12)
    return (ratio_to_cents(ratio) - tempered + 600.0) % 1200.0 - 600.0


def readings(pitches: Sequence[Pitch], root: PitchClass | None = None) -> tuple[Reading, ...]:
    """The likely readings of pitches, the likeliest first; at least one.

    Parameters
    ----------
    pitches : sequence of Pitch, not empty
        The lowest one first.
    root : PitchClass, optional
        Only readings on this root.

    >>> from retune.pitch import Pitch
    >>> [one.symbol for one in readings([Pitch.parse(n) for n in ("C3", "E3", "G3", "A3")])]
    ['C6', 'Am7']
    """
    roots = [root] if root is not None else list(dict.fromkeys(p.pitch_class for p in pitches))
    costs: list[tuple[float, int, Reading]] = []
    for one in roots:
        for quality in Quality:
            for added in _additions(quality):
                cost = _cost(pitches, one, quality, added)
                if cost is not None:
                    costs.append((cost[0], len(costs), cost[1]))
    costs.sort(key=lambda item: item[:2])
    if not costs:
        return (Reading(_foundation(pitches, root), None, degrees=(None,) * len(pitches)),)
    best: dict[str, tuple[float, Reading]] = {}
    for value, _, reading in costs:
        best.setdefault(reading.root.name, (value, reading))
    limit = costs[0][0] + _RIVAL
    return tuple(reading for value, reading in best.values() if value <= limit)


_RIVAL = 0.7
"""Readings on other roots that cost more than this beyond the best are not worth telling."""


def _additions(quality: Quality) -> Iterator[tuple[Degree, ...]]:
    """The sets of tones that may be added to a quality."""
    every: list[tuple[Degree, ...]] = [()]
    if quality in _SUSPENDED:
        every += [(one,) for one in _IN_PLACE_OF_THIRD]
    more = [Degree.NINTH, *([Degree.SIXTH] if quality in _WITH_SIXTH else [])]
    sets = chain.from_iterable(combinations(more, count) for count in range(1, len(more) + 1))
    every += [tuple(sorted(one, key=DEGREES.index)) for one in sets]
    yield from every


@cache
def _members(quality: Quality, added: tuple[Degree, ...]) -> dict[int, tuple[Degree, int]]:
    """The tones of a chord by their semitones above the root: which each is, and its place on
    the line of fifths."""
    template = with_added(templates(quality, 5)[0], added, 5)
    return {
        template.semitones[index]: (degree, template.spelled[index])
        for index, degree in enumerate(DEGREES[: len(template.spelled)])
        if (index < len(SPELLED[quality]) or degree in added)
        and not (degree is Degree.THIRD and added and added[0] in _IN_PLACE_OF_THIRD)
    }


def _cost(
    pitches: Sequence[Pitch], root: PitchClass, quality: Quality, added: tuple[Degree, ...]
) -> tuple[float, Reading] | None:
    """What a reading costs; None where it explains too little."""
    members = _members(quality, added)
    steps = [(pitch.key - root.chroma) % 12 for pitch in pitches]
    degrees = tuple(members[step][0] if step in members else None for step in steps)
    own = len(set(steps) & members.keys())
    strangers = len(set(steps) - members.keys())
    missing = {degree for degree, _ in members.values()} - set(degrees)
    fewest = _LEAST_TONES if strangers or Degree.THIRD in missing or added else 2
    if own < fewest or strangers + len(missing) > 1 or missing & set(added):
        return None
    misspelt = {
        pitch.pitch_class
        for pitch, step in zip(pitches, steps, strict=True)
        if step in members and pitch.pitch_class.fifths - root.fifths != members[step][1]
    }
    sixth = {
        pitch
        for pitch in misspelt
        if quality is Quality.DOMINANT_SEVENTH and pitch.fifths - root.fifths == AUGMENTED_SIXTH
    }
    cost = _STRANGER * strangers + _SPELLING * len(misspelt - sixth)
    cost += sum(_MISSING.get(one, 0.0) for one in missing) + sum(_ADDED[one] for one in added)
    cost += _STRANGER if degrees[0] is None else _IN_BASS.get(degrees[0], _OTHER_IN_BASS)
    cost += _RARE * list(Quality).index(quality)
    return cost, Reading(root, quality, added, degrees, bool(sixth))


def _foundation(pitches: Sequence[Pitch], root: PitchClass | None) -> PitchClass:
    """The root of what is no known chord: of a fifth or fourth its root, else the lowest tone."""
    if root is not None:
        return root
    classes = {pitch.key % 12: pitch.pitch_class for pitch in reversed(pitches)}
    if len(classes) == 2:
        (one, first), (other, second) = classes.items()
        if (other - one) % 12 == _FIFTH:
            return first
        if (one - other) % 12 == _FIFTH:
            return second
    return pitches[0].pitch_class


_FIFTH = 7
