"""Playing to a port: what arrives, when, in what order; nothing hangs however it ends."""

from __future__ import annotations

import contextlib
import os
import re
import signal
import socket
import subprocess
import sys
import time
from collections import Counter
from collections.abc import Callable, Iterator
from io import BytesIO
from pathlib import Path
from types import ModuleType
from typing import Any, ClassVar

import mido
import mido.sockets
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from retune import pipeline
from retune.adapters.midi import (
    Bend,
    ChannelPressure,
    Control,
    Event,
    KeyPressure,
    Meta,
    MetaType,
    NoteOff,
    NoteOn,
    Program,
    RawMidi,
    RawTrack,
    SmpteDivision,
    Sysex,
)
from retune.adapters.ports import open_port, output_names, wire_bytes
from retune.errors import OutputError, WishError
from retune.play import AHEAD, TAIL, Programme, play, programme, programme_of
from retune.score.options import ReadOptions
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.cli.conftest import FIXTURES, Run


class FakeClock:
    """Time that goes on only while somebody sleeps, who always oversleeps a little."""

    def __init__(self) -> None:
        self.time = 1000.0

    def now(self) -> float:
        return self.time

    def sleep(self, seconds: float) -> None:
        assert seconds > 0
        self.time += seconds + 0.0008


class FakePort:
    """Keeps what it is sent, with the time."""

    name = "fake"

    def __init__(self, clock: FakeClock | None = None) -> None:
        self.clock = clock or FakeClock()
        self.sent: list[tuple[float, Event]] = []

    def send(self, event: Event) -> None:
        self.sent.append((self.clock.time, event))

    def close(self) -> None:
        pass


def tuned(name: str) -> TunedScore:
    path = FIXTURES / name
    return pipeline.retuned(path, str(path), ReadOptions(), Policy())


def played(music: Programme, **wishes: Any) -> list[tuple[float, Event]]:
    """What is sent, in seconds from the start of the music, to the end or the stop."""
    clock = FakeClock()
    port = FakePort(clock)
    start = clock.time + AHEAD
    play(music, port, clock=clock, **wishes)
    return [(moment - start, event) for moment, event in port.sent]


# Status bytes from the MIDI 1.0 message summary (from memory); mido is the referee.
@pytest.mark.parametrize(
    ("event", "wire", "message"),
    [
        (NoteOff(2, 60, 64), "82 3c 40", mido.Message("note_off", channel=2, note=60)),
        (NoteOn(0, 60, 90), "90 3c 5a", mido.Message("note_on", note=60, velocity=90)),
        (KeyPressure(1, 60, 5), "a1 3c 05", mido.Message("polytouch", channel=1, note=60, value=5)),
        (
            Control(15, 123, 0),
            "bf 7b 00",
            mido.Message("control_change", channel=15, control=123, value=0),
        ),
        (Program(3, 53), "c3 35", mido.Message("program_change", channel=3, program=53)),
        (ChannelPressure(3, 9), "d3 09", mido.Message("aftertouch", channel=3, value=9)),
        (Bend(0, 7631), "e0 4f 3b", mido.Message("pitchwheel", pitch=7631 - 8192)),
        (Sysex(b"\x7e\x7f"), "f0 7e 7f f7", mido.Message("sysex", data=[126, 127])),
    ],
)
def test_bytes_on_the_wire(event: Event, wire: str, message: mido.Message) -> None:
    assert wire_bytes(event).hex(" ") == wire
    assert bytes(message.bytes()) == wire_bytes(event)
    assert wire_bytes(Meta(MetaType.LYRIC, b"la")) == b""


