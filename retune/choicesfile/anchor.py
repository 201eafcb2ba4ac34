"""Finding each decision's place again in a score that has changed.

A decision bears what sounded at its place. It holds where the same sounds there; where it does
not, the place is sought by its content: bars that moved, a piece that was transposed. A decision
whose music is gone is given up and told, with the place most like it.

Conventions
-----------
* Likeness runs from 0 to 1: what sounds here counts twice, before and after once each, by the
  share of pitches in common (Jaccard 1901).
* A whole piece moves by one interval: the one under which most decisions find their music.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from enum import Enum
from fractions import Fraction
from itertools import pairwise

from retune.score.model import Transposition
from retune.score.moments import Moment, Sounding, moment_at

Sounds = tuple[Sounding, ...]
"""What sounded before, at and after a place."""

ALIKE = 0.6
"""Share of pitches in common from which a changed chord still counts as the same one."""
_FURTHEST = 24


class Fit(Enum):
    """How a decision fits the score as it is."""

    HOLDS = "holds"
    MOVED = "moved"
    CHANGED = "changed"
    """At its place something else sounds now, but much the same."""
    GONE = "gone"


@dataclass(frozen=True, slots=True)
class Anchor:
    """Where a decision said it stands; `sounds` is None where it said nothing of its music."""

    bar: str
    beat: Fraction
    sounds: Sounds | None


@dataclass(frozen=True, slots=True)
class Found:
    """Where it stands now. For `Fit.GONE` the moment is the most like one, if any."""

    fit: Fit
    moment: Moment | None


def transposition_of(moments: Sequence[Moment], anchors: Iterable[Anchor]) -> Transposition:
    """The interval by which the piece was moved since the decisions were made."""
    sought = [a.sounds[1] for a in anchors if a.sounds is not None and a.sounds[1]]
    if not sought:
        return Transposition()
    by_keys: dict[frozenset[int], Moment] = {}
    for moment in moments:
        by_keys.setdefault(_keys(moment.here), moment)
    counts = {
        shift: sum(_keys(one, shift) in by_keys for one in sought)
        for shift in range(-_FURTHEST, _FURTHEST + 1)
    }
    best = max(counts, key=lambda shift: (counts[shift], -abs(shift)))
    if not counts[best]:
        return Transposition()
    turns: Counter[int] = Counter()
    for one in sought:
        there = by_keys.get(_keys(one, best))
        for old, new in zip(one, there.here if there is not None else (), strict=False):
            turns[new.pitch_class.fifths - old.pitch_class.fifths] += 1
    return Transposition(best, turns.most_common(1)[0][0])


def found_again(
    moments: Sequence[Moment], anchors: Sequence[Anchor], moved: Transposition
) -> list[Found]:
    """Each anchor's place in the score as it is, in their order."""
    seeker = _Seeker(moments, moved.semitones)
    stated = [moment_at(moments, one.bar, one.beat) for one in anchors]
    same = [seeker.same(one) for one in anchors]
    # Where a place is certain, how far it moved tells about the others nearby.
    certain = [
        (place.index, only[0].index - place.index)
        for place, only in zip(stated, same, strict=True)
        if place is not None and len(only) == 1
    ]
    return [
        seeker.found(anchor, place, own, _shift_near(certain, place))
        for anchor, place, own in zip(anchors, stated, same, strict=True)
    ]


def _shift_near(certain: Sequence[tuple[int, int]], place: Moment | None) -> int:
    if not certain or place is None:
        return 0
    return min(certain, key=lambda one: abs(one[0] - place.index))[1]


class _Seeker:
    """The moments of a score, to be sought by content."""

    def __init__(self, moments: Sequence[Moment], shift: int) -> None:
        self.moments, self.shift = moments, shift
        self.here: dict[frozenset[int], list[Moment]] = {}
        for moment in moments:
            self.here.setdefault(_keys(moment.here), []).append(moment)

    def same(self, anchor: Anchor) -> list[Moment]:
        """Moments with the same before, here and after."""
        if anchor.sounds is None:
            return []
        wanted = tuple(_keys(one, self.shift) for one in anchor.sounds)
        near = self.here.get(wanted[1], [])
        return [m for m in near if (_keys(m.before), _keys(m.after)) == (wanted[0], wanted[2])]

    def found(self, anchor: Anchor, stated: Moment | None, same: list[Moment], shift: int) -> Found:
        """Where an anchor stands now; `shift` is how far what is near it moved."""
        if anchor.sounds is None:
            return Found(Fit.HOLDS if stated is not None else Fit.GONE, stated)
        expected = (stated.index if stated is not None else 0) + shift
        if same:
            return self._fit(min(same, key=lambda m: abs(m.index - expected)), stated)
        here = self.here.get(_keys(anchor.sounds[1], self.shift), [])
        if stated in here:
            return Found(Fit.HOLDS, stated)
        neighbours = [m for m in here if self._beside(m, anchor.sounds)]
        if neighbours:
            return self._fit(min(neighbours, key=lambda m: abs(m.index - expected)), stated)
        if stated is not None and self._share(stated.here, anchor.sounds[1]) >= ALIKE:
            return Found(Fit.CHANGED, stated)
        sounds = anchor.sounds
        nearest = max(
            self.moments,
            key=lambda m: (self._likeness(m, sounds), -abs(m.index - expected)),
            default=None,
        )
        return Found(Fit.GONE, nearest)

    def _fit(self, moment: Moment, stated: Moment | None) -> Found:
        return Found(Fit.HOLDS if moment is stated else Fit.MOVED, moment)

    def _beside(self, moment: Moment, sounds: Sounds) -> bool:
        """Whether one neighbour at least is the same."""
        before, after = _keys(sounds[0], self.shift), _keys(sounds[2], self.shift)
        return _keys(moment.before) == before or _keys(moment.after) == after

    def _share(self, now: Sounding, then: Sounding) -> float:
        one, other = _keys(now), _keys(then, self.shift)
        return len(one & other) / len(one | other) if one | other else 1.0

    def _likeness(self, moment: Moment, sounds: Sounds) -> float:
        here = self._share(moment.here, sounds[1])
        before, after = self._share(moment.before, sounds[0]), self._share(moment.after, sounds[2])
        return (2.0 * here + before + after) / 4.0


def _keys(sounding: Sounding, shift: int = 0) -> frozenset[int]:
    return frozenset(pitch.key + shift for pitch in sounding)


def known_parts(begins: Mapping[str, Sounding], melodies: Mapping[str, Sounding]) -> dict[str, str]:
    """New names of parts that are known by their first notes only, by old name.

    Parameters
    ----------
    begins, melodies : mapping of str to pitches
        First notes by name, as a choices file has them and as the score has them; a piece that
        was transposed as a whole keeps their intervals.
    """
    free = {name: line for name, line in melodies.items() if name not in begins}
    found: dict[str, str] = {}
    for name, line in begins.items():
        if name in melodies:
            continue
        wanted = _steps(line)
        like = [new for new, own in free.items() if wanted and _steps(own) == wanted]
        if len(like) > 1:
            like = [new for new in like if free[new][0].key == line[0].key] or like
        if like:
            found[name] = like[0]
            del free[like[0]]
    return found


def _steps(line: Sounding) -> tuple[int, ...]:
    return tuple(b.key - a.key for a, b in pairwise(line))
