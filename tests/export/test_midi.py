"""The MIDI exporter, decoded by a parser of the tests that shares no code with the project."""

from __future__ import annotations

import math
from dataclasses import replace
from fractions import Fraction
from itertools import pairwise

import pytest

from retune.adapters.midi import Bend, NoteOn, RawTrack, read_midi_file, write_midi_file
from retune.errors import OutputError, WishError
from retune.export.midi import MidiExporter, MidiOptions
from retune.export.midi_channels import Channels
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.export.building import cadence, choir, organ, sung, tuned_score
from tests.export.smf import Smf, Tone, parse, receive, seconds

HALF_STEP = 100.0 * 2 / 8192 / 2
"""Half a bend step at range 2: 0.0122 cents (General MIDI 2, 3.6: 8192 steps each way)."""


def written(tuned: TunedScore, options: MidiOptions | None = None) -> bytes:
    (file,) = MidiExporter().export([Take(tuned)], options or MidiOptions())
    assert file.check is not None
    assert "read back" in file.check(file.data)
    return file.data


def decoded(tuned: TunedScore, options: MidiOptions | None = None) -> tuple[Smf, list[Tone]]:
    smf = parse(written(tuned, options))
    return smf, receive(smf)[0]


def note_of_the_file(tuned: TunedScore, options: MidiOptions | None = None) -> str:
    (file,) = MidiExporter().export([Take(tuned)], options or MidiOptions())
    return file.note


def check_pitches(tuned: TunedScore, smf: Smf, tones: list[Tone], half: float = HALF_STEP) -> None:
    """Every note sounds at its tuned pitch at its onset and at the end of each segment."""
    heard = sorted(tones, key=lambda tone: (tone.on, tone.track, tone.line[0][1]))
    reference = 1200 * math.log2(tuned.policy.reference_hz / 440)

    def wanted(note, segment):  # type: ignore[no-untyped-def]  # local shorthand
        return 100 * note.note.pitch.key + segment.cents + reference

    notes = sorted(
        tuned.notes,
        key=lambda note: (note.note.onset, note.note.part, wanted(note, note.segments[0])),
    )
    assert len(heard) == len(notes)
    for tone, note in zip(heard, notes, strict=True):
        assert tone.on == note.note.onset * smf.division
        assert tone.track == note.note.part + 1
        assert tone.line[0][1] == pytest.approx(wanted(note, note.segments[0]), abs=half)
        for segment in note.segments:
            end = tone.before(int(segment.end * smf.division))
            assert end == pytest.approx(wanted(note, segment), abs=half + 1e-9)


def test_every_note_sounds_at_its_tuned_pitch() -> None:
    tuned = cadence()
    smf, tones = decoded(tuned)
    check_pitches(tuned, smf, tones)


def test_it_is_format_1_with_a_conductor_and_a_track_a_part() -> None:
    smf, tones = decoded(cadence())
    assert smf.format == 1
    assert [track.metas[0][2] for track in smf.tracks[1:]] == [
        b"Soprano",
        b"Alto",
        b"Tenor",
        b"Bass",
    ]
    assert smf.tracks[0].events == []
    assert {tone.channel for tone in tones} == set(range(8))


def test_the_conductor_track_says_what_the_score_says() -> None:
    smf, _ = decoded(cadence())
    metas = smf.tracks[0].metas
    # RP-001: copyright is the first event of the first track and has (C).
    assert metas[0] == (0, 0x02, b"(C) 2031 A. Nyman")
    assert (0, 0x03, b"A Piece") in metas
    # 72 and 36 quarter notes a minute are 833,333 and 1,666,667 microseconds.
    assert [(t, int.from_bytes(d, "big")) for t, k, d in metas if k == 0x51] == [
        (0, 833_333),
        (2880, 1_666_667),
    ]
    # RP-001: 4/4 is 04 02 18 08.
    assert [(t, d.hex()) for t, k, d in metas if k == 0x58] == [(0, "04021808")]
    assert [(t, d.hex()) for t, k, d in metas if k == 0x59] == [(0, "0000")]


def test_seconds_by_the_file_are_seconds_by_the_tempo_map() -> None:
    tuned = cadence()
    smf, tones = decoded(tuned)
    for tone in tones:
        onset = Fraction(tone.on, smf.division)
        # Half a microsecond a quarter note is what FF 51 rounds away.
        assert seconds(smf, tone.on) == pytest.approx(tuned.seconds(onset), abs=8 * 0.5e-6)


