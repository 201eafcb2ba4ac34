"""A tuned score sent to a MIDI port in real time.

What is played is the file that the exporter `midi` makes, so that every bend is right. Events go
out at absolute times of a clock that never steps, so that nothing adds up to a drift. However it
ends, no note hangs: what sounds is released, pedals go up, bends go back to the middle.

Conventions
-----------
* Seconds count from the first tick of the file; channels from 0.
"""

from __future__ import annotations

import time
from collections import Counter, deque
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import partial
from itertools import groupby
from operator import itemgetter
from typing import Protocol

from retune.adapters.midi import (
    Bend,
    Control,
    Event,
    Meta,
    NoteOff,
    NoteOn,
    RawMidi,
    Sysex,
    read_midi_file,
)
from retune.adapters.ports import Port
from retune.errors import RetuneError, WishError
from retune.limits import Limits
from retune.pipeline import Settings, exported, takes_of
from retune.score.midi.conductor import conductor_of, in_sequence, ticks_per_quarter
from retune.score.tempo import TempoChange, TempoMap
from retune.tuning.model import TunedScore

AHEAD = 0.2
"""Seconds from the set-up of the channels to the first note: a cable carries some 1,000
messages a second."""

TAIL = 1.0
"""Seconds that the last notes have to die away before their bends are taken back."""

_SLICE = 0.05
"""Seconds after which a stop is noticed at the latest."""

_CENTRE = 8192
_SUSTAIN, _SOSTENUTO, _HOLD, _ALL_NOTES_OFF = 64, 66, 69, 123
_PEDALS = (_SUSTAIN, _SOSTENUTO, _HOLD)


class Clock(Protocol):
    """Time that goes on evenly."""

    def now(self) -> float:
        """Seconds from any start."""

    def sleep(self, seconds: float) -> None:
        """Wait so long, or a little longer."""


class SystemClock:
    """The system's monotonic clock."""

    def now(self) -> float:
        """Seconds from any start."""
        return time.monotonic()

    def sleep(self, seconds: float) -> None:
        """Wait so long, or a little longer."""
        time.sleep(seconds)


@dataclass(frozen=True, slots=True)
class Moment:
    """What is sent at one time, in seconds, in this order."""

    seconds: float
    events: tuple[Event, ...]


@dataclass(frozen=True, slots=True)
class Programme:
    """A file made ready: what comes before the first note, the moments, the end in seconds."""

    setup: tuple[Event, ...]
    moments: tuple[Moment, ...]
    end: float


def programme_of(tuned: TunedScore, settings: Settings | None = None) -> Programme:
    """The full mix of a tuned score as the exporter `midi` writes it, checked as it would be.

    Raises what that exporter raises, for `settings` too.
    """
    for name in set(settings or {}) & {"ports", "parts"}:
        raise WishError(
            f"midi.{name} is not for playing: all parts go to one port", hint="Leave it out"
        )
    wishes: Mapping[str, Settings] = {"midi": settings or {}}
    (file,) = exported(takes_of(tuned), ("midi",), wishes)
    data = file.data
    if file.check is not None:
        file.check(data)
    # The limits were held when the score was read; bends make a file larger.
    return programme(read_midi_file(data, Limits(max_bytes=len(data), max_notes=len(data))))


def programme(raw: RawMidi) -> Programme:
    """A file's events by the second, metas left out.

    Order at one tick, track by track: first what ends notes begun before, then what comes
    before the first note-on, then the rest, so that the notes of a chord stand together.
    Nothing changes its place within its track.
    """
    raw = in_sequence(raw)
    per_quarter = ticks_per_quarter(raw.division)
    changes = sorted(conductor_of(raw).tempos.items())
    tempo = TempoMap(tuple(TempoChange(onset, qpm) for onset, qpm in changes))

    def seconds(tick: int) -> float:
        return tempo.seconds(Fraction(tick) / per_quarter)

    ordered = sorted(_phased(raw), key=itemgetter(0, 1))
    setup = tuple(event for tick, phase, event in ordered if tick == 0 and phase < _NOTES)
    rest = [(tick, event) for tick, phase, event in ordered if tick > 0 or phase == _NOTES]
    moments = tuple(
        Moment(seconds(tick), tuple(event for _, event in together))
        for tick, together in groupby(rest, itemgetter(0))
    )
    ends = [track.end for track in raw.tracks] + [tick for tick, _ in rest[-1:]]
    return Programme(setup, moments, seconds(max(ends, default=0)))


_RELEASES, _SETTINGS, _NOTES = range(3)


