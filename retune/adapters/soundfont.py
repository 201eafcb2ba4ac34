"""Sound fonts through FluidSynth (pyfluidsynth), where both are installed.

FluidSynth takes every pitch down to a whole cent and a bend for 127/128 of itself
(`fluid_ct2hz_real` and the default modulator of its sources, 2.3 to 2.6); bends are sent so that
the nearest whole cent sounds. What is rendered is thus up to half a cent off, besides what the
font's own samples are.
"""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from retune.errors import OutputError, Place

_INSTALL = (
    "Install both: pip install 'retune-choir[soundfont]', and the library FluidSynth (Debian and "
    "Ubuntu: apt install libfluidsynth3; macOS: brew install fluid-synth); or leave out the sound "
    "font for the built-in voice"
)
_GAIN = 0.4
_RELEASE_SECONDS = 0.6
"""How long a released note is taken to sound on and to keep its channel."""

_PERCUSSION = 9
_CHANNELS = tuple(channel for channel in range(16) if channel != _PERCUSSION)
_PERCUSSION_BANK = 128
_BEND_CENTS = 200.0
_CENTRE, _HIGHEST = 8192, 16383
_GLIDE_SECONDS = 0.04
_GLIDE_STEPS = 8

Sound = NDArray[np.float32]


@dataclass(frozen=True, slots=True)
class FontNote:
    """One note to be played.

    `start` and `stop` are seconds; `pitches` are (second, float MIDI key), ascending, the first
    at `start`: a note may move while it sounds.
    """

    start: float
    stop: float
    velocity: int
    pitches: tuple[tuple[float, float], ...]


def require_soundfont(font: Path) -> None:
    """Raise `OutputError` where the font cannot be read or nothing is there to play it."""
    place = Place(str(font))
    try:
        with font.open("rb") as stream:
            head = stream.read(12)
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise OutputError(
            f"the sound font cannot be read: {reason}", place, "Give the path of an .sf2 file"
        ) from error
    if head[:4] != b"RIFF" or head[8:] != b"sfbk":
        raise OutputError("is no sound font", place, "Give an .sf2 file")
    with _synth(font, 44100):
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
        At most fifteen that differ in their bend may sound at once.
    program : int
        General MIDI program, from 0; with `percussion` a drum kit.
    seconds : float
        Length of the sound; what rings on after it is cut off.

    Returns
    -------
    ndarray, shape (ceil(seconds * rate),)
        Mono, without reverberation and chorus.
    """
    with _synth(font, rate) as (synth, number):
        for channel in _CHANNELS:
            synth.program_select(channel, number, 0, program)
            synth.cc(channel, 7, 127)
        if percussion:
            synth.program_select(_PERCUSSION, number, _PERCUSSION_BANK, 0)
            synth.cc(_PERCUSSION, 7, 127)
        events = _events(notes, rate, percussion)
        return _played(synth, events, int(np.ceil(seconds * rate)))


def _library() -> ModuleType:
    try:
        import fluidsynth
    # Without the C library the package raises whatever its search ends with.
    except Exception as error:
        raise OutputError("no FluidSynth is there to play a sound font", hint=_INSTALL) from error
    return fluidsynth  # type: ignore[no-any-return]


@contextmanager
def _synth(font: Path, rate: int) -> Iterator[tuple[Any, int]]:
    """A synth with the font loaded; its C library's words about the font are kept quiet."""
    library = _library()
    with _quiet():
        synth = library.Synth(gain=_GAIN, samplerate=float(rate))
        try:
            for name in ("synth.reverb.active", "synth.chorus.active"):
                synth.setting(name, 0)
            number = synth.sfload(str(font))
            if number < 0:
                raise OutputError(
                    "the sound font cannot be loaded", Place(str(font)), "Try another .sf2 file"
                )
            yield synth, number
        finally:
            synth.delete()


@contextmanager
def _quiet() -> Iterator[None]:
    """Send what a C library writes to standard error nowhere."""
    kept = os.dup(2)
    nowhere = os.open(os.devnull, os.O_WRONLY)
    try:
        os.dup2(nowhere, 2)
        yield
    finally:
        os.dup2(kept, 2)
        os.close(kept)
        os.close(nowhere)


