"""Which vowel colour brings out a partial that two singers share.

A formant strengthens partials near it. Where one lies a little beside a shared partial, a small
change of the vowel brings that partial out, and with it the beats of a mistuning. This makes
beats easier to hear; that it tunes a chord is nobody's finding (handbook, voice.md 4.2, 4.3), and
no such thing is said here.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from retune.score.model import VoiceType
from retune.voice.beats import Pair, SharedPartial
from retune.voice.formants import Formants, formants

LEAST_MOVE, MOST_MOVE = 0.02, 0.15
"""Shares by which a formant may move: less is nothing to speak of, more is another vowel."""

_LOWEST_HZ, _HIGHEST_HZ = 300.0, 2400.0
_HIGHEST_FUNDAMENTAL = 500.0
"""Above this F1 follows the pitch and vowels converge (Joliveau, Smith & Wolfe 2004)."""

_VOWELS = ("i", "e", "a", "o", "u")


@dataclass(frozen=True, slots=True)
class Hint:
    """A small change of one singer's vowel.

    `tone` is the singer, `brighter` the direction, `toward` a vowel that lies there, `gain_db`
    how much stronger the partial gets.
    """

    tone: int
    partial: int
    other: int
    other_partial: int
    hz: float
    brighter: bool
    toward: str
    gain_db: float


def hint(
    fundamentals: Sequence[float],
    voices: Sequence[VoiceType | None],
    pairs: Sequence[Pair],
    vowel: str = "neutral",
) -> Hint | None:
    """The change that brings out a shared partial most, of the pairs' simplest intervals.

    Parameters
    ----------
    fundamentals : sequence of float
        Each tone's frequency in Hz.
    voices : sequence of VoiceType or None
        Who sings each tone; None for what is not sung.
    pairs : sequence of Pair
    vowel : str
        What is sung now.
    """
    found = [
        candidate
        for pair in pairs
        if pair.ratio.numerator not in (1, 2)
        for shared in pair.shared
        for candidate in _candidates(pair, shared, fundamentals, voices, vowel)
    ]
    return max(found, key=lambda one: (one.gain_db, -one.hz), default=None)


def _candidates(
    pair: Pair,
    shared: SharedPartial,
    fundamentals: Sequence[float],
    voices: Sequence[VoiceType | None],
    vowel: str,
) -> list[Hint]:
    sides = (
        (pair.low, shared.low_partial, pair.high, shared.high_partial),
        (pair.high, shared.high_partial, pair.low, shared.low_partial),
    )
    found = []
    for tone, partial, other, other_partial in sides:
        voice = voices[tone]
        f0 = fundamentals[tone]
        if voice is None or partial == 1 or f0 > _HIGHEST_FUNDAMENTAL:
            continue
        hz = partial * f0
        move = _move(voice, vowel, hz)
        if move is None:
            continue
        brighter, toward, gain = move
        found.append(Hint(tone, partial, other, other_partial, hz, brighter, toward, gain))
    return found


def _move(voice: VoiceType, vowel: str, hz: float) -> tuple[bool, str, float] | None:
    """Direction, a vowel that way and the gain in dB of bringing the nearest formant to `hz`."""
    if not _LOWEST_HZ <= hz <= _HIGHEST_HZ:
        return None
    now = formants(voice, vowel)
    number = min((0, 1), key=lambda n: abs(math.log(hz / now.hz[n])))
    share = hz / now.hz[number] - 1.0
    if not LEAST_MOVE <= abs(share) <= MOST_MOVE:
        return None
    there = _toward(voice, number, now, share > 0)
    if there is None:
        return None
    off = abs(hz - now.hz[number])
    # A resonance off by d loses 10 log10(1 + (2 d / B)^2) dB.
    gain = 10.0 * math.log10(1.0 + (2.0 * off / now.bandwidths[number]) ** 2)
    return share > 0, there, gain


def _toward(voice: VoiceType, number: int, now: Formants, higher: bool) -> str | None:
    """The vowel whose formant lies nearest on that side, and the other one least moved."""
    rows = [(name, formants(voice, name).hz) for name in _VOWELS]
    ahead = [
        (name, hz)
        for name, hz in rows
        if (hz[number] > 1.01 * now.hz[number]) == higher
        and abs(math.log(hz[number] / now.hz[number])) > 0.01
    ]

    def distance(row: tuple[str, tuple[float, ...]]) -> float:
        return sum(abs(math.log(row[1][n] / now.hz[n])) for n in (0, 1))

    return min(ahead, key=distance)[0] if ahead else None
