"""Levels and places of the parts in each kind of track.

Conventions
-----------
* A mix is one strip for each part of what is played, guide parts included; None is a silent
  part.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from retune.score.model import Part, PartKind, Score
from retune.tracks.guides import DRONE
from retune.tracks.options import TrackOptions
from retune.tracks.take import Strip

_STARTING_DB = 0.0
_CLICK_DB = -6.0
_DRONE_DB = -9.0
"""Guides lie below the singers whom they help (our choice, by ear of the levels)."""

Strips = tuple[Strip | None, ...]


@dataclass(frozen=True)
class Mixer:
    """Makes the mixes of one piece."""

    score: Score
    options: TrackOptions

    def full(self) -> Strips:
        """Everybody as loud as the dynamics say, the accompaniment quieter."""
        return self._mix(lambda _: 0.0, self.options.accompaniment_db)

    def predominant(self, part: int) -> Strips:
        """One part in front, the others behind it."""
        others = self.options.others_db
        return self._mix(lambda index: 0.0 if index == part else others, self._behind)

    def alone(self, part: int) -> Strips:
        """Only one part, over the accompaniment."""
        return self._mix(lambda index: 0.0 if index == part else -math.inf, self._behind)

    def missing(self, part: int) -> Strips:
        """All but one part, for who sings it."""
        return self._mix(
            lambda index: -math.inf if index == part else 0.0, self.options.accompaniment_db
        )

    def sides(self, part: int) -> Strips:
        """One part on the left, all others on the right, guides in the middle."""
        return tuple(
            None if strip is None else Strip(strip.gain_db, _side(one, part))
            for one, strip in zip(self.score.parts, self.full(), strict=True)
        )

    @property
    def _behind(self) -> float:
        """Level of the accompaniment behind one part."""
        return min(self.options.accompaniment_db, self.options.others_db)

    def _mix(self, voice_db: Callable[[int], float], accompaniment_db: float) -> Strips:
        pans = self._pans()
        return tuple(
            _strip(self._level(part, voice_db, accompaniment_db), pans.get(part.index, 0.0))
            for part in self.score.parts
        )

    def _level(
        self, part: Part, voice_db: Callable[[int], float], accompaniment_db: float
    ) -> float:
        if part.kind is PartKind.CLICK:
            return _CLICK_DB
        if part.kind is PartKind.GUIDE:
            return _DRONE_DB if part.name == DRONE else _STARTING_DB
        return voice_db(part.index) if part.tuned else accompaniment_db

    def _pans(self) -> dict[int, float]:
        """Voices from left to right in score order; everything else stays in the middle."""
        voices = [part.index for part in self.score.parts if part.tuned]
        width, steps = self.options.width, max(len(voices) - 1, 1)
        if len(voices) == 1:
            return {}
        return {index: width * (2 * place / steps - 1) for place, index in enumerate(voices)}


def _side(one: Part, part: int) -> float:
    if one.guides:
        return 0.0
    return -1.0 if one.index == part else 1.0


def _strip(gain_db: float, pan: float) -> Strip | None:
    return None if gain_db == -math.inf else Strip(gain_db, pan)
