"""Tuning messages by the MIDI Tuning Updated Specification (handbook, standards.md 4)."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given, settings

from retune.adapters.midi import Control, NoteOn, Sysex, read_midi_file
from retune.errors import OutputError
from retune.export.base import OutputFile
from retune.export.mts import Form, MtsExporter, MtsOptions
from retune.export.mts_words import bulk, frequency_word, octave, single_notes, word_pitch
from retune.tracks.learning import learning_takes
from retune.tracks.options import TrackOptions
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from retune.units import hz_of, ratio_to_cents
from tests.export.building import sung, tuned_score
from tests.export.test_midi_property import scores
from tests.tracks.pieces import NAMES, tuned

JUST = ["1", "16/15", "9/8", "6/5", "5/4", "4/3", "45/32", "3/2", "8/5", "5/3", "16/9", "15/8"]


@pytest.mark.parametrize(
    ("pitch", "word"),
    [
        (0.0, "00 00 00"),
        (60.0, "3C 00 00"),
        (69.0, "45 00 00"),
        (69 - 0.1368629, "44 6E 3E"),
        (64 - 0.1368629, "3F 6E 3E"),
        (67 + 0.0195500, "43 02 40"),
        (69.078514, "45 0A 06"),
        # The carry goes into the key, and 7F 7F 7F is never sent: it says "no change".
        (68.99998, "45 00 00"),
        (128.0, "7F 7F 7E"),
    ],
)
def test_frequency_words(pitch: float, word: str) -> None:
    assert frequency_word(pitch) == bytes.fromhex(word)


@pytest.mark.parametrize(
    ("word", "hz"),
    # The specification prints 8.2104 Hz for 00 00 01, which is an erratum.
    [("000000", 8.175799), ("000001", 8.175828), ("440000", 415.304698), ("7F7F7E", 13289.656616)],
)
def test_words_read_back(word: str, hz: float) -> None:
    assert hz_of(word_pitch(bytes.fromhex(word)), 0.0) == pytest.approx(hz, rel=1e-6)


def test_single_note_message() -> None:
    assert single_notes(0, {69: 69 - 0.1368629}) == bytes.fromhex("7F 7F 08 02 00 01 45 44 6E 3E")


def test_octave_message_for_one_channel() -> None:
    cents = [ratio_to_cents(Fraction(r)) - 100 * n for n, r in enumerate(JUST)]
    body = "40 00 47 41 42 40 4A 01 37 1F 3E 60 39 5F 41 20 48 61 35 7F 3D 40 38 3F"
    for channel, mask in ((0, "00 00 01"), (9, "00 04 00"), (15, "02 00 00")):
        assert octave(channel, cents) == bytes.fromhex(f"7F 7F 08 09 {mask} {body}")


def test_bulk_dump() -> None:
    made = bulk(0, "12-TET", [float(key) for key in range(128)])
    # 408 bytes with F0 and F7; XOR of all bytes from 7E on (the handbook's vector: 63).
    assert len(made) + 2 == 408
    assert made[-1] == 0x63


def written(piece: TunedScore, form: Form = Form.SINGLE) -> OutputFile:
    (file,) = MtsExporter().export([Take(piece)], MtsOptions(form=form))
    assert file.check is not None
    file.check(file.data)
    return file


@pytest.mark.parametrize("form", Form)
@pytest.mark.parametrize("name", NAMES)
def test_every_piece_in_every_form(name: str, form: Form) -> None:
    assert "messages" in written(tuned(name), form).note


def test_a_channel_takes_its_own_tuning_program_before_any_note() -> None:
    for track in read_midi_file(written(tuned("tide-motet")).data).tracks[1:]:
        controls = [(e.controller, e.value) for _, e in track.events if isinstance(e, Control)]
        place = controls.index((100, 3))
        channel = next(e.channel for _, e in track.events if isinstance(e, NoteOn))
        assert controls[place - 1 : place + 2] == [(101, 0), (100, 3), (6, channel)]
        # CC 121 may undo tunings in a common synth: it comes first.
        assert controls[0][0] == 121


def test_equal_tunings_are_not_sent_again() -> None:
    notes = [sung(0, n, "E4", (1, -13.686)) for n in range(8)]
    raw = read_midi_file(written(tuned_score(notes, parts=["Alto"])).data)
    assert sum(isinstance(e, Sysex) for _, e in raw.tracks[1].events) == 1


def test_in_equal_temperament_nothing_is_sent() -> None:
    notes = [sung(0, n, "E4", (1, 0.0)) for n in range(4)]
    raw = read_midi_file(written(tuned_score(notes, parts=["Alto"])).data)
    assert not any(isinstance(e, Sysex) for _, e in raw.tracks[1].events)


def test_the_reference_pitch_is_in_every_word() -> None:
    piece = tuned_score(
        [sung(0, 0, "A4", (1, 0.0))], parts=["Alto"], policy=Policy(reference_hz=442.0)
    )
    raw = read_midi_file(written(piece).data)
    (message,) = [e.data for _, e in raw.tracks[1].events if isinstance(e, Sysex)]
    assert message.endswith(bytes.fromhex("45 45 0A 06"))


def test_a_held_note_moves_while_it_sounds() -> None:
    piece = tuned_score([sung(0, 0, "E4", (2, -13.686), (2, -8.8))], parts=["Alto"])
    raw = read_midi_file(written(piece).data)
    ticks = [tick for tick, e in raw.tracks[1].events if isinstance(e, Sysex)]
    assert isinstance(raw.division, int)
    assert ticks[0] == 0
    assert ticks[1] == 2 * raw.division
    assert max(ticks) <= 2 * raw.division + 0.05 * raw.division


@given(scores())
@settings(max_examples=40)
def test_whatever_is_tuned_is_written_or_refused(piece: TunedScore) -> None:
    refusal = None
    try:
        written(piece)
    except OutputError as error:
        refusal = error
    assert refusal is None or "fault of retune" not in refusal.hint, refusal


def test_learning_tracks_have_their_clicks() -> None:
    for file in MtsExporter().export(
        learning_takes(tuned("evening-tide"), TrackOptions()), MtsOptions()
    ):
        assert file.check is not None
        file.check(file.data)
