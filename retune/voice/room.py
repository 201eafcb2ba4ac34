"""A light reverberation: sound convolved with noise that decays exponentially.

J. A. Moorer, "About this reverberation business", Computer Music Journal 3(2), 1979: the response
of a good hall is close to decaying noise. High frequencies die away sooner, as air and walls
take them; the direct sound stays as it is, so that pitch and onset are untouched.
"""

from __future__ import annotations

from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

_SEED = 20


class Room(StrEnum):
    """Where the choir sings."""

    OFF = "off"
    CHAPEL = "chapel"
    CHURCH = "church"


# Seconds until the sound has fallen by 60 dB, its delay behind the direct sound in seconds, and
# its level against it in dB.
_ROOMS = {Room.CHAPEL: (1.3, 0.012, -14.0), Room.CHURCH: (2.6, 0.022, -12.0)}
_CORNER_HZ = 3500.0


def seconds_of(room: Room) -> float:
    """How long the room rings on after a sound."""
    return _ROOMS[room][0] if room is not Room.OFF else 0.0


def in_room(samples: NDArray[np.float32], rate: int, room: Room) -> NDArray[np.float32]:
    """Stereo sound, shape (frames, 2), as it is heard in a room; the same number of frames."""
    if room is Room.OFF or not len(samples):
        return samples
    from scipy.signal import oaconvolve

    wet = oaconvolve(samples, _response(room, rate), axes=0)[: len(samples)]
    heard: NDArray[np.float32] = samples + wet.astype(np.float32)
    return heard


def _response(room: Room, rate: int) -> NDArray[np.float32]:
    """The room's answer to a click, without the click: shape (frames, 2), energy by level."""
    seconds, delay, level = _ROOMS[room]
    frames = round(seconds * rate)
    time = np.arange(frames) / rate
    noise = np.random.default_rng(_SEED).standard_normal((2, frames))
    # Early in the decay all frequencies sound, late ones only below the corner.
    bright = noise * 10.0 ** (-3.0 * time / (0.45 * seconds))
    dark = _low(noise, rate) * 10.0 ** (-3.0 * time / seconds)
    answer = bright + dark
    answer *= 10.0 ** (level / 20.0) / np.sqrt((answer**2).sum(axis=1, keepdims=True))
    delayed = np.pad(answer, ((0, 0), (round(delay * rate), 0)))
    heard: NDArray[np.float32] = delayed.T.astype(np.float32)
    return heard


def _low(noise: NDArray[np.float64], rate: int) -> NDArray[np.float64]:
    from scipy.signal import butter, sosfilt

    low: NDArray[np.float64] = sosfilt(butter(2, _CORNER_HZ, fs=rate, output="sos"), noise)
    return low