def test_set_up_comes_first_and_in_order() -> None:
    smf, _ = decoded(cadence())
    events = [(status, value) for tick, status, value in smf.tracks[1].events if tick == 0]
    # The bytes of RPN 0 at range 2, then null: B0 65 00 64 00 06 02 26 00 65 7F 64 7F (GM2 3.4.1).
    assert [(status, value.hex()) for status, value in events[:11]] == [
        (0xB0, "7900"),
        (0xC0, "35"),
        (0xB0, "0764"),
        (0xB0, "0a30"),
        (0xB0, "6500"),
        (0xB0, "6400"),
        (0xB0, "0602"),
        (0xB0, "2600"),
        (0xB0, "657f"),
        (0xB0, "647f"),
        (0xE0, "4f3b"),
    ]


def test_events_of_one_tick_are_off_bend_lyric_on() -> None:
    smf, _ = decoded(cadence())
    for track in smf.tracks[1:]:
        ranks = {0x8: 0, 0xE: 1, 0x9: 3}
        by_tick: dict[int, list[int]] = {}
        for tick, status, _ in track.order:
            rank = 2 if status == 0xFF05 else ranks.get(status >> 4)
            if tick > 0 and rank is not None:
                by_tick.setdefault(tick, []).append(rank)
        assert all(ranks == sorted(ranks) for ranks in by_tick.values())


def test_no_bend_repeats_the_one_before() -> None:
    tuned = cadence()
    _, bends = receive(parse(written(tuned)))
    last: dict[int, int] = {}
    for bend in bends:
        assert last.get(bend.channel) != bend.value
        last[bend.channel] = bend.value


def test_lyrics_follow_rp_017() -> None:
    # RP-017: a blank ends a word, no engraver's hyphens.
    smf, _ = decoded(cadence())
    assert [d for _, k, d in smf.tracks[1].metas if k == 0x05] == [b"Ma", b"re ", b"ma", b"ris. "]


def test_lyrics_in_any_script_are_utf_8() -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 0), lyric="țară"), sung(0, 1, "C4", (1, 0))])
    smf, _ = decoded(tuned)
    assert [d for _, k, d in smf.tracks[1].metas if k == 0x05] == ["țară ".encode()]


def test_release_tails_are_not_dragged() -> None:
    """With two channels a part, no bend falls within 250 ms after a note-off of its channel."""
    tuned = cadence()
    smf = parse(written(tuned))
    tones, bends = receive(smf)
    for tone in tones:
        assert tone.off is not None
        end = seconds(smf, tone.off)
        for bend in bends:
            if bend.channel == tone.channel and bend.tick >= tone.off:
                assert seconds(smf, bend.tick) - end >= 0.25


def voices(count: int, cents: float = 1.7) -> TunedScore:
    """So many voices, two notes each, all with bends of their own."""
    notes = [
        note
        for part in range(count)
        for note in (
            sung(part, 0, f"C{part % 6 + 1}", (1, cents * (part + 1))),
            sung(part, 1, f"D{part % 6 + 1}", (1, -cents * (part + 1))),
        )
    ]
    return tuned_score(notes, parts=choir(count))


@pytest.mark.parametrize(
    ("parts", "wish", "channels"),
    [
        (4, Channels.AUTO, 8),
        (7, Channels.AUTO, 14),
        (8, Channels.AUTO, 8),
        (15, Channels.AUTO, 15),
        (4, Channels.ONE, 4),
        (4, Channels.TWO, 8),
    ],
)
def test_channels_a_part(parts: int, wish: Channels, channels: int) -> None:
    tuned = voices(parts)
    smf, tones = decoded(tuned, MidiOptions(channels=wish))
    check_pitches(tuned, smf, tones)
    used = {tone.channel for tone in tones}
    assert len(used) == channels
    assert 9 not in used


def test_two_channels_that_do_not_fit_are_refused() -> None:
    with pytest.raises(OutputError, match="two channels a part make 16") as caught:
        written(voices(8), MidiOptions(channels=Channels.TWO))
    assert "midi.channels=two" in caught.value.hint


