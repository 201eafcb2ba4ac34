"""Tuning messages byte by byte (MIDI Tuning Updated Specification; handbook, standards.md 4)."""

from __future__ import annotations

from fractions import Fraction

import pytest

from retune.adapters.midi import Control, Event, NoteOff, NoteOn, RawMidi, RawTrack, Sysex
from retune.errors import OutputError
from retune.export.mts_receiver import heard_by_tuning
from retune.export.mts_words import (
    FRACTION,
    bulk,
    frequency_word,
    octave,
    octave_value,
    single_notes,
    word_value,
)
from retune.units import hz_of, ratio_to_cents

JUST = "1 16/15 9/8 6/5 5/4 4/3 45/32 3/2 8/5 5/3 16/9 15/8"


@pytest.mark.parametrize(
    ("key", "cents", "word"),
    [
        (0, 0.0, "00 00 00"),
        (60, 0.0, "3C 00 00"),
        (69, 0.0, "45 00 00"),
        (69, -13.686286, "44 6E 3E"),
        (64, -13.686286, "3F 6E 3E"),
        (67, 1.955001, "43 02 40"),
        (70, -31.174094, "45 58 0C"),
        (69, 7.8514, "45 0A 06"),
        # The carry goes into the key, and 7F 7F 7F is never sent: it says "no change".
        (69, -0.002, "45 00 00"),
        (127, 99.9999, "7F 7F 7E"),
    ],
)
def test_frequency_words(key: int, cents: float, word: str) -> None:
    """The handbook's own vectors."""
    assert frequency_word(key * FRACTION + word_value(cents)) == bytes.fromhex(word)


@pytest.mark.parametrize(
    ("word", "hz", "near"),
    [
        ("000000", 8.1758, 1e-4),
        # The specification prints 8.2104 here, an erratum.
        ("000001", 8.175828, 1e-6),
        ("010000", 8.6620, 1e-4),
        ("0C0000", 16.3516, 1e-4),
        ("3C0000", 261.6256, 1e-4),
        ("3D0000", 277.1827, 1e-4),
        ("447F7F", 439.9984, 1e-4),
        ("450000", 440.0, 1e-4),
        ("450001", 440.0016, 1e-4),
        # Printed with less precision: good to about 0.01 cents.
        ("780000", 8372.0190, 0.05),
        ("780001", 8372.0630, 0.05),
        ("7F0000", 12543.8800, 0.05),
        ("7F0001", 12543.9200, 0.05),
        ("7F7F7E", 13289.7300, 0.1),
    ],
)
def test_the_published_table(word: str, hz: float, near: float) -> None:
    """Key 1 told this word by a single-note change, as the receiver hears it."""
    change = bytes.fromhex("7F 7F 08 02 00 01 01") + bytes.fromhex(word)
    (note,) = heard(*select(0), Sysex(change), NoteOn(0, 1, 80), NoteOff(0, 1))
    assert hz_of(note, 0.0) == pytest.approx(hz, abs=near)


def test_single_note_message() -> None:
    words = {69: 69 * FRACTION + word_value(-13.686286)}
    assert single_notes(0, words) == bytes.fromhex("7F 7F 08 02 00 01 45 44 6E 3E")


def test_octave_message_for_one_channel() -> None:
    cents = [ratio_to_cents(Fraction(r)) - 100 * n for n, r in enumerate(JUST.split())]
    body = "40 00 47 41 42 40 4A 01 37 1F 3E 60 39 5F 41 20 48 61 35 7F 3D 40 38 3F"
    for channel, mask in ((0, "00 00 01"), (7, "00 01 00"), (9, "00 04 00"), (15, "02 00 00")):
        steps = [octave_value(value) for value in cents]
        assert octave(channel, steps) == bytes.fromhex(f"7F 7F 08 09 {mask} {body}")


@pytest.mark.parametrize(("cents", "word"), [(-100, "00 00"), (0, "40 00"), (100, "7F 7F")])
def test_the_ends_of_an_octave_message(cents: float, word: str) -> None:
    assert octave(0, [octave_value(cents)] * 12)[-2:] == bytes.fromhex(word)


def test_bulk_dump() -> None:
    made = bulk(0, "12-TET", [key * FRACTION for key in range(128)])
    # 408 bytes with F0 and F7; XOR of all bytes from 7E on is 63 hexadecimal.
    assert len(made) + 2 == 408
    assert made[:5] == bytes.fromhex("7E 7F 08 01 00")
    assert made[5:21] == b"12-TET          "
    assert made[-1] == 0x63


def select(program: int) -> list[Event]:
    return [Control(0, 101, 0), Control(0, 100, 3), Control(0, 6, program)]


def heard(*events: Event) -> list[float]:
    """Pitches of the notes, each as it is when it ends."""
    raw = RawMidi(1, 480, (RawTrack(tuple((n, event) for n, event in enumerate(events))),))
    return [note.last for note in heard_by_tuning(raw)]


A4_LOW = Sysex(bytes.fromhex("7F 7F 08 02 05 01 45 44 6E 3E"))
ON, OFF = NoteOn(0, 69, 80), NoteOff(0, 69)


def test_a_channel_hears_the_program_it_selected() -> None:
    low = 69 - 0.13684
    assert heard(*select(5), A4_LOW, ON, OFF) == [pytest.approx(low, abs=1e-4)]
    assert heard(*select(4), A4_LOW, ON, OFF) == [69.0]
    assert heard(A4_LOW, *select(5), ON, OFF) == [pytest.approx(low, abs=1e-4)]


def test_real_time_moves_what_sounds_and_a_dump_does_not() -> None:
    assert heard(*select(5), ON, A4_LOW, OFF) == [pytest.approx(68.86316, abs=1e-4)]
    dump = Sysex(bulk(5, "", [100 + key * FRACTION for key in range(128)]))
    assert heard(*select(5), ON, dump, OFF) == [69.0]


def test_no_change_is_no_change() -> None:
    keep = Sysex(bytes.fromhex("7F 7F 08 02 05 01 45 7F 7F 7F"))
    assert heard(*select(5), A4_LOW, keep, ON, OFF) == [pytest.approx(68.86316, abs=1e-4)]


@pytest.mark.parametrize(
    "message",
    [
        "7F 10 08 02 05 01 45 44 6E 3E",
        "7F 7F 09 02 05 01 45 44 6E 3E",
        # 08 02 exists in real time only, and its length must be exact.
        "7E 7F 08 02 05 01 45 44 6E 3E",
        "7F 7F 08 02 05 02 45 44 6E 3E",
        "7F 7F 08 01 00",
        "7F 7F 08 09 00 00 01 40 00",
        "7F 7F 08 0A 00 00 01",
    ],
)
def test_messages_that_the_specification_does_not_have(message: str) -> None:
    with pytest.raises(OutputError):
        heard(*select(5), Sysex(bytes.fromhex(message)), ON, OFF)


def test_a_dump_with_a_wrong_checksum() -> None:
    made = bulk(5, "", [key * FRACTION for key in range(128)])
    with pytest.raises(OutputError, match="checksum"):
        heard(Sysex(made[:-1] + bytes((made[-1] ^ 1,))))