def _phased(raw: RawMidi) -> Iterator[tuple[int, int, Event]]:
    """Tick, phase and event, track by track."""
    for track in raw.tracks:
        sounding = [one for one in track.events if not isinstance(one[1], Meta)]
        for tick, together in groupby(sounding, itemgetter(0)):
            events = [event for _, event in together]
            released = _releases(events)
            phase = _SETTINGS
            for place, event in enumerate(events):
                if place >= released and _begins(event):
                    phase = _NOTES
                yield tick, _RELEASES if place < released else phase, event


def _releases(events: list[Event]) -> int:
    """How many of a track's events of one tick end with the release of notes begun before."""
    begun: set[tuple[int, int]] = set()
    released = 0
    for place, event in enumerate(events):
        if _begins(event):
            begun.add(_key(event))
        elif _ends(event) and _key(event) not in begun:
            released = place + 1
    return released


def _begins(event: Event) -> bool:
    return isinstance(event, NoteOn) and event.velocity > 0


def _ends(event: Event) -> bool:
    return isinstance(event, NoteOff) or (isinstance(event, NoteOn) and event.velocity == 0)


def _key(event: Event) -> tuple[int, int]:
    if not isinstance(event, NoteOn | NoteOff):
        raise TypeError(f"{event} has no key")
    return event.channel, event.key


def play(
    music: Programme,
    port: Port,
    *,
    loops: int = 1,
    stopped: Callable[[], bool] = lambda: False,
    told: Callable[[float, int], None] = lambda seconds, loop: None,
    clock: Clock | None = None,
) -> bool:
    """Send a programme to a port; returns whether it came to its end.

    Parameters
    ----------
    loops : int
        How often it is played, without a gap.
    stopped : callable
        Asked some twenty times a second whether to stop.
    told : callable
        Called about as often with the seconds from the start of the music, and which loop
        this is, from 1.
    clock : Clock, optional
        The system's monotonic clock where none is given.

    Raises
    ------
    OutputError
        The port fails. Whatever ends it, all that can still be sent to silence it is sent.
    """
    player = _Player(port, clock or SystemClock(), stopped)
    try:
        player.send(music.setup)
        first = player.now() + AHEAD
        for loop in range(loops):
            start = first + loop * music.end
            tell = partial(_tell, told, start, loop + 1)
            if loop:
                player.send(music.setup)
            for moment in music.moments:
                if not player.wait_until(start + moment.seconds, tell):
                    return False
                player.send(moment.events)
            if not player.wait_until(start + music.end, tell):
                return False
        return player.wait_until(first + loops * music.end + TAIL, lambda now: None)
    finally:
        player.silence()


def _tell(told: Callable[[float, int], None], start: float, loop: int, now: float) -> None:
    told(max(now - start, 0.0), loop)


class _Player:
    """Sends and waits, and knows what sounds."""

    def __init__(self, port: Port, clock: Clock, stopped: Callable[[], bool]) -> None:
        self._port = port
        self._clock = clock
        self._stopped = stopped
        self._sounding: Counter[tuple[int, int]] = Counter()
        self._pedals: set[tuple[int, int]] = set()
        self._channels: set[int] = set()

    def now(self) -> float:
        """The clock's time."""
        return self._clock.now()

    def wait_until(self, when: float, tell: Callable[[float], None]) -> bool:
        """Wait; False as soon as a stop is asked for."""
        while True:
            if self._stopped():
                return False
            now = self._clock.now()
            if now >= when:
                return True
            tell(now)
            self._clock.sleep(min(when - now, _SLICE))

    def send(self, events: tuple[Event, ...]) -> None:
        """Send events; a note counts as sounding from before it is sent until it has ended."""
        for event in events:
            self._expect(event)
            self._port.send(event)
            if _ends(event) and self._sounding[_key(event)]:
                self._sounding[_key(event)] -= 1

    def _expect(self, event: Event) -> None:
        if isinstance(event, Sysex | Meta):
            return
        self._channels.add(event.channel)
        if _begins(event):
            self._sounding[_key(event)] += 1
        elif isinstance(event, Control) and event.controller in _PEDALS and event.value:
            self._pedals.add((event.channel, event.controller))

    def silence(self) -> None:
        """Release all that sounds, pedals and bends; go on where one message fails."""
        pending = deque(self._silencing())
        while pending:
            try:
                self._port.send(pending[0])
            except RetuneError:
                pass
            except KeyboardInterrupt:
                # Silence comes first; the message may be sent twice, which does no harm.
                continue
            pending.popleft()

    def _silencing(self) -> Iterator[Event]:
        for (channel, key), count in sorted(self._sounding.items()):
            for _ in range(count):
                yield NoteOff(channel, key)
        for channel in sorted(self._channels):
            held = {pedal for one, pedal in self._pedals if one == channel} | {_SUSTAIN}
            for pedal in sorted(held):
                yield Control(channel, pedal, 0)
            yield Control(channel, _ALL_NOTES_OFF, 0)
            yield Bend(channel, _CENTRE)
