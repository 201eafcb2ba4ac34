"""Standard MIDI Files, byte for byte, against RP-001 and against music21's reader."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from music21 import midi as other

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
    read_midi_file,
    text_of,
    write_midi_file,
)
from retune.errors import LimitError, OutputError, RetuneError, UnreadableError
from retune.limits import Limits

HEADER = bytes.fromhex("4d546864 00000006 0001 0001 01e0")


def chunk(name: bytes, body: bytes) -> bytes:
    return name + len(body).to_bytes(4) + body


def file_of(track: str, header: bytes = HEADER) -> bytes:
    """A file of one track, its body given in hex; the end of track is added."""
    return header + chunk(b"MTrk", bytes.fromhex(track + "00ff2f00"))


def events_of(track: str) -> list[tuple[int, Event]]:
    return list(read_midi_file(file_of(track)).tracks[0].events)


# --- reading ----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("quantity", "ticks"),
    [  # RP-001, the table of variable-length quantities.
        ("00", 0x00),
        ("40", 0x40),
        ("7f", 0x7F),
        ("8100", 0x80),
        ("c000", 0x2000),
        ("ff7f", 0x3FFF),
        ("818000", 0x4000),
        ("c08000", 0x100000),
        ("ffff7f", 0x1FFFFF),
        ("81808000", 0x200000),
        ("c0808000", 0x8000000),
        ("ffffff7f", 0xFFFFFFF),
    ],
)
def test_variable_length_quantities(quantity: str, ticks: int) -> None:
    assert events_of(quantity + "903c40") == [(ticks, NoteOn(0, 60, 64))]
    raw = RawMidi(1, 480, (RawTrack(((ticks, NoteOn(0, 60, 64)),)),))
    assert bytes.fromhex(quantity + "903c40") in write_midi_file(raw)


def test_running_status_lasts_over_delta_times() -> None:
    assert events_of("00923c40 60 3c00 00 4040") == [
        (0, NoteOn(2, 60, 64)),
        (0x60, NoteOn(2, 60, 0)),
        (0x60, NoteOn(2, 64, 64)),
    ]


def test_a_system_exclusive_message_counts_its_end() -> None:
    # RP-001's own example: F0 43 12 00 07 F7 is stored as F0 05 43 12 00 07 F7.
    message = Sysex(bytes.fromhex("43120007"))
    assert events_of("00f00543120007f7") == [(0, message)]
    raw = RawMidi(0, 96, (RawTrack(((0, message),)),))
    assert bytes.fromhex("f00543120007f7") in write_midi_file(raw)


def test_packets_of_a_split_message_are_joined() -> None:
    # RP-001's example of a message in three packets (from memory).
    body = "00f0034312 00 8148f706431200431200 64f70443120 0f7".replace(" ", "")
    assert events_of(body) == [(300, Sysex(bytes.fromhex("431200431200431200431200")))]


def test_an_unknown_meta_event_takes_its_time() -> None:
    # A program name (FF 08, RP-019), and a type no standard knows.
    assert events_of("60ff0803616263 60ff550100 60903c40")[-1] == (0x120, NoteOn(0, 60, 64))


def test_chunks_and_header_bytes_of_the_future_are_skipped() -> None:
    header = bytes.fromhex("4d546864 00000008 0001 0001 01e0 ffff") + chunk(b"XFIH", b"\1\2\3")
    assert read_midi_file(file_of("00c503", header)).tracks[0].events == ((0, Program(5, 3)),)


def test_smpte_division_is_a_negative_frame_rate() -> None:
    header = HEADER[:-2] + bytes.fromhex("e728")  # -25 frames, 40 ticks: RP-001
    raw = read_midi_file(file_of("", header))
    assert raw.division == SmpteDivision(25, 40)
    assert read_midi_file(write_midi_file(raw)) == raw


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (b"", "not a MIDI file"),
        (b"RIFF....", "not a MIDI file"),
        (HEADER[:12], "cut short"),
        (HEADER, "announces 1 tracks"),
        (file_of("00903c40")[:-3], "cut short"),
        (HEADER + chunk(b"MTrk", bytes.fromhex("00903c")), "middle of an event"),
        (HEADER + chunk(b"MTrk", bytes.fromhex("00ff0320")), "middle of an event"),
        (file_of("003c40"), "belong to no event"),
        (file_of("00903c90"), "above 127"),
        (file_of("00f4"), "F4"),
        (file_of("8180808000903c40"), "four bytes"),
        (file_of("", HEADER[:-2] + b"\0\0"), "no ticks"),
        (file_of("", HEADER[:8] + b"\0\7" + HEADER[10:]), "format 7"),
    ],
)
def test_a_broken_file_says_what_is_wrong(data: bytes, words: str) -> None:
    with pytest.raises(UnreadableError, match=words):
        read_midi_file(data)


def test_limits_hold() -> None:
    data = file_of("00903c40 013c00 013c40 013c00")
    assert len(read_midi_file(data, Limits(max_notes=2)).tracks[0].events) == 4
    for limits in (Limits(max_notes=1), Limits(max_bytes=30)):
        with pytest.raises(LimitError):
            read_midi_file(data, limits)
    with pytest.raises(LimitError):
        read_midi_file(file_of("00b00740" * 20), Limits(max_notes=2))


@pytest.mark.parametrize("encoding", ["utf-8", "latin-1", "utf-8-sig"])
def test_text_is_utf8_else_latin1(encoding: str) -> None:
    assert text_of("Ténor 2".encode(encoding) + b"\0") == "Ténor 2"


# --- writing ----------------------------------------------------------------------------------

EVERY_EVENT: tuple[tuple[int, Event], ...] = (
    (0, Meta(MetaType.TRACK_NAME, "Älto".encode())),
    (0, Control(3, 101, 0)),
    (0, Program(3, 53)),
    (0, Bend(3, 0)),
    (0, Bend(3, 16383)),
    (0, NoteOn(3, 60, 1)),
    (240, KeyPressure(3, 60, 127)),
    (240, ChannelPressure(3, 64)),
    (240, Sysex(b"\x7d\x01")),
    (480, NoteOff(3, 60, 0)),
    (480, Meta(0x7F, b"\x7dabc")),
)


def test_what_is_written_reads_back() -> None:
    raw = RawMidi(1, 960, (RawTrack((), 0), RawTrack(EVERY_EVENT, 1920)))
    assert read_midi_file(write_midi_file(raw)) == raw


def test_another_reader_finds_the_same_events() -> None:
    file = other.MidiFile()
    file.readstr(write_midi_file(RawMidi(1, 960, (RawTrack(EVERY_EVENT),))))
    now, bends, notes = 0, [], []
    for event in file.tracks[0].events:
        if event.isDeltaTime():
            now += event.time
        elif event.type == other.ChannelVoiceMessages.PITCH_BEND:
            bends.append((event.parameter2 << 7) | event.parameter1)
        elif event.type == other.ChannelVoiceMessages.NOTE_ON:
            notes.append((now, event.channel, event.pitch, event.velocity))
    assert (file.ticksPerQuarterNote, bends) == (960, [0, 16383])
    assert notes == [(0, 4, 60, 1)]


def test_events_of_one_tick_keep_their_order() -> None:
    given = ((5, NoteOn(0, 61, 1)), (0, Bend(0, 8192)), (5, Bend(0, 8193)), (5, NoteOff(0, 61)))
    written = read_midi_file(write_midi_file(RawMidi(1, 480, (RawTrack(given),))))
    assert written.tracks[0].events == (given[1], given[0], given[2], given[3])


@pytest.mark.parametrize(
    "raw",
    [
        RawMidi(1, 480, (RawTrack(((0, NoteOn(16, 60, 1)),)),)),
        RawMidi(1, 480, (RawTrack(((0, NoteOn(0, 128, 1)),)),)),
        RawMidi(1, 480, (RawTrack(((0, Bend(0, 16384)),)),)),
        RawMidi(1, 480, (RawTrack(((-1, Bend(0, 0)),)),)),
        RawMidi(1, 480, (RawTrack(((0, Meta(0x2F)),)),)),
        RawMidi(1, 480, (RawTrack(((1 << 28, Bend(0, 0)),)),)),
        RawMidi(1, 0, (RawTrack(()),)),
        RawMidi(1, 32768, (RawTrack(()),)),
        RawMidi(0, 480, (RawTrack(()), RawTrack(()))),
    ],
)
def test_values_out_of_range_are_refused(raw: RawMidi) -> None:
    with pytest.raises(OutputError):
        write_midi_file(raw)


bytes_7 = st.integers(0, 127)
channels = st.integers(0, 15)
events = st.one_of(
    st.builds(NoteOn, channels, bytes_7, bytes_7),
    st.builds(NoteOff, channels, bytes_7, bytes_7),
    st.builds(KeyPressure, channels, bytes_7, bytes_7),
    st.builds(Control, channels, bytes_7, bytes_7),
    st.builds(Program, channels, bytes_7),
    st.builds(ChannelPressure, channels, bytes_7),
    st.builds(Bend, channels, st.integers(0, 16383)),
    st.builds(Meta, bytes_7.filter(lambda kind: kind != 0x2F), st.binary(max_size=200)),
    st.builds(Sysex, st.lists(bytes_7, max_size=9).map(bytes)),
)


@given(st.lists(st.tuples(st.integers(0, 1 << 24), events), max_size=30), st.integers(1, 32767))
def test_any_events_round_trip(given_events: list[tuple[int, Event]], division: int) -> None:
    in_order = tuple(sorted(given_events, key=lambda item: item[0]))
    raw = RawMidi(1, division, (RawTrack(in_order, 1 << 24),))
    assert read_midi_file(write_midi_file(raw)) == raw


GOOD = write_midi_file(RawMidi(1, 960, (RawTrack(EVERY_EVENT), RawTrack(EVERY_EVENT))))


@given(st.integers(0, len(GOOD) - 1), st.binary(max_size=6), st.integers(0, 6))
def test_damage_never_surprises(place: int, put: bytes, removed: int) -> None:
    damaged = GOOD[:place] + put + GOOD[place + removed :]
    try:
        raw = read_midi_file(damaged)
    except RetuneError:
        return
    assert all(tick <= track.end for track in raw.tracks for tick, _ in track.events)
