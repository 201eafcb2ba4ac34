"""Which vowel colour brings out a partial that two singers share.

Two partials that meet fluctuate by as much as the weaker of them is strong. Where the weaker one
lies a little beside a formant of its singer, a small change of that singer's vowel brings it out,
and with it the beats of a mistuning. This makes a mistuning easier to hear; that a vowel tunes a
chord is nobody's finding (handbook, voice.md 4.2 and 4.3), and no such thing is said here.

The levels are those of the model of the choir voice, not of a singer: a hint says what to try.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import product

import numpy as np

from retune.score.model import VoiceType
from retune.voice.beats import Pair
from retune.voice.formants import Formants, formants
from retune.voice.partials import ordinal
from retune.voice.spectrum import Floats, spectrum, transfer

LEAST_MOVE, SLIGHT_MOVE, MOST_MOVE = 0.02, 0.08, 0.15
"""Shares by which a formant may move: below the first it is nothing to speak of, up to the second
a shade of the vowel, beyond the last another vowel (voice.md 4.2)."""

LEAST_GAIN_DB = 3.0
"""A hint makes the fluctuation stronger by at least this much (our choice)."""

MOST_UNEQUAL_DB = 15.0
"""Partials whose levels then differ by more beat by less than 3.1 dB (voice.md 3.1)."""

HIGHEST_FUNDAMENTAL = 500.0
"""Above this F1 follows the pitch and vowels converge (Joliveau, Smith and Wolfe, JASA 116,
2434-2439, 2004)."""

_VOWELS = ("i", "e", "a", "o", "u")
_RD = 1.1
_SAME = 0.01


@dataclass(frozen=True, slots=True)
class Hint:
    """A small change of one singer's vowel.

    `tone` is the singer, whose `partial` meets `other_partial` of `other` at `hz`; both are
    indices of tones.
    `brighter` is the direction of the colour: forward, with F2 going up, or back. `toward` is a
    vowel that lies there, `moves` the shares by which F1 and F2 move, `gain_db` how much stronger
    the partial gets, `words` all of it in one cautious sentence.
    """

    tone: int
    partial: int
    other: int
    other_partial: int
    hz: float
    brighter: bool
    toward: str
    moves: tuple[float, float]
    gain_db: float
    words: str


@dataclass(frozen=True, slots=True)
class _Change:
    """A vowel on its way to another, as far as brings one formant to one frequency."""

    toward: str
    moves: tuple[float, float]
    formants: Formants


@dataclass(frozen=True, slots=True)
class _Meeting:
    """Two partials that meet, seen from the singer of the weaker one; `stronger_db` is how much
    stronger the other is."""

    tone: int
    partial: int
    other: int
    other_partial: int
    hz: float
    stronger_db: float


def hint(
    fundamentals: Sequence[float],
    voices: Sequence[VoiceType | None],
    pairs: Sequence[Pair],
    vowel: str = "neutral",
    names: Sequence[str] = (),
) -> Hint | None:
    """The change of vowel that makes a mistuning of two singers easiest to hear.

    A shade of the vowel goes before a greater change, then the one that strengthens the
    fluctuation most. Octaves are left out: every partial of the upper tone is shared already.

    Parameters
    ----------
    fundamentals : sequence of float
        Each tone's frequency in Hz.
    voices : sequence of VoiceType or None
        Who sings each tone; None for what is not sung, or nobody knows by whom.
    pairs : sequence of Pair
        As `beats.pairs` finds them among the same tones.
    vowel : str
        What all sing now, one of `options.VOWELS`.
    names : sequence of str
        What the singers are called in `words`; by their voice types where none are given.

    Returns
    -------
    Hint or None
        None where no change of up to `MOST_MOVE` makes the fluctuation `LEAST_GAIN_DB` stronger,
        and for pitches above `HIGHEST_FUNDAMENTAL`.
    """
    best: tuple[tuple[bool, float, float], _Meeting, _Change, float] | None = None
    for meeting in _meetings(fundamentals, voices, pairs, vowel):
        voice = voices[meeting.tone]
        assert voice is not None
        for change in _changes(voice, vowel, meeting.hz, fundamentals[meeting.tone]):
            gain = _gain_db(voice, vowel, change, meeting.hz)
            # The two meet on equal terms at best: beyond that the other is the weaker one.
            fluctuation = min(gain, meeting.stronger_db)
            if fluctuation < LEAST_GAIN_DB or abs(meeting.stronger_db - gain) > MOST_UNEQUAL_DB:
                continue
            rank = (_greatest(change.moves) <= SLIGHT_MOVE, fluctuation, -meeting.hz)
            if best is None or rank > best[0]:
                best = rank, meeting, change, gain
    if best is None:
        return None
    _, meeting, change, gain = best
    names = names or _names(voices, fundamentals, meeting)
    first, second = change.moves
    brighter = second > 0 if abs(second) > _SAME else first > 0
    return Hint(
        meeting.tone,
        meeting.partial,
        meeting.other,
        meeting.other_partial,
        meeting.hz,
        brighter,
        change.toward,
        change.moves,
        gain,
        _words(meeting, change, brighter, names),
    )


def _meetings(
    fundamentals: Sequence[float],
    voices: Sequence[VoiceType | None],
    pairs: Sequence[Pair],
    vowel: str,
) -> Iterator[_Meeting]:
    """Where two singers' partials meet and the weaker one is a vowel's to bring out."""
    for pair in pairs:
        low, high = voices[pair.low], voices[pair.high]
        if low is None or high is None or _octaves(pair):
            continue
        low_db = levels_db(fundamentals[pair.low], low, vowel)
        high_db = levels_db(fundamentals[pair.high], high, vowel)
        for shared in pair.shared:
            sides = (
                (pair.low, shared.low_partial, float(low_db[shared.low_partial - 1])),
                (pair.high, shared.high_partial, float(high_db[shared.high_partial - 1])),
            )
            (tone, partial, weak), (other, other_partial, strong) = sorted(
                sides, key=lambda side: side[2]
            )
            f0, stronger_db = fundamentals[tone], strong - weak
            # A fundamental is left alone: F1 held at it makes a voice unsteady (Titze, Riede and
            # Popolo, JASA 123, 1902, 2008).
            if partial > 1 and f0 <= HIGHEST_FUNDAMENTAL and stronger_db >= LEAST_GAIN_DB:
                yield _Meeting(tone, partial, other, other_partial, partial * f0, stronger_db)


def _changes(voice: VoiceType, vowel: str, hz: float, f0: float) -> Iterator[_Change]:
    """Every small change that brings F1 or F2 to a frequency, on the way to one of the vowels.

    Vowels whose F1 the pitch would raise are left out, at either end.
    """
    now = formants(voice, vowel)
    for toward, number in product(_VOWELS, (0, 1)):
        there = formants(voice, toward)
        wanted, whole = math.log(hz / now.hz[number]), math.log(there.hz[number] / now.hz[number])
        if toward == vowel or whole == 0.0 or not 0.0 < wanted / whole <= 1.0:
            continue
        changed = _on_the_way(now, there, wanted / whole)
        moves = (changed.hz[0] / now.hz[0] - 1.0, changed.hz[1] / now.hz[1] - 1.0)
        if (
            abs(moves[number]) >= LEAST_MOVE
            and _greatest(moves) <= MOST_MOVE
            and f0 < min(now.hz[0], changed.hz[0])
        ):
            yield _Change(toward, moves, changed)


def _on_the_way(now: Formants, there: Formants, share: float) -> Formants:
    """A vowel part of the way to another, on a straight line in log frequency."""

    def between(first: Sequence[float], second: Sequence[float]) -> tuple[float, ...]:
        return tuple(a * (b / a) ** share for a, b in zip(first, second, strict=True))

    return Formants(between(now.hz, there.hz), between(now.bandwidths, there.bandwidths))


def _gain_db(voice: VoiceType, vowel: str, change: _Change, hz: float) -> float:
    at = np.array([hz])
    after, before = transfer(at, change.formants), transfer(at, formants(voice, vowel))
    return 20.0 * math.log10(float(after[0]) / float(before[0]))


@lru_cache(maxsize=256)
def levels_db(f0: float, voice: VoiceType, vowel: str) -> Floats:
    """Levels of a singer's partials in dB of their whole power: all sing equally loud."""
    amplitudes = spectrum(f0, formants(voice, vowel), _RD)
    levels: Floats = 20.0 * np.log10(amplitudes) - 10.0 * np.log10(np.sum(amplitudes**2))
    return levels


