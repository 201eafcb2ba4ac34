"""The glottal source: the LF model of the flow derivative, by its shape parameter Rd.

G. Fant, J. Liljencrants and Q. Lin, "A four-parameter model of glottal flow", STL-QPSR 26(4),
1-13 (1985); Rd from G. Fant, "The LF-model revisited", STL-QPSR 36(2-3), 119-156 (1995).

Conventions
-----------
* Time is in periods, the period begins when the glottis opens; the greatest negative flow
  derivative, at closure, is 1.
* Rd runs from 0.3 (pressed) to 2.7 (breathy).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

LEAST_RD, MOST_RD = 0.3, 2.7


@dataclass(frozen=True, slots=True)
class Pulse:
    """One LF pulse: `peak` is when the flow is greatest, `closure` when it falls fastest,
    `recovery` the return phase's time constant; `growth` is alpha, `decay` epsilon."""

    peak: float
    closure: float
    recovery: float
    growth: float
    decay: float


@cache
def pulse(rd: float) -> Pulse:
    """The LF pulse of a shape parameter, clamped to 0.3 to 2.7."""
    rd = min(max(rd, LEAST_RD), MOST_RD)
    ra = (-1.0 + 4.8 * rd) / 100.0
    rk = (22.4 + 11.8 * rd) / 100.0
    rg = rk / (4.0 * (0.11 * rd / (0.5 + 1.2 * rk) - ra))
    peak = 1.0 / (2.0 * rg)
    closure = peak * (1.0 + rk)
    rest = 1.0 - closure
    decay = _root(lambda e: e * ra - 1.0 + math.exp(-e * rest), 1e-3 / ra, 1.0 / ra)
    returned = _return_area(ra, decay, rest)
    growth = _root(lambda a: _open_area(a, peak, closure) + returned, -60.0, 60.0)
    return Pulse(peak, closure, ra, growth, decay)


def _open_area(growth: float, peak: float, closure: float) -> float:
    """Integral of the flow derivative up to closure."""
    turn = math.pi / peak
    inside = growth * math.sin(turn * closure) - turn * math.cos(turn * closure)
    whole = inside + turn * math.exp(-growth * closure)
    return -whole / ((growth**2 + turn**2) * math.sin(turn * closure))


def _return_area(recovery: float, decay: float, rest: float) -> float:
    """Integral of the flow derivative from closure on."""
    left = math.exp(-decay * rest)
    return -((1.0 - left) / decay - left * rest) / (decay * recovery)


def _root(function: Callable[[float], float], low: float, high: float) -> float:
    """Where a function changes sign between two values, by halving."""
    at_low = function(low)
    for _ in range(100):
        middle = 0.5 * (low + high)
        value = function(middle)
        if (value > 0.0) == (at_low > 0.0):
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


def harmonics(rd: float, count: int) -> Floats:
    """Amplitudes of harmonics 1 to `count` of the flow derivative, by the closed-form integral.

    Returns
    -------
    array of float, shape (count,)
        Moduli of the Fourier coefficients over one period.
    """
    form = pulse(rd)
    turn = math.pi / form.peak
    rest = 1.0 - form.closure
    w = 2.0j * math.pi * np.arange(1, count + 1)
    left = math.exp(-form.decay * rest)
    scale = -math.exp(-form.growth * form.closure) / math.sin(turn * form.closure)
    up, down = form.growth - w + 1j * turn, form.growth - w - 1j * turn
    opening = (
        (np.exp(up * form.closure) - 1.0) / up - (np.exp(down * form.closure) - 1.0) / down
    ) / 2j
    at_closure, at_end = np.exp(-w * form.closure), np.exp(-w)
    falling = at_closure * (1.0 - np.exp(-(form.decay + w) * rest)) / (form.decay + w)
    floor = left * (at_closure - at_end) / w
    closing = -(falling - floor) / (form.decay * form.recovery)
    return np.asarray(np.abs(scale * opening + closing), dtype=np.float64)