def test_more_parts_than_channels_share_equal_bends() -> None:
    notes = [
        note
        for part in range(20)
        for note in (
            sung(part, 0, f"C{part % 7 + 1}", (1, 1.7 * (part // 7))),
            sung(part, 1, f"D{part % 7 + 1}", (1, -1.7 * (part // 7)), (1, 3.0 * (part // 7))),
        )
    ]
    tuned = tuned_score(notes, parts=choir(20))
    smf, tones = decoded(tuned)
    check_pitches(tuned, smf, tones)
    assert len({tone.channel for tone in tones}) <= 15
    assert "share the 15" in note_of_the_file(tuned)


def test_shared_channels_never_bend_a_sounding_note_at_its_end() -> None:
    """Tracks have no order at one tick: there, no note may end where another's bend begins."""
    notes = [
        sung(part, onset, f"C{part % 8}", (1, ((part + onset) % 12) * 2.0))
        for part in range(18)
        for onset in range(4)
    ]
    tuned = tuned_score(notes, parts=choir(18))
    tones, bends = receive(parse(written(tuned)))
    ends = {(tone.channel, tone.off) for tone in tones}
    assert not ends & {(bend.channel, bend.tick) for bend in bends}


def test_too_many_different_bends_name_bar_and_beat_and_a_way_out() -> None:
    notes = [sung(part, 4, f"C{part % 8}", (1, 2.0 * part)) for part in range(16)]
    with pytest.raises(OutputError, match="16 notes sound here") as caught:
        written(tuned_score(notes, parts=choir(16)))
    assert caught.value.where.bar == "2"
    assert caught.value.where.beat == "1"
    assert "--accompaniment" in caught.value.hint


def test_unisons_stay_separate() -> None:
    notes = [sung(part, 0, "C4", (2, 0.0)) for part in range(4)]
    tuned = tuned_score(notes)
    _, tones = decoded(tuned)
    assert len({(tone.channel, tone.key) for tone in tones}) == 4


def test_unisons_of_one_part_stay_separate() -> None:
    notes = [sung(0, 0, "C4", (2, 0.0)), sung(0, 1, "C4", (2, 0.0))]
    tuned = tuned_score(notes, parts=[organ(0)])
    smf, tones = decoded(tuned)
    check_pitches(tuned, smf, tones)


def test_chords_of_an_organ_share_one_channel() -> None:
    notes = [
        sung(0, onset, pitch, (1, 0.0)) for onset in (0, 1, 2) for pitch in ("C3", "E4", "G4", "C5")
    ]
    _, tones = decoded(tuned_score(notes, parts=[organ(0)]))
    assert {tone.channel for tone in tones} == {0}


def test_an_unequal_accompaniment_takes_a_channel_a_bend() -> None:
    notes = [sung(0, 0, "C3", (2, 0.0)), sung(0, 0, "E4", (1, -13.7)), sung(0, 1, "G4", (1, -3.4))]
    tuned = tuned_score(notes, parts=[organ(0)])
    smf, tones = decoded(tuned)
    check_pitches(tuned, smf, tones)


def test_programs() -> None:
    notes = [sung(0, 0, "C4", (1, 0.0)), sung(1, 0, "C3", (1, 0.0))]
    tuned = tuned_score(notes, parts=[*choir(1), organ(1)])
    smf, _ = decoded(tuned)
    programs = [v[0] for track in smf.tracks for _, s, v in track.events if s >> 4 == 0xC]
    # 53 is voice oohs and 19 church organ, counting from 0 (General MIDI sound set).
    assert sorted(programs) == [19, 53]


def test_the_reference_pitch_is_in_the_bends() -> None:
    # A4 at 415.3 Hz is a semitone below 440: key 68 with hardly a bend.
    tuned = tuned_score([sung(0, 0, "A4", (1, 0.0))], policy=Policy(reference_hz=415.3047))
    smf, (tone,) = decoded(tuned)
    check_pitches(tuned, smf, [tone])
    assert tone.key == 68
    assert tone.line[0][1] == pytest.approx(6800.0, abs=0.02)


def test_notes_take_the_nearest_key() -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 63.0)), sung(0, 1, "C4", (1, -151.0))])
    _, tones = decoded(tuned)
    assert [tone.key for tone in tones] == [61, 58]
    assert all(abs(tone.line[0][1] - 100 * tone.key) <= 50.1 for tone in tones)


def test_pitches_beyond_the_keys_of_midi_are_refused() -> None:
    with pytest.raises(OutputError, match="beyond the keys"):
        written(tuned_score([sung(0, 0, "A9", (1, 0.0))]))


def test_a_held_note_beyond_the_bend_range_is_refused_with_the_way_out() -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 0.0), (1, 230.0))])
    with pytest.raises(OutputError, match=r"moves \+230\.0 cents") as caught:
        written(tuned)
    assert "midi.bend_range=12" in caught.value.hint
    smf, tones = decoded(tuned, MidiOptions(bend_range=12))
    check_pitches(tuned, smf, tones, 100 * 12 / 8192 / 2)