@pytest.mark.parametrize("name", ["harbour-hymn.musicxml", "evening-tide.musicxml"])
def test_everything_of_the_midi_file_goes_out_at_its_time(name: str) -> None:
    """mido's own playing of the exported file says when each message is due."""
    score = tuned(name)
    (file,) = pipeline.exported(pipeline.takes_of(score), ["midi"], {})
    due, now = [], 0.0
    for message in mido.MidiFile(file=BytesIO(file.data)):
        now += message.time
        if not message.is_meta:
            due.append((now, bytes(message.bytes())))
    sent = played(programme_of(score))
    silencing = [event for moment, event in sent if moment > now + TAIL / 2]
    music = [(moment, wire_bytes(event)) for moment, event in sent[: len(sent) - len(silencing)]]
    assert Counter(wire for _, wire in music) == Counter(wire for _, wire in due)
    lead = [moment for moment, _ in music if moment < 0]
    assert len(lead) == sum(1 for moment, wire in due if moment == 0 and wire[0] >> 4 != 9)
    by_time = sorted(due, key=lambda item: item[0])
    assert [moment for moment, _ in music[len(lead) :]] == pytest.approx(
        [moment for moment, _ in by_time[len(lead) :]], abs=0.002
    )
    # Channel by channel nothing changes places.
    for channel in range(16):
        own = [wire for _, wire in music if wire[0] & 15 == channel]
        assert own == [wire for _, wire in due if wire[0] & 15 == channel]
    assert {type(event) for event in silencing} == {Control, Bend}


def test_the_notes_of_a_chord_come_after_all_that_tunes_them() -> None:
    on, off, bend = NoteOn(0, 60, 80), NoteOff(0, 60), Bend(0, 9000)
    other_on, other_bend = NoteOn(1, 64, 80), Bend(1, 7000)
    raw = RawMidi(
        1,
        480,
        (
            RawTrack(((0, on), (480, bend), (480, NoteOn(0, 62, 80)), (960, NoteOff(0, 62)))),
            RawTrack(((480, off), (480, other_bend), (480, other_on), (960, NoteOff(1, 64)))),
        ),
    )
    made = programme(raw)
    assert made.moments[1].events == (off, bend, other_bend, NoteOn(0, 62, 80), other_on)
    # 120 quarter notes a minute where a file gives no tempo (RP-001).
    assert [moment.seconds for moment in made.moments] == [0.0, 0.5, 1.0]


def test_a_note_without_length_ends_after_it_begins() -> None:
    on, off = NoteOn(0, 60, 80), NoteOff(0, 60)
    track = RawTrack(((0, on), (10, off), (10, on), (10, off)), 20)
    (first, second) = programme(RawMidi(0, 480, (track,))).moments
    assert (first.events, second.events) == ((on,), (off, on, off))


def test_clocks_of_every_kind() -> None:
    notes = ((0, NoteOn(0, 60, 80)), (1000, NoteOff(0, 60)))
    frames = programme(RawMidi(0, SmpteDivision(25, 40), (RawTrack(notes, 2000),)))
    assert ([m.seconds for m in frames.moments], frames.end) == ([0.0, 1.0], 2.0)
    # 0x0F4240 is a million microseconds a quarter note.
    slow = (0, Meta(MetaType.TEMPO, bytes.fromhex("0f4240")))
    faster = (500, Meta(MetaType.TEMPO, bytes.fromhex("07a120")))
    conductor = RawTrack((slow, faster), 1000)
    changing = programme(RawMidi(1, 500, (conductor, RawTrack(notes, 1000))))
    assert [m.seconds for m in changing.moments] == [0.0, 1.5]
    patterns = programme(RawMidi(2, 500, (RawTrack(notes, 1000), RawTrack(notes, 1000))))
    assert [m.seconds for m in patterns.moments] == [0.0, 1.0, 2.0]


def test_loops_follow_each_other_without_a_gap() -> None:
    track = RawTrack(((0, Bend(0, 9000)), (0, NoteOn(0, 60, 80)), (480, NoteOff(0, 60))), 960)
    seen: list[tuple[float, int]] = []
    sent = played(
        programme(RawMidi(0, 480, (track,))), loops=3, told=lambda s, n: seen.append((s, n))
    )
    ons = [moment for moment, event in sent if isinstance(event, NoteOn)]
    assert ons == pytest.approx([0.0, 1.0, 2.0], abs=0.002)
    assert {loop for _, loop in seen} == {1, 2, 3}
    assert max(seconds for seconds, _ in seen) <= 1.0
    assert len(seen) > 3 * 15


