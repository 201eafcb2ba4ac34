"""Stage one: a template for each chord, and roughly where its root stands.

Conventions
-----------
* A state is a template and a root, in cents from equal temperament on a circular grid of
  `_GRID` places `_STEP` cents apart; a change of root is counted in -46 to 44 cents.
* Costs are squared cents times the weights of the solve that follows, for chords held rigid and
  their chord tones alone.
* The best path is found by dynamic programming over the whole piece (Viterbi 1967).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from itertools import combinations

import numpy as np

from retune.harmony.model import Degree, Harmony
from retune.score.model import Score
from retune.tuning.intervals import CONSONANT, Flags, Floats, Ints, consonances, nearest, steps
from retune.tuning.layout import Layout
from retune.tuning.policies import Weights
from retune.tuning.ratios import AUGMENTED_SIXTH, Template, templates
from retune.tuning.rows import CHOIR

_GRID, _STEP = 46, 2.0
_CIRCLE = _GRID * _STEP
_HALF = _CIRCLE / 2
_CHANGES = (np.arange(_GRID) * _STEP + _HALF) % _CIRCLE - _HALF
_PLACES = _CHANGES
# _TURN[before, after] is the change that leads from one place to another.
_TURN = (np.arange(_GRID)[None, :] - np.arange(_GRID)[:, None]) % _GRID
_STEEP = 100.0
"""Weight of what a held shift exceeds its cap by."""
_SCANT = 0.02
"""Weight of a root's departure from the scale's own step, which decides where nothing else does."""
_EXCEPTION = 5000.0
"""Cost of a dominant seventh or augmented sixth that is not 4:5:6:7 though limit 7 is in force:
less than a held note over its cap by 7 cents, more than a few repeated notes by a comma."""
_DOMINANT = (0, 4, 7, 10)
_LINKS_AT_ONCE = 20_000
_DEGREES = 5  # four degrees, and one that stands for none


@dataclass(frozen=True)
class Choice:
    """The template of each chord (None where nothing sounds) and its rough root in cents."""

    templates: tuple[Template | None, ...]
    roots: Floats


def sixth_chords(score: Score, harmony: Harmony) -> frozenset[int]:
    """Chords whose seventh is spelled as an augmented sixth above the root."""
    found = set()
    for fragment in harmony.fragments:
        if fragment.degree is Degree.SEVENTH:
            root = harmony.chords[fragment.chord].root
            pitch = score.notes[fragment.note].pitch.pitch_class
            if root is not None and pitch.fifths - root.fifths == AUGMENTED_SIXTH:
                found.add(fragment.chord)
    return frozenset(found)


@cache
def wolves(template: Template, degrees: frozenset[int], limit: int) -> float:
    """Sum of the squared cents by which the sounding consonances of a template are impure.

    >>> from retune.harmony.model import Quality
    >>> ninth, sixteen = templates(Quality.DOMINANT_SEVENTH, 5)
    >>> wolves(ninth, frozenset({0, 1, 2, 3}), 5)
    0.0
    >>> round(wolves(sixteen, frozenset({0, 1, 2, 3}), 5) ** 0.5, 3)
    21.506
    """
    total = 0.0
    for low, high in combinations(sorted(degrees), 2):
        apart = (template.semitones[high] - template.semitones[low]) % 12
        if CONSONANT[apart]:
            cents = template.cents[high] - template.cents[low]
            pure = nearest(consonances(limit), np.array([apart]), np.array([cents]))[0]
            total += round(abs(cents - float(pure)), 9) ** 2
    return total


def is_exception(template: Template, first: Template) -> bool:
    """Whether a dominant seventh is not 4:5:6:7 where that is preferred."""
    return template.semitones == _DOMINANT and template.limit < 7 <= first.limit


class Chooser:
    """One piece's alternatives and what they cost, ready for the search.

    Parameters
    ----------
    options : sequence of tuples of Template
        The alternatives of each chord; a chord without any takes part as one silent state.
    places : ndarray, shape (chords,)
        Each root's place in the home scale.
    home : ndarray of bool, shape (chords,)
        Chords on the home tonic.
    """

    def __init__(
        self,
        layout: Layout,
        options: list[tuple[Template, ...]],
        places: Floats,
        home: Flags,
        weights: Weights,
        limit: int,
        cap: float,
    ) -> None:
        self.layout, self.options, self.places = layout, options, places
        self.home = home
        self.weights, self.limit, self.cap = weights, limit, cap
        self.count = np.array([max(len(one), 1) for one in options], dtype=np.int64)
        widest = int(self.count.max(initial=1))
        self.cents = np.zeros((len(options), widest, _DEGREES))
        for chord, choices in enumerate(options):
            for index, template in enumerate(choices):
                self.cents[chord, index, : len(template.cents)] = template.cents
        pairs = self.count[:-1] * self.count[1:]
        self.first_pair = np.concatenate(([0], np.cumsum(pairs)))
        self.tone = (layout.degree >= 0) & ~layout.lone & layout.tuned

    def _own_costs(self) -> list[Floats]:
        """For each chord: cost of each alternative at each place, shape (alternatives, grid)."""
        layout, weights = self.layout, self.weights
        length, every = np.zeros((2, len(self.options)))
        sung = np.where(self.tone, layout.length, 0.0)
        np.maximum.at(length, layout.chord, sung)
        np.add.at(every, layout.chord, sung)
        away = (_PLACES[None, :] - self.places[:, None] + _HALF) % _CIRCLE - _HALF
        anchor = weights.anchor * np.where(self.home, weights.tonic, 1.0)
        pull = (anchor * np.maximum(length, every / CHOIR))[:, None] * away**2
        wolf = weights.chord * weights.wolf * length
        sounding: list[set[int]] = [set() for _ in self.options]
        for chord, degree in zip(
            layout.chord[self.tone].tolist(), layout.degree[self.tone].tolist(), strict=True
        ):
            sounding[chord].add(degree)
        found = []
        for chord, choices in enumerate(self.options):
            heard = frozenset(sounding[chord])
            impure = [wolf[chord] * wolves(one, heard, self.limit) for one in choices]
            exceptional = [_EXCEPTION * is_exception(one, choices[0]) for one in choices]
            badness = np.array(impure or [0.0]) + np.array(exceptional or [0.0])
            found.append(pull[chord][None, :] + badness[:, None])
        return found

    def _link_costs(self, links: Ints, kind: str) -> Floats:
        """Cost of links between neighbouring chords, by pair of alternatives and change of root.

        Returns an array of shape (pairs of alternatives of all boundaries, grid).
        """
        layout = self.layout
        left, right = links.T
        used = self.tone[left] & self.tone[right] & (layout.chord[right] == layout.chord[left] + 1)
        links = links[used]
        total = np.zeros((int(self.first_pair[-1]), _GRID))
        for start in range(0, len(links), _LINKS_AT_ONCE):
            left, right = links[start : start + _LINKS_AT_ONCE].T
            before = layout.chord[left]
            pairs = self.first_pair[before + 1] - self.first_pair[before]
            link = np.repeat(np.arange(len(left)), pairs)
            number = np.arange(len(link)) - (np.cumsum(pairs) - pairs)[link]
            left, right, before = left[link], right[link], before[link]
            one, other = np.divmod(number, self.count[before + 1])
            own = self.cents[before, one, layout.degree[left]]
            just = self.cents[before + 1, other, layout.degree[right]] - own
            change = just[:, None] + _CHANGES[None, :]
            cost = self._held(change) if kind == "held" else self._stepped(left, right, change)
            np.add.at(total, self.first_pair[before] + number, cost)
        return total

    def _held(self, change: Floats) -> Floats:
        beyond = np.maximum(np.abs(change) - self.cap, 0.0)
        return self.weights.held * change**2 + _STEEP * beyond**2

    def _stepped(self, left: Ints, right: Ints, change: Floats) -> Floats:
        distance = self.layout.key[right] - self.layout.key[left]
        rising = np.where(distance < 0, -1.0, 1.0)
        sizes = rising[:, None] * steps(self.limit)[np.abs(distance) % 12]
        missed = (change[:, :, None] - sizes[:, None, :]) ** 2
        again = (distance == 0)[:, None]
        return self.weights.melodic * np.where(
            again, self.weights.repeated / self.weights.melodic * change**2, missed.min(axis=2)
        )

    def search(self) -> tuple[list[int], Floats]:
        """The cheapest path: which alternative each chord takes, and its root in cents."""
        own = self._own_costs()
        held, melodic = self.layout.held, self.layout.melodic
        links = self._link_costs(held, "held") + self._link_costs(melodic, "melodic")
        expected = np.diff(self.places)
        best, back = own[0], []
        for chord in range(1, len(own)):
            scant = _SCANT * (_CHANGES - expected[chord - 1]) ** 2
            pairs = links[self.first_pair[chord - 1] : self.first_pair[chord]] + scant
            turns = pairs.reshape(self.count[chord - 1], self.count[chord], _GRID)[:, :, _TURN]
            total = (best[:, None, :, None] + turns).transpose(0, 2, 1, 3)
            flat = total.reshape(-1, *total.shape[2:])
            chosen = flat.argmin(axis=0)
            back.append(chosen)
            best = np.take_along_axis(flat, chosen[None], axis=0)[0] + own[chord]
        return self._traced(best, back)

    def _traced(self, best: Floats, back: list[Ints]) -> tuple[list[int], Floats]:
        template, place = divmod(int(best.argmin()), _GRID)
        path = [(template, place)]
        for chosen in reversed(back):
            template, place = divmod(int(chosen[template, place]), _GRID)
            path.append((template, place))
        path.reverse()
        places = np.array([one[1] for one in path])
        changes = _CHANGES[(places[1:] - places[:-1]) % _GRID]
        roots = _PLACES[places[0]] + np.concatenate(([0.0], np.cumsum(changes)))
        return [one[0] for one in path], roots


Options = list[tuple[Template, ...]]
"""The alternatives of each chord."""


def options_of(score: Score, harmony: Harmony, limit: int) -> Options:
    """The templates each chord may take, the preferred one first; none where nothing sounds."""
    sixths = sixth_chords(score, harmony)
    return [
        templates(chord.quality, limit, chord.index in sixths) if chord.quality else ()
        for chord in harmony.chords
    ]


def preferred(options: Options) -> tuple[Template | None, ...]:
    """The first alternative of each chord."""
    return tuple(next(iter(one), None) for one in options)


def choose(
    layout: Layout,
    options: Options,
    places: Floats,
    home: Flags,
    weights: Weights,
    limit: int,
    cap: float,
) -> Choice:
    """A template and a rough root for each chord of a piece; parameters as in `Chooser`."""
    if not options:
        return Choice((), np.zeros(0))
    chosen, roots = Chooser(layout, options, places, home, weights, limit, cap).search()
    picked = tuple(
        choices[index] if choices else None for choices, index in zip(options, chosen, strict=True)
    )
    return Choice(picked, roots)