@pytest.mark.parametrize(
    ("glide", "length", "span"), [(40.0, 2, 0.04), (40.0, "1/20", 0.025), (200.0, 2, 0.2)]
)
def test_a_glide_starts_at_the_change_and_ends_in_time(
    glide: float, length: int | str, span: float
) -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 0.0), (length, -6.0))])
    smf, (tone,) = decoded(tuned, MidiOptions(glide_ms=glide))
    moves = [(seconds(smf, tick), cents - 6000) for tick, cents in tone.line if tick > 0]
    assert moves[0][0] == pytest.approx(1.0, abs=1e-9)
    assert moves[-1][0] <= 1.0 + span + 1e-9
    assert moves[-1][0] >= 1.0 + span - 0.004
    assert moves[-1][1] == pytest.approx(-6.0, abs=HALF_STEP)
    pitches = [0.0, *(cents for _, cents in moves)]
    assert pitches == sorted(pitches, reverse=True)
    assert max(a - b for a, b in pairwise(pitches)) <= 1.1


def test_no_glide_is_one_step_at_the_change() -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 0.0), (1, -6.0))])
    smf, (tone,) = decoded(tuned, MidiOptions(glide_ms=0))
    assert [tick for tick, _ in tone.line] == [0, smf.division]


@pytest.mark.parametrize(
    ("time", "division"),
    [("1/3", 480), ("1/64", 960), ("1/7", 3360), ("1/11", 5280), ("1/27720", 27720)],
)
def test_ticks_hold_every_onset_exactly(time: str, division: int) -> None:
    tuned = tuned_score([sung(0, 0, "C4", (time, 0.0)), sung(0, time, "D4", (1, 0.0))])
    smf, tones = decoded(tuned)
    assert smf.division == division
    check_pitches(tuned, smf, tones)


def test_what_no_division_holds_is_told() -> None:
    tuned = tuned_score([sung(0, 0, "C4", ("1/101", 0.0)), sung(0, "1/997", "D4", (1, 0.0))])
    assert "onsets within" in note_of_the_file(tuned)
    smf, tones = decoded(tuned)
    assert abs(Fraction(tones[1].on, smf.division) - Fraction(1, 997)) <= Fraction(1, 60480)


def test_a_pick_up_is_a_bar_of_its_own_length() -> None:
    tuned = cadence()
    first = replace(tuned.score.bars[0], duration=Fraction(1), begins=Fraction(3))
    second = replace(tuned.score.bars[1], onset=Fraction(1))
    tuned = replace(tuned, score=replace(tuned.score, bars=(first, second)))
    smf, _ = decoded(tuned)
    assert [(t, d.hex()) for t, k, d in smf.tracks[0].metas if k == 0x58] == [
        (0, "01021808"),
        (480, "04021808"),
    ]


def test_compound_metre_clicks_in_dotted_quarters() -> None:
    smf, _ = decoded(tuned_score([sung(0, 0, "C4", (3, 0.0))], metre=(6, 8)))
    # RP-001: 6/8 is 06 03 24 08.
    assert [d.hex() for _, k, d in smf.tracks[0].metas if k == 0x58] == ["06032408"]


@pytest.mark.parametrize(
    ("metre", "duration", "bytes_"),
    [
        # FF 58: beats, power of two, clocks a click, 8 (RP-001).
        ((3, 4), Fraction(3), "03021808"),
        ((2, 2), Fraction(4), "02013008"),
        ((9, 8), Fraction(9, 2), "09032408"),
        ((4, 4), Fraction(7, 2), "07030c08"),
        ((4, 6), Fraction(3), "03021808"),
        ((4, 4), Fraction(5, 7), "04021808"),
    ],
)
def test_time_signatures_are_as_long_as_the_bar(
    metre: tuple[int, int], duration: Fraction, bytes_: str
) -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 0.0))])
    bar = replace(tuned.score.bars[0], metre=metre, duration=duration)
    smf, _ = decoded(replace(tuned, score=replace(tuned.score, bars=(bar,))))
    assert [d.hex() for _, k, d in smf.tracks[0].metas if k == 0x58] == [bytes_]