def test_bends_wait_until_the_last_notes_have_died_away() -> None:
    sent = played(programme_of(tuned("harbour-hymn.musicxml")))
    last_off = max(moment for moment, event in sent if isinstance(event, NoteOff))
    centring = [moment for moment, event in sent if event == Bend(0, 8192)][-1]
    assert centring - last_off >= TAIL


# What a receiver makes of it: counted strictly, one note-off for each note-on; by CC 123 alone.


class Receiver:
    """What still sounds, and how channels stand, after a stream of messages."""

    def __init__(self, obeys_all_notes_off: bool) -> None:
        self.obeys = obeys_all_notes_off
        self.notes: Counter[tuple[int, int]] = Counter()
        self.pedals: dict[tuple[int, int], int] = {}
        self.bends: dict[int, int] = {}

    def take(self, wire: bytes) -> None:
        kind, channel = wire[0] >> 4, wire[0] & 15
        if kind == 9 and wire[2]:
            self.notes[channel, wire[1]] += 1
        elif kind in (8, 9) and not self.obeys:
            self.notes[channel, wire[1]] = max(self.notes[channel, wire[1]] - 1, 0)
        elif kind == 11 and wire[1] in (64, 66, 69):
            self.pedals[channel, wire[1]] = wire[2]
        elif kind == 11 and wire[1] == 123 and self.obeys:
            for note in [note for note in self.notes if note[0] == channel]:
                self.notes[note] = 0
        elif kind == 14:
            self.bends[channel] = wire[1] | wire[2] << 7

    def at_rest(self) -> bool:
        return (
            not any(self.notes.values())
            and not any(self.pedals.values())
            and all(bend == 8192 for bend in self.bends.values())
        )


def at_rest(wires: list[bytes]) -> bool:
    for obeys in (False, True):
        receiver = Receiver(obeys)
        for wire in wires:
            receiver.take(wire)
        if not receiver.at_rest():
            return False
    return True


class Breaking(FakePort):
    """Raises something at one message, before or after it has gone out."""

    def __init__(self, at: int, error: BaseException, delivered: bool, clock: FakeClock) -> None:
        super().__init__(clock)
        self.at, self.error, self.delivered, self.count = at, error, delivered, 0

    def send(self, event: Event) -> None:
        self.count += 1
        breaks = self.count == self.at
        if not breaks or self.delivered:
            super().send(event)
        if breaks:
            raise self.error


CHANNELS, KEYS = st.integers(0, 2), st.integers(60, 62)
EVENTS = st.one_of(
    st.builds(NoteOn, CHANNELS, KEYS, st.sampled_from([0, 1, 100])),
    st.builds(NoteOff, CHANNELS, KEYS),
    st.builds(Bend, CHANNELS, st.integers(0, 16383)),
    st.builds(Control, CHANNELS, st.sampled_from([1, 64, 66, 69]), st.sampled_from([0, 127])),
    st.builds(Sysex, st.just(b"\x01")),
)
TRACKS = st.lists(st.tuples(st.integers(0, 6), EVENTS), max_size=20).map(
    lambda events: RawTrack(tuple(sorted(events, key=lambda item: item[0])), 8)
)


@settings(deadline=None, max_examples=200)
@given(
    st.lists(TRACKS, min_size=1, max_size=3),
    st.integers(1, 90),
    st.sampled_from([KeyboardInterrupt(), OutputError("fails once")]),
    st.booleans(),
    st.integers(1, 2),
)
def test_nothing_hangs_whatever_the_moment_of_the_stop(
    tracks: list[RawTrack], at: int, error: BaseException, delivered: bool, loops: int
) -> None:
    clock, music = FakeClock(), programme(RawMidi(1, 1, tuple(tracks)))
    if isinstance(error, OutputError):
        # While it is being silenced, a port that refuses a message loses it.
        events = len(music.setup) + sum(len(moment.events) for moment in music.moments)
        assume(at <= events * loops)
    port = Breaking(at, error, delivered, clock)
    with contextlib.suppress(KeyboardInterrupt, OutputError):
        play(music, port, clock=clock, loops=loops)
    assert at_rest([wire_bytes(event) for _, event in port.sent])


