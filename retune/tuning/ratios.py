"""Just ratios: intervals by spelling, chord templates by quality, the just scale.

Conventions
-----------
* An interval's place on the line of fifths is written `fifths`: fifth 1, major third 4, minor
  third -3; its size in equal temperament is 7 * fifths semitones, octaves aside.
* Ratios are octave-reduced `Fraction` values above the lower note or the root.
* Templates hold one ratio for each degree of the chord, root first; a tempered template has
  none and stands in equal temperament, which is the least-squares compromise of three or four
  equal steps (Stange, Wick and Hinrichsen 2018).

Sources: the templates are those of Zarlino, Helmholtz and the Ptolemaic scale with their usual
alternatives for sevenths and fifths (16/9, 9/5, 7/4; 36/25, 64/45, 7/5).
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import cache
from math import ceil, floor

from retune.harmony.model import Degree, Quality
from retune.units import largest_prime, octave_reduced, ratio_to_cents

DEGREES = tuple(Degree)
"""Order of the tones in a template: root, third, fifth, seventh, then the added ones."""

_ADDED = {
    Degree.SIXTH: (3, Fraction(5, 3)),
    Degree.NINTH: (2, Fraction(9, 8)),
    Degree.FOURTH: (-1, Fraction(4, 3)),
    Degree.SECOND: (2, Fraction(9, 8)),
}
"""Added tones: place on the line of fifths above the root, and ratio."""

AUGMENTED_SIXTH = 10
"""Place of the augmented sixth on the line of fifths."""

SPELLED: dict[Quality, tuple[int, ...]] = {
    Quality.MAJOR: (0, 4, 1),
    Quality.MINOR: (0, -3, 1),
    Quality.DIMINISHED: (0, -3, -6),
    Quality.AUGMENTED: (0, 4, 8),
    Quality.DOMINANT_SEVENTH: (0, 4, 1, -2),
    Quality.MAJOR_SEVENTH: (0, 4, 1, 5),
    Quality.MINOR_SEVENTH: (0, -3, 1, -2),
    Quality.HALF_DIMINISHED: (0, -3, -6, -2),
    Quality.DIMINISHED_SEVENTH: (0, -3, -6, -9),
    Quality.MINOR_MAJOR_SEVENTH: (0, -3, 1, 5),
}
"""The usual spelling of each quality above its root, on the line of fifths."""


@dataclass(frozen=True, slots=True, eq=False)
class Template:
    """The ratios of one chord, root first; one object for each, made by `templates`.

    Parameters
    ----------
    spelled, semitones : tuple of int
        Each degree's place on the line of fifths, and its size in equal temperament, 0 to 11.
    ratios : tuple of Fraction or None
        None for a tempered chord.
    cents : tuple of float
        Each degree's distance from equal temperament above an untempered root.
    """

    spelled: tuple[int, ...]
    semitones: tuple[int, ...]
    ratios: tuple[Fraction, ...] | None
    cents: tuple[float, ...]

    @property
    def septimal(self) -> tuple[bool, ...]:
        """Whether each degree's ratio holds the prime 7."""
        if self.ratios is None:
            return (False,) * len(self.spelled)
        return tuple(largest_prime(ratio) == 7 for ratio in self.ratios)

    @property
    def limit(self) -> int:
        """The largest prime in its ratios; 1 for a tempered chord."""
        return max((largest_prime(ratio) for ratio in self.ratios or ()), default=1)


def _template(spelled: tuple[int, ...], ratios: tuple[Fraction, ...] | None) -> Template:
    semitones = tuple(7 * place % 12 for place in spelled)
    cents = tuple(
        ratio_to_cents(ratio) - 100.0 * steps
        for ratio, steps in zip(ratios or (), semitones, strict=ratios is not None)
    )
    return Template(spelled, semitones, ratios, cents or (0.0,) * len(spelled))


# Third, fifth and seventh of each template by prime limit, the preferred one first; "" is the
# tempered chord. Within limit 3 every chord has one template: its spelling in pure fifths.
_FIVE: dict[Quality, tuple[str, ...]] = {
    Quality.MAJOR: ("5/4 3/2",),
    Quality.MINOR: ("6/5 3/2",),
    Quality.DIMINISHED: ("6/5 36/25", "6/5 64/45"),
    Quality.AUGMENTED: ("", "5/4 25/16"),
    Quality.DOMINANT_SEVENTH: ("5/4 3/2 9/5", "5/4 3/2 16/9"),
    Quality.MAJOR_SEVENTH: ("5/4 3/2 15/8",),
    Quality.MINOR_SEVENTH: ("6/5 3/2 9/5", "6/5 3/2 16/9"),
    Quality.HALF_DIMINISHED: ("6/5 36/25 9/5", "6/5 64/45 9/5", "6/5 64/45 16/9"),
    Quality.DIMINISHED_SEVENTH: ("", "6/5 36/25 128/75", "6/5 64/45 128/75"),
    Quality.MINOR_MAJOR_SEVENTH: ("6/5 3/2 15/8",),
}
_SEVEN: dict[Quality, tuple[str, ...]] = {
    **_FIVE,
    Quality.DIMINISHED: ("6/5 7/5", *_FIVE[Quality.DIMINISHED]),
    Quality.DOMINANT_SEVENTH: ("5/4 3/2 7/4", "5/4 3/2 16/9", "5/4 3/2 9/5"),
    Quality.HALF_DIMINISHED: ("6/5 7/5 9/5", "7/6 7/5 7/4", *_FIVE[Quality.HALF_DIMINISHED]),
    Quality.DIMINISHED_SEVENTH: ("6/5 7/5 42/25", *_FIVE[Quality.DIMINISHED_SEVENTH]),
}
_SIXTHS = {5: ("5/4 3/2 225/128",), 7: ("5/4 3/2 7/4", "5/4 3/2 225/128")}

