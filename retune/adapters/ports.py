"""MIDI output ports, to play to a synth while the music goes.

Ports of the system are mido's, through its back end python-rtmidi (the extra `live`; mido's
MIDO_BACKEND chooses another). A port given as HOST:PORT is one over TCP that carries MIDI bytes
as they are, as mido's socket ports do.
"""

from __future__ import annotations

import re
import socket
from typing import Any, Protocol

import mido

from retune.adapters.midi_events import (
    Bend,
    ChannelPressure,
    Control,
    Event,
    KeyPressure,
    Meta,
    NoteOff,
    NoteOn,
    Program,
    Sysex,
)
from retune.errors import OutputError, WishError

_NETWORK = re.compile(r"(?P<host>\[[^\s\]]+\]|[^\s:\[\]]+):(?P<port>\d{1,7})")
_PATIENCE = 5.0
"""Seconds after which a receiver that takes nothing is given up."""

_NO_BACK_END = (
    "Install it with pip install 'retune-choir[live]', or name a port over the network as HOST:PORT"
)


class Port(Protocol):
    """Where MIDI goes."""

    @property
    def name(self) -> str:
        """The port's full name."""

    def send(self, event: Event) -> None:
        """Send one event now, metas excepted; raises `OutputError` where that fails."""

    def close(self) -> None:
        """Let the port go; nothing is sent any more."""


def wire_bytes(event: Event) -> bytes:
    """An event as it goes through a cable: status and data bytes; nothing for a meta event.

    >>> wire_bytes(Bend(1, 8192)).hex(" ")
    'e1 00 40'
    """
    match event:
        case NoteOff(channel, key, velocity):
            return bytes((0x80 | channel, key, velocity))
        case NoteOn(channel, key, velocity):
            return bytes((0x90 | channel, key, velocity))
        case KeyPressure(channel, key, pressure):
            return bytes((0xA0 | channel, key, pressure))
        case Control(channel, controller, value):
            return bytes((0xB0 | channel, controller, value))
        case Program(channel, program):
            return bytes((0xC0 | channel, program))
        case ChannelPressure(channel, pressure):
            return bytes((0xD0 | channel, pressure))
        case Bend(channel, value):
            return bytes((0xE0 | channel, value & 0x7F, value >> 7))
        case Sysex(data):
            return b"\xf0" + data + b"\xf7"
        case Meta():
            return b""


def output_names() -> list[str]:
    """Names of the system's output ports; raises `OutputError` where they cannot be known."""
    return _names(_back_end())


def open_port(name: str) -> Port:
    """Open an output port by its name, or by a part of it that no other port has.

    Raises
    ------
    WishError
        No port, or several, of that name; the ports are listed.
    OutputError
        No back end is installed, or the port cannot be opened.
    """
    if found := _NETWORK.fullmatch(name):
        return _NetworkPort(name, found["host"].strip("[]"), int(found["port"]))
    back_end = _back_end()
    full = _matching(name, _names(back_end))
    try:
        return _SystemPort(full, back_end.open_output(full))
    except OSError as error:
        raise OutputError(f"the MIDI port '{full}' cannot be opened: {error}") from error


def _back_end() -> Any:
    try:
        return mido.Backend(load=True)
    except ImportError as error:
        raise OutputError("no back end for MIDI ports is installed", hint=_NO_BACK_END) from error


def _names(back_end: Any) -> list[str]:
    try:
        # A port may be listed twice where two devices of one kind are there.
        return list(dict.fromkeys(back_end.get_output_names()))
    except OSError as error:
        raise OutputError(
            f"the system gives no MIDI ports: {error}",
            hint="Name a port over the network as HOST:PORT",
        ) from error


def _matching(name: str, names: list[str]) -> str:
    if name in names:
        return name
    near = [one for one in names if name.casefold() in one.casefold()] if name else []
    if len(near) == 1:
        return near[0]
    listed = ", ".join(f"'{one}'" for one in near or names)
    if near:
        raise WishError(f"several MIDI ports have '{name}' in their names", hint=f"Say {listed}")
    if not names:
        raise WishError(
            f"there is no MIDI port '{name}', nor any other",
            hint="Start the synth, or name a port over the network as HOST:PORT",
        )
    raise WishError(
        f"there is no MIDI port '{name}'", hint=f"{_question(name, names)}There are {listed}"
    )


def _question(name: str, names: list[str]) -> str:
    """The port that may be meant, judged by its beginning: systems add numbers behind."""
    from difflib import SequenceMatcher

    def likeness(one: str) -> float:
        return SequenceMatcher(None, name.casefold(), one[: len(name)].casefold()).ratio()

    best = max(names, key=likeness)
    return f"Did you mean '{best}'? " if likeness(best) >= 0.6 else ""


class _SystemPort:
    """A port that mido opened."""

    def __init__(self, name: str, port: Any) -> None:
        self.name = name
        self._port = port

    def send(self, event: Event) -> None:
        """Send one event now."""
        wire = wire_bytes(event)
        if not wire:
            return
        try:
            self._port.send(mido.Message.from_bytes(wire))
        # mido says ValueError where a port was closed from elsewhere.
        except (OSError, ValueError) as error:
            raise OutputError(f"the MIDI port '{self.name}' fails: {error}") from error

    def close(self) -> None:
        """Let the port go."""
        self._port.close()


class _NetworkPort:
    """MIDI bytes over TCP."""

    def __init__(self, name: str, host: str, port: int) -> None:
        if not 0 < port < 1 << 16:
            raise WishError(f"'{name}' is no port over the network", hint="Use 1 to 65535")
        self.name = name
        self._broken: OutputError | None = None
        try:
            self._socket = socket.create_connection((host, port), timeout=_PATIENCE)
        except (OSError, UnicodeError) as error:
            raise OutputError(
                f"nothing answers at {name}: {_said(error)}",
                hint="Start what listens there first, and check host and port",
            ) from error
        # Each message goes at once, not gathered with the next ones.
        self._socket.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)

    def send(self, event: Event) -> None:
        """Send one event now."""
        if self._broken is not None:
            raise self._broken
        try:
            self._socket.sendall(wire_bytes(event))
        except OSError as error:
            self._broken = OutputError(f"{self.name} takes no more MIDI: {_said(error)}")
            raise self._broken from error

    def close(self) -> None:
        """Let the port go."""
        self._socket.close()


def _said(error: OSError | UnicodeError) -> str:
    return (error.strerror if isinstance(error, OSError) else "") or str(error)
