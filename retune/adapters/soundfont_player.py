"""FluidSynth itself, through pyfluidsynth: one sound font loaded at one rendering rate.

pyfluidsynth gives samples as 16-bit integers, clipped; what it does not wrap is declared here
with its own helper for C functions.
"""

from __future__ import annotations

import contextlib
import ctypes
import io
import os
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from retune.errors import OutputError, Place

BLOCK = 64
"""Frames FluidSynth renders at a time; whatever is told it counts from the next such block."""

_INSTALL = (
    "Install both: pip install 'retune-choir[soundfont]', and the library FluidSynth (Debian and "
    "Ubuntu: apt install libfluidsynth3; macOS: brew install fluid-synth; Windows: unpack a "
    "release of FluidSynth and put its bin folder on the PATH); or leave out the sound font for "
    "the built-in voice"
)
_GAIN = 0.4
_FINE_TUNE = 52
"""Generator fineTune of the SoundFont specification 2.04, 8.1.2: cents."""

_LOG_LEVELS = 5
_MELODIC_BANK, _PERCUSSION_BANK = 0, 128
_CHANNEL = 0

Sound = NDArray[np.float32]


def library() -> ModuleType:
    """The package pyfluidsynth; raises `OutputError` where it or its C library is missing."""
    try:
        # Where the variable CI is set, the package prints where it found the library.
        with contextlib.redirect_stdout(io.StringIO()):
            import fluidsynth
    # Without the C library the package raises whatever its search ends with.
    except Exception as error:
        raise OutputError("no FluidSynth is there to play a sound font", hint=_INSTALL) from error
    return fluidsynth  # type: ignore[no-any-return]  # it has no types


class Player:
    """A font and the one channel it is played on, without reverberation and chorus."""

    def __init__(self, synth: Any, font: Path, number: int) -> None:
        c_library = library()
        self._synth, self._font, self._number = synth, font, number
        self._count = c_library.fluid_synth_get_active_voice_count
        self._all_off = c_library.fluid_synth_all_sounds_off
        self._write = _function(
            c_library,
            "fluid_synth_write_float",
            *[ctypes.c_void_p, ctypes.c_int, ctypes.c_void_p, ctypes.c_int, ctypes.c_int],
            *[ctypes.c_void_p, ctypes.c_int, ctypes.c_int],
        )
        self._generator = _function(
            c_library,
            "fluid_synth_set_gen",
            *[ctypes.c_void_p, ctypes.c_int, ctypes.c_int, ctypes.c_float],
        )

    def choose(self, program: int, percussion: bool) -> None:
        """Take a program of the font; raises `OutputError` where it has none of that number."""
        bank = _PERCUSSION_BANK if percussion else _MELODIC_BANK
        if self._synth.program_select(_CHANNEL, self._number, bank, program) != 0:
            missing = "no drum kit" if percussion else f"no program {program}, counted from 0"
            without = "make no count-in and no click" if percussion else "use the built-in voice"
            raise OutputError(
                f"the sound font has {missing}",
                Place(str(self._font)),
                f"Give a General MIDI sound font, or {without}",
            )
        volume, most = 7, 127
        self._synth.cc(_CHANNEL, volume, most)

    def on(self, key: int, velocity: int) -> None:
        """Start a note at the next block."""
        self._synth.noteon(_CHANNEL, key, velocity)

    def off(self, key: int) -> None:
        """Release a note at the next block."""
        self._synth.noteoff(_CHANNEL, key)

    def tune(self, cents: int) -> None:
        """Sound whole cents above the key from the next block on.

        Half a cent more is sent, as the player drops what is left of a cent.
        """
        self._generator(self._synth.synth, _CHANNEL, _FINE_TUNE, cents + 0.5)

    def sounding(self) -> bool:
        """Whether anything sounds, a release included."""
        return bool(self._count(self._synth.synth))

    def hush(self) -> None:
        """End whatever still sounds."""
        if self.sounding():
            self._all_off(self._synth.synth, -1)
            self.blocks(1)

    def blocks(self, count: int) -> Sound:
        """The next blocks, mono, shape (count * BLOCK,)."""
        stereo = np.empty((count * BLOCK, 2), np.float32)
        to = stereo.ctypes.data
        self._write(self._synth.synth, len(stereo), to, 0, 2, to, 1, 2)
        mono: Sound = stereo.mean(axis=1)
        return mono


def _function(c_library: ModuleType, name: str, *types: Any) -> Any:
    """A C function that returns a status, by its name and the types it takes."""
    arguments = [(f"a{place}", kind, 1) for place, kind in enumerate(types)]
    found = c_library.cfunc(name, ctypes.c_int, *arguments)
    if found is None:
        raise OutputError(f"this FluidSynth is too old: it has no {name}", hint=_INSTALL)
    return found


@contextmanager
def player(font: Path, rate: float) -> Iterator[Player]:
    """A font loaded, to be rendered at a rate in Hz; no audio driver is started."""
    c_library = library()
    _keep_quiet(c_library)
    synth = c_library.Synth(
        gain=_GAIN,
        samplerate=rate,
        channels=16,
        **{
            "synth.reverb.active": 0,
            "synth.chorus.active": 0,
            # Only the samples that are played: a large font is there in milliseconds.
            "synth.dynamic-sample-loading": 1,
        },
    )
    try:
        with _nowhere():
            number = synth.sfload(str(font))
        if number < 0:
            raise OutputError(
                "the sound font cannot be loaded", Place(str(font)), "Try another .sf2 file"
            )
        yield Player(synth, font, number)
    finally:
        synth.delete()


def _keep_quiet(c_library: ModuleType) -> None:
    """Take away what writes the library's messages to standard error."""
    for level in range(_LOG_LEVELS):
        c_library.cfunc(
            "fluid_set_log_function",
            ctypes.c_void_p,
            ("level", ctypes.c_int, 1),
            ("function", ctypes.c_void_p, 1),
            ("data", ctypes.c_void_p, 1),
        )(level, None, None)


_REDIRECTED = threading.Lock()


@contextmanager
def _nowhere() -> Iterator[None]:
    """Send what C libraries write to standard error nowhere.

    A font that cannot be loaded makes GLib, which a loader uses, write by itself; nothing else
    does, so this is for loading alone. The lock keeps threads from restoring each other's.
    """
    with _REDIRECTED, contextlib.ExitStack() as stack:
        try:
            kept = os.dup(2)
        except OSError:
            # No standard error is open at all.
            yield
            return
        stack.callback(os.close, kept)
        nothing = os.open(os.devnull, os.O_WRONLY)
        stack.callback(os.close, nothing)
        os.dup2(nothing, 2)
        stack.callback(os.dup2, kept, 2)
        yield
