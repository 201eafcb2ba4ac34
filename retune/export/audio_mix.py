"""From parts to mixes: every part is synthesised once, then added up at its level and place.

Conventions
-----------
* Sounds are float32; a part is mono, a mix has the shape (frames, 2), left first.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Hashable, Iterable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from threading import Lock

import numpy as np
from numpy.typing import NDArray

from retune.tracks.take import Take
from retune.tuning.model import TunedScore

RATE = 44100
_THREADS = 2
_BLOCK = 1 << 16
"""Frames added at a time, so that they stay in the processor's cache."""

Sound = NDArray[np.float32]
Player = Callable[[TunedScore, int], Sound]
"""Makes the sound of one part, from the start of the score to its end and a little further."""


@dataclass(frozen=True)
class _Stem:
    """One part's sound from its first frame that is not silent."""

    frames: int
    start: int
    sound: Sound


class Stems:
    """The sounds of all parts of a run's takes, made when the first of them is wanted.

    Takes share their parts: what sounds alike is synthesised once.
    """

    def __init__(self, takes: Iterable[Take], player: Player) -> None:
        self._player = player
        self._made: dict[Hashable, _Stem] = {}
        self._wanted = {
            _key(take.played, part): (take.played, part)
            for take in takes
            for part in _sounding(take)
        }
        self._lock = Lock()

    def get(self, played: TunedScore, part: int) -> _Stem:
        """The sound of one part of a take."""
        with self._lock:
            if self._wanted:
                with ThreadPoolExecutor(_THREADS) as pool:
                    made = pool.map(self._make, self._wanted.values())
                    self._made.update(zip(self._wanted, made, strict=True))
                self._wanted = {}
        return self._made[_key(played, part)]

    def _make(self, wish: tuple[TunedScore, int]) -> _Stem:
        sound = self._player(*wish)
        heard = np.flatnonzero(sound)
        if not len(heard):
            return _Stem(len(sound), 0, sound[:0])
        first, last = int(heard[0]), int(heard[-1])
        # A copy, so that the silence around it can be freed.
        return _Stem(len(sound), first, sound[first : last + 1].copy())


def _key(played: TunedScore, part: int) -> Hashable:
    """Equal for parts that sound alike."""
    notes = tuple(one for one in played.notes if one.note.part == part)
    score = played.score
    return score.parts[part], notes, score.tempo.changes, score.end


def _sounding(take: Take) -> Sequence[int]:
    parts = take.played.score.parts
    return [part.index for part in parts if take.strip(part.index) is not None]


def mixed(take: Take, stems: Stems) -> Sound:
    """All parts of a take at their levels and places, not yet levelled."""
    found = [(stems.get(take.played, part), take.strip(part)) for part in _sounding(take)]
    frames = max((stem.frames for stem, _ in found), default=0)
    mix = np.zeros((frames, 2), np.float32)
    for stem, strip in found:
        assert strip is not None
        gain = 10.0 ** (strip.gain_db / 20.0)
        shares = np.array([gain * share for share in panned(strip.pan)], np.float32)
        for begin in range(0, len(stem.sound), _BLOCK):
            block = stem.sound[begin : begin + _BLOCK]
            at = stem.start + begin
            mix[at : at + len(block)] += block[:, None] * shares
    return mix


def panned(place: float) -> tuple[float, float]:
    """Shares of left and right for a place from -1 to 1, of constant power.

    >>> panned(-1.0), panned(1.0)
    ((1.0, 0.0), (0.0, 1.0))
    """
    if abs(place) == 1.0:
        return (1.0, 0.0) if place < 0 else (0.0, 1.0)
    angle = (place + 1.0) * math.pi / 4.0
    return math.cos(angle), math.sin(angle)