@dataclass(frozen=True, slots=True, order=True)
class _Event:
    """What happens at a frame: note-offs before bends before note-ons."""

    frame: int
    rank: int
    channel: int
    first: int
    second: int = 0


_OFF, _BEND, _ON = range(3)


@dataclass(slots=True)
class _Channel:
    """What a channel plays: its bend, and until when each of its keys is heard."""

    number: int
    bend: int = _CENTRE
    moving: bool = False
    keys: dict[int, float] = field(default_factory=dict)

    def heard_until(self) -> float:
        """Second in which its last release has died away."""
        return max(self.keys.values(), default=-1.0)

    def suits(self, note: FontNote, key: int, bend: int) -> bool:
        """Whether the note can sound here as things stand, beside what does."""
        ringing = {k for k, end in self.keys.items() if end > note.start}
        if not ringing:
            return True
        moves = len(note.pitches) > 1 or self.moving
        return not moves and bend == self.bend and key not in ringing


def _wheel(cents: float) -> int:
    """The bend that makes FluidSynth sound the whole cent nearest to `cents`."""
    sent = (round(cents) + 0.3) * 128.0 / 127.0
    return min(max(_CENTRE + round(sent * 8192.0 / _BEND_CENTS), 0), _HIGHEST)


def _events(notes: Sequence[FontNote], rate: int, percussion: bool) -> list[_Event]:
    events: list[_Event] = []
    channels = [_Channel(number) for number in _CHANNELS]
    for note in sorted(notes, key=lambda one: one.start):
        on, off = round(note.start * rate), max(round(note.stop * rate), 1)
        key = min(max(round(note.pitches[0][1]), 0), 127)
        if percussion:
            events += [_Event(on, _ON, _PERCUSSION, key, note.velocity)]
            continue
        bend = _wheel(100.0 * (note.pitches[0][1] - key))
        place = min(channels, key=lambda one: (not one.suits(note, key, bend), one.heard_until()))
        place.keys = {k: end for k, end in place.keys.items() if end > note.start}
        place.keys[key] = note.stop + _RELEASE_SECONDS
        place.bend, place.moving = bend, len(note.pitches) > 1
        events.append(_Event(on, _BEND, place.number, bend))
        events.append(_Event(on, _ON, place.number, key, note.velocity))
        events.append(_Event(max(off, on + 1), _OFF, place.number, key))
        for second, pitch in _glides(note):
            wheel = _wheel(100.0 * (pitch - key))
            events.append(_Event(round(second * rate), _BEND, place.number, wheel))
    return sorted(events)


def _glides(note: FontNote) -> Iterator[tuple[float, float]]:
    """Steps of every move of a note after its start."""
    ends = [*(second for second, _ in note.pitches[1:]), note.stop]
    for index in range(1, len(note.pitches)):
        begin, pitch = note.pitches[index]
        before = note.pitches[index - 1][1]
        span = min(_GLIDE_SECONDS, (ends[index] - begin) / 2)
        for step in range(1, _GLIDE_STEPS + 1):
            share = step / _GLIDE_STEPS
            yield begin + span * share, before + (pitch - before) * share


def _played(synth: Any, events: Sequence[_Event], frames: int) -> Sound:
    out = np.zeros(frames, np.float32)
    at = 0
    for event in [*events, _Event(frames, _OFF, -1, 0)]:
        frame = min(event.frame, frames)
        if frame > at:
            stereo = synth.get_samples(frame - at).astype(np.float32).reshape(-1, 2)
            out[at:frame] = stereo.mean(axis=1) / 32768.0
            at = frame
        if event.channel < 0:
            break
        if event.rank == _ON:
            synth.noteon(event.channel, event.first, event.second)
        elif event.rank == _BEND:
            synth.pitch_bend(event.channel, event.first - _CENTRE)
        else:
            synth.noteoff(event.channel, event.first)
    return out