_SEPTIMAL: dict[int, tuple[Fraction, ...]] = {
    -9: (Fraction(12, 7), Fraction(42, 25)),
    -6: (Fraction(7, 5),),
    -5: (Fraction(21, 20), Fraction(15, 14)),
    -3: (Fraction(7, 6),),
    -2: (Fraction(7, 4),),
    -1: (Fraction(21, 16),),
    1: (Fraction(32, 21),),
    2: (Fraction(8, 7),),
    3: (Fraction(12, 7),),
    5: (Fraction(28, 15), Fraction(40, 21)),
    6: (Fraction(10, 7),),
    9: (Fraction(7, 6), Fraction(25, 21)),
    10: (Fraction(7, 4),),
}


def power(fifths: int, thirds: int) -> Fraction:
    """The interval at `fifths` that takes `thirds` of its fourfold fifths as pure major thirds.

    >>> power(4, 0), power(4, 1), power(-3, -1)
    (Fraction(81, 64), Fraction(5, 4), Fraction(6, 5))
    """
    return octave_reduced(Fraction(3) ** (fifths - 4 * thirds) * Fraction(5) ** thirds)


@cache
def just_intervals(fifths: int, limit: int) -> tuple[Fraction, ...]:
    """The just sizes of a spelled interval within a prime limit (3, 5 or 7).

    >>> [str(ratio) for ratio in just_intervals(2, 5)]
    ['9/8', '10/9']
    """
    if limit == 3:
        return (power(fifths, 0),)
    thirds = sorted({floor(fifths / 4), ceil(fifths / 4)})
    plain = tuple(power(fifths, third) for third in thirds)
    return plain + (_SEPTIMAL.get(fifths, ()) if limit == 7 else ())


@cache
def templates(quality: Quality, limit: int, augmented_sixth: bool = False) -> tuple[Template, ...]:
    """The templates of a chord quality within a prime limit, the preferred one first.

    `augmented_sixth` says that the chord's seventh is spelled as an augmented sixth.
    """
    spelled = SPELLED[quality]
    sixth = augmented_sixth and quality is Quality.DOMINANT_SEVENTH
    if sixth:
        spelled = (*spelled[:3], AUGMENTED_SIXTH)
    if limit == 3:
        return (_template(spelled, tuple(power(place, 0) for place in spelled)),)
    table = _FIVE if limit == 5 else _SEVEN
    return tuple(
        _template(spelled, (Fraction(1), *map(Fraction, text.split())) if text else None)
        for text in (_SIXTHS[limit] if sixth else table[quality])
    )


@cache
def with_added(template: Template, added: tuple[Degree, ...], limit: int) -> Template:
    """A template with tones added, each in the place that `DEGREES` gives it.

    A sixth is 5/3 (within limit 3: 27/16), a ninth or second 9/8, a fourth 4/3: the chords
    12:15:18:20, 4:5:6:9, 6:8:9 and 8:9:12. Places that stay empty hold the root.
    """
    if not added:
        return template
    size = len(template.spelled)
    places = [*template.spelled, *[0] * (len(DEGREES) - size)]
    blank = [Fraction(1)] * len(DEGREES)
    ratios = [*(template.ratios or blank[:size]), *blank[size:]]
    for degree in added:
        index = DEGREES.index(degree)
        places[index], ratio = _ADDED[degree]
        ratios[index] = power(places[index], 0) if limit == 3 else ratio
    return _template(tuple(places), tuple(ratios) if template.ratios is not None else None)


_LOWEST, _HIGHEST = -8, 11
"""Chords spelled further from the home tonic take the place of their enharmonic twin."""


def scale_ratio(fifths: int, limit: int) -> Fraction:
    """The just scale on the home tonic, at a place on the line of fifths counted from it.

    -1 to 2 are pure fifths (4/3, 1, 3/2, 9/8), 3 to 6 lie a comma lower than the fifths say
    (5/3, 5/4, 15/8, 45/32), -5 to -2 a comma higher (16/15, 8/5, 6/5, 9/5), and so on.
    """
    while fifths > _HIGHEST:
        fifths -= 12
    while fifths < _LOWEST:
        fifths += 12
    return power(fifths, 0 if limit == 3 else (fifths + 1) // 4)


def scale_cents(fifths: int, limit: int) -> float:
    """`scale_ratio` as cents from equal temperament on the home tonic, -50 to 50."""
    cents = ratio_to_cents(scale_ratio(fifths, limit)) - 100.0 * (7 * fifths % 12)
    return (cents + 600.0) % 1200.0 - 600.0