def test_a_tempo_too_slow_for_midi_is_told() -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 0.0))], tempo=((0, 2),))
    assert "slowest there is" in note_of_the_file(tuned)
    smf, _ = decoded(tuned)
    # FF 51 holds 24 bits.
    assert [d.hex() for _, k, d in smf.tracks[0].metas if k == 0x51] == ["ffffff"]


def test_rehearsal_marks_are_markers() -> None:
    tuned = cadence()
    marked = (tuned.score.bars[0], replace(tuned.score.bars[1], rehearsal="B", key=(-3, "minor")))
    smf, _ = decoded(replace(tuned, score=replace(tuned.score, bars=marked)))
    assert (1920, 0x06, b"B") in smf.tracks[0].metas
    # Three flats, minor: FF 59 02 FD 01 (RP-001: signed byte, 1 for minor).
    assert (1920, 0x59, bytes.fromhex("fd01")) in smf.tracks[0].metas


def test_equal_part_names_are_numbered() -> None:
    notes = [sung(part, 0, "C4", (1, 0.0)) for part in range(2)]
    smf, _ = decoded(tuned_score(notes, parts=["Alto", "Alto"]))
    assert [track.metas[0][2] for track in smf.tracks[1:]] == [b"Alto", b"Alto 2"]


def test_file_names() -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 0.0))], stem="bwv6.6")
    takes = [Take(tuned), Take(tuned, "Alto predominant", "Alto"), Take(tuned, "a/b", "..")]
    assert [file.name for file in MidiExporter().export(takes, MidiOptions())] == [
        "midi/Full mix - bwv6.6.mid",
        "midi/Alto/Alto predominant - bwv6.6.mid",
        "midi/untitled/a-b - bwv6.6.mid",
    ]


def test_options_out_of_range_are_refused() -> None:
    for options in (MidiOptions(bend_range=0), MidiOptions(glide_ms=-1), MidiOptions(program=128)):
        with pytest.raises(WishError, match="cannot be"):
            list(MidiExporter().export([Take(cadence())], options))


def test_a_score_without_notes_is_refused() -> None:
    with pytest.raises(OutputError, match="no note"):
        written(tuned_score([]))


def damaged(change: str) -> bytes:
    """The cadence with one event changed."""
    raw = read_midi_file(written(cadence()))
    track = list(raw.tracks[1].events)
    place = next(i for i, (tick, e) in enumerate(track) if tick and isinstance(e, Bend))
    note = next(i for i, (tick, e) in enumerate(track) if tick and isinstance(e, NoteOn))
    tick, bend = track[place]
    if change == "bend":
        track[place] = (tick, Bend(bend.channel, bend.value + 2))
    elif change == "key":
        tick, on = track[note]
        track[note] = (tick, NoteOn(on.channel, on.key + 1, on.velocity))
    elif change == "missing":
        del track[note]
    elif change == "late":
        track[note] = (track[note][0] + 1, track[note][1])
    else:
        del track[-1]
    tracks = (raw.tracks[0], RawTrack(tuple(track), raw.tracks[1].end), *raw.tracks[2:])
    return write_midi_file(replace(raw, tracks=tracks))


@pytest.mark.parametrize("change", ["bend", "key", "missing", "late", "hanging"])
def test_the_check_finds_a_wrong_file(change: str) -> None:
    (file,) = MidiExporter().export([Take(cadence())], MidiOptions())
    assert file.check is not None
    with pytest.raises(OutputError):
        file.check(damaged(change))


def test_a_file_for_each_part_on_one_channel() -> None:
    piece = tuned_score(
        [
            sung(0, 0, "E4", (1, -13.686)),
            sung(0, 1, "F4", (1, 15.6)),
            sung(1, 0, "C4", (2, 0.0)),
        ],
        parts=["Alto", "Tenor"],
    )
    full, alto, tenor = MidiExporter().export([Take(piece)], MidiOptions(parts=True))
    assert [file.name for file in (full, alto, tenor)] == [
        "midi/Full mix - piece.mid",
        "midi/Alto - piece.mid",
        "midi/Tenor - piece.mid",
    ]
    for file, notes in ((alto, 2), (tenor, 1)):
        assert file.check is not None
        file.check(file.data)
        raw = read_midi_file(file.data)
        pressed = [e for t in raw.tracks for _, e in t.events if isinstance(e, NoteOn)]
        assert len(pressed) == notes
        assert {e.channel for e in pressed} == {0}