@settings(deadline=None, max_examples=200)
@given(st.lists(TRACKS, min_size=1, max_size=2), st.floats(0.0, 5.0))
def test_nothing_hangs_after_a_stop_at_any_time(tracks: list[RawTrack], when: float) -> None:
    clock = FakeClock()
    port, start = FakePort(clock), clock.time
    ended = play(
        programme(RawMidi(1, 1, tuple(tracks))),
        port,
        clock=clock,
        stopped=lambda: clock.time - start >= when,
    )
    assert ended == (clock.time - start < when)
    assert at_rest([wire_bytes(event) for _, event in port.sent])


def test_a_stop_is_noticed_within_a_tenth_of_a_second() -> None:
    music = programme(RawMidi(0, 1, (RawTrack(((0, NoteOn(0, 60, 80)), (99, NoteOff(0, 60)))),)))
    clock = FakeClock()
    port = FakePort(clock)
    assert not play(music, port, clock=clock, stopped=lambda: clock.time >= 1010.0)
    assert clock.time == pytest.approx(1010.0, abs=0.1)
    assert [event for _, event in port.sent] == [
        NoteOn(0, 60, 80),
        NoteOff(0, 60),
        Control(0, 64, 0),
        Control(0, 123, 0),
        Bend(0, 8192),
    ]


# Ports of the system, as mido has them from a back end.


class FakeOutput:
    """A back end's output port."""

    opened: ClassVar[list[FakeOutput]] = []

    def __init__(self, name: str, **wishes: Any) -> None:
        if "locked" in name:
            raise OSError("device busy")
        self.name, self.sent, self.closed = name, [], False
        FakeOutput.opened.append(self)

    def send(self, message: mido.Message) -> None:
        if "broken" in self.name:
            raise OSError("unplugged")
        self.sent.append(message)

    def close(self) -> None:
        self.closed = True


@pytest.fixture
def ports(monkeypatch: pytest.MonkeyPatch) -> Iterator[list[str]]:
    """A back end with these ports; the list may be changed."""
    names = ["Hall Organ:Hall Organ 128:0", "Hall Strings 129:0", "Sampler", "locked", "broken"]
    module: Any = ModuleType("retune_test_back_end")
    module.Output = FakeOutput
    module.get_devices = lambda **wishes: [
        {"name": name, "is_input": False, "is_output": True} for name in names
    ]
    monkeypatch.setitem(sys.modules, module.__name__, module)
    monkeypatch.setenv("MIDO_BACKEND", module.__name__)
    FakeOutput.opened.clear()
    yield names
    FakeOutput.opened.clear()


def test_ports_are_listed(run: Run, ports: list[str]) -> None:
    done = run("ports")
    assert (done.code, done.out.splitlines(), done.err) == (0, ports, "")
    ports.clear()
    done = run("ports")
    assert (done.code, done.out) == (0, "")
    assert "no MIDI output port" in done.err


@pytest.mark.parametrize(
    ("wish", "found"),
    [
        ("Sampler", "Sampler"),
        ("sampl", "Sampler"),
        ("hall organ", "Hall Organ:Hall Organ 128:0"),
        ("Hall Strings 129:0", "Hall Strings 129:0"),
    ],
)
@pytest.mark.usefixtures("ports")
def test_a_port_is_found_by_its_name_or_a_part_of_it(wish: str, found: str) -> None:
    port = open_port(wish)
    port.send(NoteOn(3, 60, 80))
    port.send(Meta(MetaType.LYRIC, b"la"))
    port.close()
    (opened,) = FakeOutput.opened
    assert (opened.name, port.name, opened.closed) == (found, found, True)
    assert opened.sent == [mido.Message("note_on", channel=3, note=60, velocity=80)]


