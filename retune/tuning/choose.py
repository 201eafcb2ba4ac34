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

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from retune.tuning.alternatives import Options, is_exception, wolves
from retune.tuning.ground import Ground
from retune.tuning.intervals import Flags, Floats, Ints, steps
from retune.tuning.layout import Layout
from retune.tuning.ratios import DEGREES, Template
from retune.tuning.rows import CHOIR, held_weights, melodic_weights

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
_EXCEPTION = 20_000.0
"""Cost of a dominant seventh or augmented sixth that is not 4:5:6:7 though limit 7 is in force:
less than a held note that would move by 27 cents, more than several repeated ones."""
_LINKS_AT_ONCE = 20_000
_DEGREES = len(DEGREES) + 1  # the last one stands for none


Cost = Callable[[Floats, Floats, Ints, Floats], Floats]
"""Weight, change in cents, distance in semitones and cap of links -> cost at every change of
root."""


@dataclass(frozen=True)
class Choice:
    """The template of each chord (None where nothing sounds) and its rough root in cents."""

    templates: tuple[Template | None, ...]
    roots: Floats


def _away(roots: Floats) -> Floats:
    """Distance of every place of the grid from each root, shape (chords, grid)."""
    return (_PLACES[None, :] - roots[:, None] + _HALF) % _CIRCLE - _HALF


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
    fixed : ndarray, shape (chords,)
        Each root's cents in the tuning of the parts that cannot move.
    ground : Ground
        The wishes for every chord; steps are those of the largest limit in it.
    """

    def __init__(
        self,
        layout: Layout,
        options: Options,
        places: Floats,
        home: Flags,
        fixed: Floats,
        ground: Ground,
    ) -> None:
        self.layout, self.options = layout, options
        self.places, self.home, self.fixed = places, home, fixed
        self.ground, self.weights = ground, ground.weights
        self.limit = int(ground.limit.max(initial=3))
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
        length, every, beside = np.zeros((3, len(self.options)))
        sung = np.where(self.tone, layout.length, 0.0)
        np.maximum.at(length, layout.chord, sung)
        np.add.at(every, layout.chord, sung)
        accompanied = (layout.quarters * layout.accompanied)[layout.cell_slice]
        np.add.at(beside, layout.chord, np.where(self.tone, layout.per_piece(accompanied), 0.0))
        ground = self.ground
        anchor = ground.anchor * np.where(self.home, ground.tonic_pull, 1.0)
        pull = (anchor * np.maximum(length, every / CHOIR))[:, None] * _away(self.places) ** 2
        pull += (weights.fixed * beside)[:, None] * _away(self.fixed) ** 2
        wolf = weights.chord * weights.wolf * length
        sounding: list[set[int]] = [set() for _ in self.options]
        for chord, degree in zip(
            layout.chord[self.tone].tolist(), layout.degree[self.tone].tolist(), strict=True
        ):
            sounding[chord].add(degree)
        found = []
        for chord, choices in enumerate(self.options):
            heard = frozenset(sounding[chord])
            limit = int(ground.limit[chord])
            impure = [wolf[chord] * wolves(one, heard, limit) for one in choices]
            exceptional = [_EXCEPTION * is_exception(one, choices[0]) for one in choices]
            badness = np.array(impure or [0.0]) + np.array(exceptional or [0.0])
            found.append(pull[chord][None, :] + badness[:, None])
        return found

    def _link_costs(self, links: Ints, cost: Cost, weight: Floats) -> Floats:
        """Cost of links between neighbouring chords, by pair of alternatives and change of root.

        Returns an array of shape (pairs of alternatives of all boundaries, grid).
        """
        layout = self.layout
        left, right = links.T
        used = self.tone[left] & self.tone[right] & (layout.chord[right] == layout.chord[left] + 1)
        links, weight = links[used], weight[used]
        total = np.zeros((int(self.first_pair[-1]), _GRID))
        for start in range(0, len(links), _LINKS_AT_ONCE):
            left, right = links[start : start + _LINKS_AT_ONCE].T
            before = layout.chord[left]
            pairs = self.first_pair[before + 1] - self.first_pair[before]
            link = np.repeat(np.arange(len(left)), pairs)
            number = np.arange(len(link)) - (np.cumsum(pairs) - pairs)[link]
            before = before[link]
            one, other = np.divmod(number, self.count[before + 1])
            own = self.cents[before, one, layout.degree[left[link]]]
            just = self.cents[before + 1, other, layout.degree[right[link]]] - own
            change = just[:, None] + _CHANGES[None, :]
            distance = (layout.key[right] - layout.key[left])[link]
            cap = self.ground.cap[layout.chord[right]][link]
            costs = cost(weight[start + link, None], change, distance, cap)
            np.add.at(total, self.first_pair[before] + number, costs)
        return total

    def _held(self, weight: Floats, change: Floats, distance: Ints, cap: Floats) -> Floats:
        beyond = np.maximum(np.abs(change) - cap[:, None], 0.0)
        costs: Floats = weight * change**2 + _STEEP * beyond**2
        return costs

    def _stepped(self, weight: Floats, change: Floats, distance: Ints, cap: Floats) -> Floats:
        """Squared distance from the nearest just step; from the same pitch for repeated notes."""
        rising = np.where(distance < 0, -1.0, 1.0)
        sizes = rising[:, None] * steps(self.limit)[np.abs(distance) % 12]
        missed = (change[:, :, None] - sizes[:, None, :]) ** 2
        costs: Floats = weight * missed.min(axis=2)
        return costs

    def search(self) -> Choice:
        """The cheapest path."""
        if not self.options:
            return Choice((), np.zeros(0))
        own = self._own_costs()
        layout, ground = self.layout, self.ground
        links = self._link_costs(layout.held, self._held, held_weights(layout, ground))
        melodic = melodic_weights(layout, ground)
        links += self._link_costs(layout.melodic, self._stepped, melodic)
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

    def _traced(self, best: Floats, back: list[Ints]) -> Choice:
        """The path that ends cheapest, from the last chord back."""
        template, place = divmod(int(best.argmin()), _GRID)
        path = [(template, place)]
        for chosen in reversed(back):
            template, place = divmod(int(chosen[template, place]), _GRID)
            path.append((template, place))
        path.reverse()
        places = np.array([one[1] for one in path])
        changes = _CHANGES[(places[1:] - places[:-1]) % _GRID]
        roots = _PLACES[places[0]] + np.concatenate(([0.0], np.cumsum(changes)))
        picked = tuple(
            choices[index] if choices else None
            for choices, (index, _) in zip(self.options, path, strict=True)
        )
        return Choice(picked, roots)
