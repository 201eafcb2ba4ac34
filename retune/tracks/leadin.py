"""What comes before the music: how long the starting notes and the count-in take.

Conventions
-----------
* The lead-in is in the metre of the first bar and in whole bars, so that bar lines of all
  tracks stand alike in a sequencer. A pick-up gets the rest of its bar: in 4/4 a pick-up of one
  beat is counted in by one bar and three beats (common practice, no source).
* The lead-in goes at the tempo in which most of the music's first bar goes, so that a fermata
  on the first note does not slow the count.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

from retune.score.model import Bar, Score
from retune.tracks.stitch import Silence

SLOT_SECONDS = 0.9
"""Least time for one starting note (our choice: time to hear it and hum it)."""

OWN_SLOTS = 2
"""The singer's own note lasts as long as two of the others."""


@dataclass(frozen=True, slots=True)
class LeadIn:
    """Bars before the music.

    Parameters
    ----------
    silence : Silence
        All its bars, with the tempo.
    slot : Fraction
        Quarter notes from one starting note to the next, in half beats.
    counted_from : Fraction
        Where the count-in begins, in quarter notes from the start of the lead-in.
    """

    silence: Silence
    slot: Fraction
    counted_from: Fraction

    @property
    def duration(self) -> Fraction:
        """Quarter notes before the music."""
        return self.silence.duration


def lead_in(score: Score, first: int, slots: int, count_in: int) -> LeadIn:
    """The lead-in to a bar.

    Parameters
    ----------
    score : Score
    first : int
        Index of the bar, as played.
    slots : int
        How many starting notes there is room for; a beat of rest follows them. 0 for none.
    count_in : int
        Bars of count-in, 0 for none.
    """
    bar = score.bars[first]
    qpm = opening_tempo(score, first)
    beat, full = bar.counted_beat, bar.full_length
    halves = math.ceil(SLOT_SECONDS * float(qpm) / 60.0 / float(beat / 2) - 1e-9)
    slot = beat / 2 * halves
    starting = slots * slot + beat if slots else Fraction(0)
    bars = [full] * math.ceil(starting / full)
    counted_from = full * len(bars)
    bars += [full] * count_in
    if count_in and 0 < bar.begins < full:
        bars.append(bar.begins)
    return LeadIn(Silence(tuple(bars), qpm), slot, counted_from)


def opening_tempo(score: Score, first: int) -> Fraction:
    """Quarter notes a minute in which the longest stretch of a bar goes, with the next bar's
    start where the bar is a pick-up."""
    bar = score.bars[first]
    start, stop = bar.onset, bar.onset + max(bar.full_length, bar.duration)
    changes = score.tempo.changes
    lengths: dict[Fraction, Fraction] = {}
    for change, following in pairwise([*changes, None]):
        assert change is not None
        end = stop if following is None else min(following.onset, stop)
        length = end - max(change.onset, start)
        if length > 0:
            lengths[change.qpm] = lengths.get(change.qpm, Fraction(0)) + length
    return max(lengths, key=lambda qpm: lengths[qpm])


def beats_of(bar: Bar) -> list[Fraction]:
    """Onsets of the counted beats that begin in a bar; the first of a full bar comes first."""
    beat = bar.counted_beat
    first = math.ceil(bar.begins / beat) * beat - bar.begins
    count = math.ceil((bar.duration - first) / beat)
    return [bar.onset + first + beat * n for n in range(count)]