@pytest.mark.parametrize(
    ("wish", "words"),
    [
        ("Smapler", r"no MIDI port 'Smapler'.*Did you mean 'Sampler'\? There are 'Hall Organ"),
        ("Hal Organ", r"Did you mean 'Hall Organ:Hall Organ 128:0'\?"),
        ("xyz", r"no MIDI port 'xyz'\. There are 'Hall"),
        ("hall", r"several MIDI ports have 'hall'.*Say 'Hall Organ:.*', 'Hall Strings 129:0'"),
        ("", r"no MIDI port ''"),
        ("host:99999", r"1 to 65535"),
    ],
)
@pytest.mark.usefixtures("ports")
def test_an_unknown_port_lists_what_there_is(wish: str, words: str) -> None:
    with pytest.raises(WishError, match=words):
        open_port(wish)


def test_ports_that_fail(ports: list[str]) -> None:
    with pytest.raises(OutputError, match="'locked' cannot be opened: device busy"):
        open_port("locked")
    with pytest.raises(OutputError, match="'broken' fails: unplugged"):
        open_port("broken").send(NoteOn(0, 60, 1))
    ports.clear()
    with pytest.raises(WishError, match="nor any other"):
        open_port("Sampler")


def test_without_a_back_end_it_says_what_to_install(
    run: Run, hymn: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("MIDO_BACKEND", "retune_test_no_such_back_end")
    for arguments in (["ports"], ["play", hymn, "--port", "Sampler"]):
        done = run(*arguments)
        assert done.code == 1
        assert "pip install 'retune-choir[live]'" in " ".join(done.err.split())
    with pytest.raises(OutputError):
        output_names()


@pytest.mark.usefixtures("ports")
def test_a_failing_port_ends_the_command_in_one_line(run: Run, hymn: Path) -> None:
    done = run("play", hymn, "--port", "broken", "-q")
    assert (done.code, done.err) == (1, "Error: the MIDI port 'broken' fails: unplugged\n")


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--port", "Smapler"], "Did you mean 'Sampler'?"),
        (["--port", "Sampler", "--loops", "0"], "--loops"),
        (["--port", "Sampler", "--bars", "900"], "900"),
        (["--port", "Sampler", "--set", "scala.tables=1"], "play sends midi"),
        (["--port", "Sampler", "--set", "midi.chanels=one"], "channels"),
        ([], "--port"),
    ],
)
@pytest.mark.usefixtures("ports")
def test_wrong_usage_is_two(run: Run, hymn: Path, arguments: list[str], words: str) -> None:
    done = run("play", hymn, *arguments)
    assert done.code == 2, done.err
    assert words in " ".join(done.err.split())
    assert all(port.closed and not port.sent for port in FakeOutput.opened)


# Over the network, the real process.


def free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("localhost", 0))
        number: int = probe.getsockname()[1]
        return number


class Listener:
    """A mido port server that a process plays to."""

    def __init__(self, *arguments: object, stderr: int = subprocess.PIPE) -> None:
        number = free_port()
        self.server = mido.sockets.PortServer("localhost", number)
        command = [sys.executable, "-m", "retune", "play", "--port", f"localhost:{number}"]
        self.process = subprocess.Popen([*command, *map(str, arguments)], stderr=stderr)
        self.messages: list[mido.Message] = []
        deadline = time.monotonic() + 60
        self.client = None
        while self.client is None and self.process.poll() is None:
            assert time.monotonic() < deadline
            self.client = self.server.accept(block=False)
            time.sleep(0.01)

    def take(self, enough: Callable[[list[mido.Message]], bool]) -> None:
        """Receive until there is enough, or the other end has closed."""
        assert self.client is not None
        deadline = time.monotonic() + 60
        while not enough(self.messages) and not self.client.closed:
            assert time.monotonic() < deadline
            self.messages += self.client.iter_pending()
            time.sleep(0.001)

    def end(self) -> tuple[int, str]:
        """Receive to the end; exit code and standard error."""
        self.take(lambda _: False)
        _, err = self.process.communicate(timeout=60)
        self.close()
        return self.process.returncode, (err or b"").decode()

    def close(self) -> None:
        if self.client is not None:
            # mido leaves these two open, and with them the connection.
            self.client._rfile.close()
            self.client._wfile.close()
            self.client.close()
        self.server.close()


