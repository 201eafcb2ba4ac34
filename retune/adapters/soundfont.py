"""Sound fonts through FluidSynth (pyfluidsynth), where both are installed.

FluidSynth drops what is left of a cent of every pitch (`fluid_ct2hz_real` of its sources, 2.3 to
2.6), whether it came by bend, by generator or by one of its tunings. Its rendering rate is a real
number, though: a note rendered at a little less than the rate it is heard at sounds by exactly
that ratio higher. So every note is rendered by itself, its whole cents by the player and its
sixteenths of a cent by the rate, and added up here. No two notes share a channel, any number may
sound at once, and each begins at its exact frame.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import groupby
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from retune.adapters.soundfont_player import BLOCK, Player, player
from retune.errors import OutputError, Place

_STEPS = 16
"""Steps of a cent: every pitch of a note that does not move is within 1/32 cent."""

_GLIDE_SECONDS = 0.04
_TAIL_BLOCKS = 64
_LEAST_RATE, _HIGHEST_RATE = 8100, 96000

Sound = NDArray[np.float32]


@dataclass(frozen=True, slots=True)
class FontNote:
    """One note to be played.

    `start` and `stop` are seconds, `velocity` is 1 to 127; `pitches` are (second, float MIDI
    key), ascending, the first at `start`: a note may move while it sounds.
    """

    start: float
    stop: float
    velocity: int
    pitches: tuple[tuple[float, float], ...]

    def __post_init__(self) -> None:
        seconds = [second for second, _ in self.pitches]
        if not seconds or seconds[0] != self.start or seconds != sorted(seconds):
            raise ValueError("pitches must ascend in time from the start of the note")
        if not 1 <= self.velocity <= 127 or not 0.0 <= self.start <= self.stop < math.inf:
            raise ValueError("a note needs a velocity of 1 to 127, and a stop after its start")


def require_soundfont(path: Path) -> None:
    """Raise `OutputError` where the font cannot be read or nothing is there to play it."""
    place = Place(str(path))
    hint = "Give the path of an .sf2 file"
    # A pipe would be waited for without end.
    if path.exists() and not path.is_file():
        raise OutputError("is no sound font", place, hint)
    try:
        with path.open("rb") as stream:
            head = stream.read(12)
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise OutputError(f"the sound font cannot be read: {reason}", place, hint) from error
    if head[:4] != b"RIFF" or head[8:] != b"sfbk":
        raise OutputError("is no sound font", place, hint)
    with player(path, 44100.0):
        pass


def render(
    notes: Sequence[FontNote],
    program: int,
    seconds: float,
    font: Path,
    rate: int = 44100,
    percussion: bool = False,
) -> Sound:
    """Play notes through a sound font.

    Parameters
    ----------
    notes : sequence of FontNote
        In any order. Those that move are within half a cent, others within 1/32 cent, besides
        what the font's own samples are.
    program : int
        General MIDI program, from 0; with `percussion` the drum kit of that number, whose notes
        ring on by themselves.
    seconds : float
        Length of the sound; what rings on after it is cut off.
    rate : int
        Samples a second, 8100 to 96000.

    Returns
    -------
    ndarray, shape (ceil(seconds * rate),)
        Mono, without reverberation and chorus. Where more notes sound at once than full scale
        holds, the whole is turned down to it.

    Raises
    ------
    OutputError
        The font cannot be loaded or has no such program, or nothing is there to play it.
    """
    if not _LEAST_RATE <= rate <= _HIGHEST_RATE:
        raise ValueError(f"{rate} samples a second; {_LEAST_RATE} to {_HIGHEST_RATE} are rendered")
    out = np.zeros(math.ceil(seconds * rate), np.float32)
    steps = [(0 if percussion else _step(note), note) for note in notes]
    steps.sort(key=lambda one: (one[0], one[1].start, one[1].pitches, one[1].velocity))
    for step, group in groupby(steps, key=lambda one: one[0]):
        with player(font, rate * 2.0 ** (-step / (1200.0 * _STEPS))) as playing:
            playing.choose(program, percussion)
            for _, note in group:
                _add(out, playing, note, step, rate, percussion)
    peak = max(float(out.max(initial=0.0)), -float(out.min(initial=0.0)))
    if peak > 1.0:
        out /= np.float32(peak * (1.0 + 1e-6))
    return out


def _step(note: FontNote) -> int:
    """The step between whole cents that suits a note's pitches best, each by how long it lasts."""
    ends = [*(second for second, _ in note.pitches[1:]), note.stop]
    lasting = [
        (max(end - begin, 0.0) + 1e-9, 100.0 * key)
        for (begin, key), end in zip(note.pitches, ends, strict=True)
    ]

    def error(step: int) -> float:
        offs = ((time, cents - step / _STEPS) for time, cents in lasting)
        return sum(time * (off - round(off)) ** 2 for time, off in offs)

    return min(range(_STEPS), key=error)


def _add(
    out: Sound, playing: Player, note: FontNote, step: int, rate: int, percussion: bool
) -> None:
    """Render one note and add it to what sounds."""
    begin = round(note.start * rate)
    room = -(-(len(out) - begin) // BLOCK)
    if room <= 0:
        return
    key = min(max(round(note.pitches[0][1]), 0), 127)
    stop = max(round((note.stop - note.start) * rate / BLOCK), 1)
    at = 0

    def reach(block: int) -> None:
        nonlocal at
        block = min(block, room)
        if block > at:
            first = begin + at * BLOCK
            place = out[first : first + (block - at) * BLOCK]
            place += playing.blocks(block - at)[: len(place)]
            at = block

    if not percussion:
        playing.tune(_cents(note.pitches[0][1], key, step))
    playing.on(key, note.velocity)
    if not percussion:
        for block, pitch in _moves(note, rate):
            if block < stop:
                reach(block)
                playing.tune(_cents(pitch, key, step))
        reach(stop)
        playing.off(key)
    while at < room and playing.sounding():
        reach(at + _TAIL_BLOCKS)
    playing.hush()


def _cents(pitch: float, key: int, step: int) -> int:
    """Whole cents above a key, where the rate gives the step."""
    return round(100.0 * (pitch - key) - step / _STEPS)


def _moves(note: FontNote, rate: int) -> Iterator[tuple[int, float]]:
    """Pitches of a note after its start by the block they begin at, ascending: every change is
    a straight glide of at most `_GLIDE_SECONDS`."""
    ends = [*(second for second, _ in note.pitches[1:]), note.stop]
    for index in range(1, len(note.pitches)):
        second, pitch = note.pitches[index]
        before = note.pitches[index - 1][1]
        span = min(_GLIDE_SECONDS, max(ends[index] - second, 0.0) / 2.0)
        first = round((second - note.start) * rate / BLOCK)
        steps = max(round(span * rate / BLOCK), 1)
        for done in range(1, steps + 1):
            yield first + done - 1, before + (pitch - before) * done / steps
