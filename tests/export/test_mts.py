"""Tuning messages by the MIDI Tuning Updated Specification (handbook, standards.md 4)."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from itertools import pairwise

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from retune.adapters.midi import Control, NoteOn, Sysex, read_midi_file, write_midi_file
from retune.errors import OutputError
from retune.export.base import OutputFile
from retune.export.mts import Form, MtsExporter, MtsOptions
from retune.score.read import read_bytes
from retune.tracks.learning import learning_takes
from retune.tracks.options import TrackOptions
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.export.building import Sung, cadence, choir, organ, sung, tuned_score
from tests.export.smf import parse
from tests.export.test_midi_property import scores
from tests.export.tuning_smf import receive_tuned
from tests.tracks.pieces import NAMES, tuned

HALF = {Form.SINGLE: 50 / 16384, Form.OCTAVE: 50 / 8192, Form.BULK: 50 / 16384}
"""Half a step: 0.0031 and 0.0061 cents."""


def written(piece: TunedScore, form: Form = Form.SINGLE) -> OutputFile:
    (file,) = MtsExporter().export([Take(piece)], MtsOptions(form=form))
    assert file.check is not None
    assert "read back" in file.check(file.data)
    return file


def require_tuned(piece: TunedScore, file: OutputFile, form: Form) -> None:
    """By the tests' own receiver, every note sounds as tuned: at its onset, and at the end of
    each segment where the form can say that."""
    smf = parse(file.data)
    reference = 1200 * math.log2(piece.policy.reference_hz / 440)

    def line(one) -> list[float]:  # type: ignore[no-untyped-def]  # local shorthand
        return [100 * one.note.pitch.key + s.cents + reference for s in one.segments]

    tones = sorted(receive_tuned(smf), key=lambda t: (t.on, t.track, t.line[0][1]))
    notes = sorted(
        piece.notes, key=lambda one: (one.note.onset, one.note.part, line(one)[0], one.note.end)
    )
    assert len(tones) == len(notes)
    for tone, one in zip(tones, notes, strict=True):
        assert (tone.on, tone.track) == (one.note.onset * smf.division, one.note.part + 1)
        assert tone.off is not None
        assert 0 <= one.note.end * smf.division - tone.off <= 1
        assert tone.line[0][1] == pytest.approx(line(one)[0], abs=HALF[form] + 1e-9)
        if form is Form.BULK:
            assert len(tone.line) == 1
            continue
        for segment, wanted in zip(one.segments, line(one), strict=True):
            end = tone.before(int(segment.end * smf.division))
            assert end == pytest.approx(wanted, abs=HALF[form] + 1e-9)


def sysex(file: OutputFile, track: int = 1) -> list[tuple[int, bytes]]:
    events = read_midi_file(file.data).tracks[track].events
    return [(tick, event.data) for tick, event in events if isinstance(event, Sysex)]


@pytest.mark.parametrize("form", Form)
@pytest.mark.parametrize("name", NAMES)
def test_every_piece_in_every_form(name: str, form: Form) -> None:
    require_tuned(tuned(name), written(tuned(name), form), form)


@settings(max_examples=60, deadline=None)
@given(scores(), st.sampled_from(list(Form)))
def test_every_note_sounds_as_tuned(piece: TunedScore, form: Form) -> None:
    try:
        file = written(piece, form)
    except OutputError as error:
        if "reaches 100 cents" in error.what:
            return
        raise
    require_tuned(piece, file, form)


def test_the_bytes_of_a_change_as_they_stand_in_the_file() -> None:
    """The worked example: A4 13.686 cents down in program 0, with the length after F0."""
    file = written(tuned_score([sung(0, 0, "A4", (1, -13.686286))], parts=["Alto"]))
    assert bytes.fromhex("F0 0B 7F 7F 08 02 00 01 45 44 6E 3E F7") in file.data


def test_a_channel_takes_its_own_tuning_program_before_any_note() -> None:
    for track in read_midi_file(written(tuned("tide-motet")).data).tracks[1:]:
        controls = [(e.controller, e.value) for _, e in track.events if isinstance(e, Control)]
        channel = next(e.channel for _, e in track.events if isinstance(e, NoteOn))
        # RPN 3 and then the null RPN. CC 121 may undo tunings in a common synth: it comes first.
        assert controls[0] == (121, 0)
        assert controls[3:] == [(101, 0), (100, 3), (6, channel), (101, 127), (100, 127)]


def test_events_of_one_tick_are_off_tuning_lyric_on() -> None:
    for form in Form:
        for track in parse(written(cadence(), form).data).tracks[1:]:
            ranks = {0x8: 0, 0xF: 1, 0xB: 1, 0x9: 3}
            by_tick: dict[int, list[int]] = {}
            for tick, status, _ in track.order:
                rank = 2 if status == 0xFF05 else ranks.get(status >> 4)
                if tick > 0 and rank is not None:
                    by_tick.setdefault(tick, []).append(rank)
            assert all(found == sorted(found) for found in by_tick.values())


def test_equal_tunings_are_not_sent_again() -> None:
    notes = [sung(0, n, "E4", (1, -13.686)) for n in range(8)]
    assert len(sysex(written(tuned_score(notes, parts=["Alto"])))) == 1


def test_in_equal_temperament_nothing_is_sent() -> None:
    notes = [sung(0, n, "E4", (1, 0.0)) for n in range(4)]
    file = written(tuned_score(notes, parts=["Alto"]))
    assert not sysex(file)
    assert "no message" in file.note


def test_the_keys_of_a_chord_go_into_one_message() -> None:
    notes = [sung(0, 0, pitch, (1, 5.0)) for pitch in ("C3", "E3", "G3", "C4")]
    ((_, message),) = sysex(written(tuned_score(notes, parts=[organ(0)])))
    assert message[5] == 4
    assert message[6::4] == bytes((48, 52, 55, 60))


def test_a_message_holds_127_keys_at_most() -> None:
    """The length is one byte of seven bits."""
    base = sung(0, 0, "C4", (1, 5.0))
    notes = [
        replace(base, pitch=type(base.pitch).parse(f"{name}{octave}"))
        for octave in range(-1, 10)
        for name in ("C", "C#", "D", "D#", "E", "F", "F#", "G", "G#", "A", "A#", "B")
    ][:127]
    notes.append(replace(base, pitch=type(base.pitch).parse("G9"), segments=((1, -5.0, None),)))
    found = sysex(written(tuned_score(notes, parts=[organ(0)])))
    assert [data[5] for _, data in found] == [127, 1]


def test_the_reference_pitch_is_in_every_word() -> None:
    """A4 at 442 Hz is 45 0A 06."""
    policy = Policy(reference_hz=442.0)
    piece = tuned_score([sung(0, 0, "A4", (1, 0.0))], parts=["Alto"], policy=policy)
    ((_, message),) = sysex(written(piece))
    assert message.endswith(bytes.fromhex("45 45 0A 06"))
    # In a dump, keys that never sound stand at the reference pitch too: A3 is 39 0A 06.
    ((_, dump),) = sysex(written(piece, Form.BULK))
    assert dump[21 + 3 * 57 :][:3] == bytes.fromhex("39 0A 06")


def test_a_held_note_moves_while_it_sounds() -> None:
    piece = tuned_score([sung(0, 0, "E4", (2, -13.686), (2, -8.8))], parts=["Alto"])
    for form in (Form.SINGLE, Form.OCTAVE):
        first, *moves = [tick for tick, _ in sysex(written(piece, form))]
        assert first == 0
        assert moves[0] == 960
        # 40 milliseconds, a step in ten of them.
        assert moves[-1] <= 960 + 0.04 * 480
        assert len(moves) == 4
        assert min(b - a for a, b in pairwise(moves)) >= 4


def test_a_dump_leaves_held_notes_where_they_began_and_says_so() -> None:
    piece = tuned_score([sung(0, 0, "E4", (2, -13.686), (2, -8.8))], parts=["Alto"])
    assert "held notes stay where they began, up to 4.9 cents" in written(piece, Form.BULK).note


def test_tables_are_as_many_as_one_key_has_tunings() -> None:
    def line(*cents: float) -> list[Sung]:
        return [sung(0, n, "E4", (1, c)) for n, c in enumerate(cents)]

    file = written(tuned_score(line(-13.7, 2.0, -13.7, 2.0, 7.8, 7.8), parts=["Alto"]), Form.BULK)
    assert "3 tables of 408 bytes at the start; 5 selections" in file.note
    assert [tick for tick, _ in sysex(file)] == [0, 0, 0]


def test_of_more_tables_than_tuning_programs_the_idle_ones_are_sent_anew() -> None:
    """128 programs there are; three parts need 150 tables, some of them together."""
    notes = [
        sung(part, n, "E4", (1, 0.1 * ((n + shift) % 150)))
        for part, shift in enumerate((0, 2, 149))
        for n in range(200)
    ]
    piece = tuned_score(notes)
    file = written(piece, Form.BULK)
    require_tuned(piece, file, Form.BULK)
    assert "128 tables of 408 bytes at the start, " in file.note
    assert max(data[4] for track in (1, 2, 3) for _, data in sysex(file, track)) == 127


def test_one_key_twice_in_one_part_takes_a_second_channel() -> None:
    notes = [sung(0, 0, "C4", (2, 0.0)), sung(0, 1, "C4", (2, 3.0))]
    for form in Form:
        piece = tuned_score(notes, parts=[organ(0)])
        require_tuned(piece, written(piece, form), form)


def test_octaves_apart_fit_one_channel_only_where_they_agree() -> None:
    def channels(cents: float) -> set[int]:
        notes = [sung(0, 0, "C4", (2, 3.0)), sung(0, 1, "C5", (2, cents))]
        piece = tuned_score(notes, parts=[organ(0)])
        file = written(piece, Form.OCTAVE)
        require_tuned(piece, file, Form.OCTAVE)
        return {tone.channel for tone in receive_tuned(parse(file.data))}

    assert channels(3.0) == {0}
    assert channels(5.0) == {0, 1}


def many(count: int, cents: Sequence[float]) -> TunedScore:
    names = ("C", "D", "E", "F", "G", "A", "B")
    notes = [
        sung(part, onset, f"{names[(part + onset) % 7]}{part % 3 + 3}", (1, c * (part + 1)))
        for part in range(count)
        for onset, c in enumerate(cents)
    ]
    return tuned_score(notes, parts=choir(count))


@pytest.mark.parametrize("form", Form)
def test_more_parts_than_channels_share(form: Form) -> None:
    piece = many(20, (1.0, -0.5, 0.7))
    file = written(piece, form)
    require_tuned(piece, file, form)
    assert "want 20 channels and share" in file.note
    tones = receive_tuned(parse(file.data))
    assert 9 not in {tone.channel for tone in tones}
    # Nothing orders tracks: no key may end in one where it is tuned anew in another.
    ends = {(t.channel, t.key, t.off) for t in tones}
    assert not ends & {(t.channel, t.key, t.on) for t in tones}


def test_too_many_unisons_name_bar_and_beat_and_a_way_out() -> None:
    notes = [sung(part, 4, "C4", (1, 0.1 * part)) for part in range(16)]
    with pytest.raises(OutputError, match="15 channels") as caught:
        written(tuned_score(notes, parts=choir(16)))
    assert caught.value.where is not None
    assert (caught.value.where.bar, caught.value.where.beat) == ("2", "1")


def test_beyond_100_cents_an_octave_scale_is_refused() -> None:
    piece = tuned_score([sung(0, 0, "C4", (1, 0.0), (1, 101.0))], parts=["Alto"])
    with pytest.raises(OutputError, match=r"moves \+101.0 cents") as caught:
        written(piece, Form.OCTAVE)
    assert "mts.form=octave" in caught.value.hint
    require_tuned(piece, written(piece), Form.SINGLE)


def test_the_ends_of_the_keys() -> None:
    for pitch, cents in (("C-1", -13.0), ("G9", 0.0)):
        piece = tuned_score([sung(0, 0, pitch, (1, cents))], parts=["Alto"])
        if cents:
            with pytest.raises(OutputError, match="beyond the pitches"):
                written(piece)
        else:
            written(piece)


def test_density_is_that_of_the_busiest_minute() -> None:
    # At 60 quarter notes a minute, one key told a new pitch every second for 90 seconds.
    notes = [sung(0, n, "E4", (1, 5.0 * (n % 2 + 1))) for n in range(90)]
    assert "90 messages, at most 60 in a minute" in written(tuned_score(notes)).note


def test_a_wrong_word_is_found() -> None:
    (file,) = MtsExporter().export([Take(cadence())], MtsOptions())
    raw = read_midi_file(file.data)
    track = raw.tracks[2]
    spoilt = [
        (t, Sysex(e.data[:-1] + bytes((e.data[-1] ^ 4,))) if isinstance(e, Sysex) else e)
        for t, e in track.events
    ]
    tracks = (*raw.tracks[:2], replace(track, events=tuple(spoilt)), *raw.tracks[3:])
    assert file.check is not None
    with pytest.raises(OutputError, match="off its tuned pitch"):
        file.check(write_midi_file(replace(raw, tracks=tracks)))


def test_it_is_read_back_as_its_parts() -> None:
    for form in Form:
        back = read_bytes(written(tuned("tide-motet"), form).data, "motet.mid")
        score = tuned("tide-motet").score
        assert [part.name for part in back.parts] == [part.name for part in score.parts]
        assert len(back.notes) == len(score.notes)


@pytest.mark.parametrize("form", Form)
def test_learning_tracks_have_their_clicks(form: Form) -> None:
    takes = learning_takes(tuned("evening-tide"), TrackOptions())
    for file in MtsExporter().export(takes, MtsOptions(form=form)):
        assert file.check is not None
        file.check(file.data)