def note_ons(messages: list[mido.Message]) -> list[mido.Message]:
    return [one for one in messages if one.type == "note_on" and one.velocity]


def test_over_the_network_the_exported_file_arrives(hymn: Path) -> None:
    listener = Listener(hymn, "--bars", "1-1", "--tempo", "400")
    code, err = listener.end()
    assert code == 0, err
    assert "Playing to localhost:" in err
    assert "\r" not in err
    score = pipeline.cut(tuned("harbour-hymn.musicxml"), "1-1")
    (file,) = pipeline.exported(pipeline.takes_of(score), ["midi"], {})
    expected = [m for m in mido.MidiFile(file=BytesIO(file.data)) if not m.is_meta]
    for channel in range(16):
        own = [m.bytes() for m in listener.messages if m.channel == channel]
        due = [m.bytes() for m in expected if m.channel == channel]
        assert own[: len(due)] == due
    assert note_ons(listener.messages)
    assert at_rest([bytes(m.bytes()) for m in listener.messages])


@pytest.mark.parametrize("sign", [signal.SIGINT, signal.SIGTERM])
def test_stopped_in_the_middle_nothing_hangs(hymn: Path, sign: signal.Signals) -> None:
    listener = Listener(hymn)
    listener.take(lambda messages: len(note_ons(messages)) >= 4)
    assert not at_rest([bytes(m.bytes()) for m in listener.messages])
    listener.process.send_signal(sign)
    code, err = listener.end()
    assert code == 130, err
    assert re.search(r"Stopped at bar \d+, beat \d+; all notes released", err)
    assert at_rest([bytes(m.bytes()) for m in listener.messages])
    bends = {m.channel: m.pitch for m in listener.messages if m.type == "pitchwheel"}
    assert len(bends) >= 4
    assert set(bends.values()) == {0}


def test_a_receiver_that_goes_away_is_an_error(hymn: Path) -> None:
    listener = Listener(hymn, "--tempo", "400", "-q")
    listener.take(lambda messages: len(note_ons(messages)) >= 4)
    listener.close()
    _, err = listener.process.communicate(timeout=60)
    assert listener.process.returncode == 1
    assert re.fullmatch(r"Error: localhost:\d+ takes no more MIDI: .*\n(  .*\n)*", err.decode())


def test_nobody_listens(run: Run, hymn: Path) -> None:
    done = run("play", hymn, "--port", f"localhost:{free_port()}")
    assert done.code == 1
    assert "nothing answers at localhost" in done.err


@pytest.mark.skipif(sys.platform == "win32", reason="no pseudo-terminals there")
def test_a_terminal_shows_the_position_in_one_line(hymn: Path) -> None:
    import pty

    ours, theirs = pty.openpty()
    listener = Listener(hymn, "--bars", "1", "--tempo", "400", "--loops", "2", stderr=theirs)
    os.close(theirs)
    code, _ = listener.end()
    text = b""
    with contextlib.suppress(OSError):
        while chunk := os.read(ours, 65536):
            text += chunk
    os.close(ours)
    assert code == 0, text
    shown = [part for part in text.decode().split("\r") if part.startswith("bar ")]
    assert shown[0].startswith("bar 1, beat 1  0:00 of 0:00, 1 of 2")
    assert {part.split()[3] for part in shown} == {"1", "2", "3", "4"}
    assert "2 of 2" in shown[-1]
    # The line is wiped away at the end.
    assert text.decode().endswith("\r") or text.decode().split("\r")[-2].strip() == ""


@pytest.mark.parametrize("name", ["ports", "parts"])
def test_what_one_port_cannot_play_is_refused(name: str) -> None:
    with pytest.raises(WishError, match=rf"midi\.{name}"):
        programme_of(tuned("harbour-hymn.musicxml"), {name: "yes"})