def _octaves(pair: Pair) -> bool:
    p = pair.ratio.numerator
    return pair.ratio.denominator == 1 and p & (p - 1) == 0


def _greatest(moves: tuple[float, float]) -> float:
    return max(abs(move) for move in moves)


def _names(
    voices: Sequence[VoiceType | None], fundamentals: Sequence[float], meeting: _Meeting
) -> list[str]:
    """The voice types; the two that meet are told apart by their pitches where they are alike."""
    names = [f"the {voice}" if voice is not None else "" for voice in voices]
    tone, other = meeting.tone, meeting.other
    if voices[tone] is voices[other]:
        low, high = sorted((tone, other), key=lambda index: fundamentals[index])
        names[low], names[high] = f"the lower {voices[low]}", f"the higher {voices[high]}"
    return names


def _words(meeting: _Meeting, change: _Change, brighter: bool, names: Sequence[str]) -> str:
    slightly = "slightly " if _greatest(change.moves) <= SLIGHT_MOVE else "somewhat "
    return (
        f"A {slightly}{'brighter' if brighter else 'darker'} vowel in {names[meeting.tone]}, "
        f"towards {change.toward}, brings out its {ordinal(meeting.partial)} partial at "
        f"{meeting.hz:.0f} Hz, which meets the {ordinal(meeting.other_partial)} of "
        f"{names[meeting.other]}: a mistuning between them is then easier to hear."
    )
