"""A MIDI file given back retuned: what goes in comes out, but for channels, bends and set-up.

Order and meaning of events by the Standard MIDI File specification (RP-001) and General MIDI 2.
"""

from __future__ import annotations

from collections import Counter
from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

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
    write_midi_file,
)
from retune.adapters.midi_marker import Lanes, Share, marker_of, range_setup, said_by
from retune.export.base import OutputFile
from retune.export.midi import MidiExporter, MidiOptions, Source
from retune.harmony import analyse
from retune.score.midi.undo import as_before
from retune.score.options import ReadOptions
from retune.score.read import read, read_bytes
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Drift, Policy, Temperament

FIXTURES = Path(__file__).parents[2] / "fixtures"


def tuned_from(data: bytes, policy: Policy | None = None, transpose: int = 0) -> TunedScore:
    score = read_bytes(data, "song.mid", ReadOptions(transpose=transpose))
    return tune(score, analyse(score), policy or Policy())


def exported(tuned: TunedScore, options: MidiOptions | None = None) -> OutputFile:
    (file,) = MidiExporter().export([Take(tuned)], options or MidiOptions())
    assert file.check is not None
    file.check(file.data)
    return file


def returned(raw: RawMidi, policy: Policy | None = None, **options: object) -> RawMidi:
    file = exported(tuned_from(write_midi_file(raw), policy), MidiOptions(**options))  # type: ignore[arg-type]
    assert "given back" in file.note
    return read_midi_file(file.data)


# --- generated files -----------------------------------------------------------------------

TICKS = 96
MAJOR = (0, 2, 4, 5, 7, 9, 11)


@st.composite
def songs(draw: st.DrawFn) -> RawMidi:
    """Files with two or three instruments, their controllers and bends, words and drums."""
    tracks = [
        RawTrack(
            (
                (0, Meta(MetaType.TEMPO, (600_000).to_bytes(3))),
                (0, Meta(MetaType.TIME_SIGNATURE, bytes((4, 2, 24, 8)))),
                (draw(st.integers(1, 900)), Meta(MetaType.MARKER, b"chorus")),
            ),
            1000,
        )
    ]
    for channel in range(draw(st.integers(1, 3))):
        tracks.append(draw(instruments(channel)))
    if draw(st.booleans()):
        tracks.append(RawTrack(((0, NoteOn(9, 38, 90)), (48, NoteOff(9, 38))), 400))
    return RawMidi(1, TICKS, tuple(tracks))


@st.composite
def instruments(draw: st.DrawFn, channel: int) -> RawTrack:
    events: list[tuple[int, Event]] = [
        (0, Meta(MetaType.TRACK_NAME, b"Part")),
        (0, Program(channel, draw(st.integers(0, 127)))),
        (0, Control(channel, 7, draw(st.integers(1, 127)))),
    ]
    if draw(st.booleans()):
        events += [(0, one) for one in range_setup(channel, draw(st.sampled_from((2, 5, 12))))]
    tick, sounding = 0, {}
    for _ in range(draw(st.integers(2, 10))):
        tick += draw(st.sampled_from((0, 24, 48, 96)))
        key = 60 + 12 * draw(st.integers(-1, 1)) + draw(st.sampled_from(MAJOR))
        length = draw(st.sampled_from((24, 96, 192)))
        if sounding.get(key, -1) >= tick:
            continue
        sounding[key] = tick + length
        events += [(tick, NoteOn(channel, key, draw(st.integers(1, 127))))]
        off = draw(st.sampled_from((NoteOff(channel, key, 64), NoteOn(channel, key, 0))))
        events += [(tick + length, off)]
        extra = draw(
            st.sampled_from(
                (
                    None,
                    Control(channel, 11, 80),
                    Control(channel, 64, 127),
                    Control(channel, 121, 0),
                    ChannelPressure(channel, 30),
                    KeyPressure(channel, key, 40),
                    Bend(channel, 9000),
                    Bend(channel, 3000),
                    Sysex(b"\x7d\x01"),
                    Meta(MetaType.LYRIC, b"la "),
                )
            )
        )
        if extra is not None:
            events.append((tick + draw(st.sampled_from((0, 12))), extra))
    events.sort(key=lambda entry: (entry[0], isinstance(entry[1], NoteOn)))
    return RawTrack(tuple(events), events[-1][0] + 10)


def without_bends(track: RawTrack) -> Counter[tuple[int, Event]]:
    """Events with their ticks, but bends and what has to do with the bend range."""
    return Counter(
        (tick, event)
        for tick, event in track.events
        if not isinstance(event, Bend)
        and not (isinstance(event, Control) and event.controller in (6, 38, 100, 101))
    )


def bend_curve(track: RawTrack, channel: int) -> list[tuple[int, float]]:
    """A channel's bend in cents at the end of every tick at which it changes."""
    selected, semitones, cents, found = (127, 127), 2, 0.0, {}
    for tick, event in track.events:
        if isinstance(event, Control) and event.channel == channel:
            if event.controller == 101:
                selected = (event.value, selected[1])
            elif event.controller == 100:
                selected = (selected[0], event.value)
            elif event.controller == 6 and selected == (0, 0):
                semitones = event.value
            elif event.controller == 121:
                cents = 0.0
        elif isinstance(event, Bend) and event.channel == channel:
            cents = (event.value - 8192) * 100 * semitones / 8192
        found[tick] = cents
    return sorted(found.items())


@given(songs())
@settings(max_examples=60)
def test_what_goes_in_comes_out(song: RawMidi) -> None:
    out = returned(song)
    before = as_before(out)
    assert before.division == song.division
    assert len(before.tracks) == len(song.tracks)
    for old, new in zip(song.tracks, before.tracks, strict=True):
        assert without_bends(new) == without_bends(old)
        assert new.end == old.end
        for channel in range(3):
            then = dict(bend_curve(old, channel))
            for tick, cents in bend_curve(new, channel):
                if tick in then and any(isinstance(e, Bend) for _, e in old.events):
                    assert cents == pytest.approx(then[tick], abs=0.2)


@given(songs())
@settings(max_examples=60)
def test_every_note_is_released_where_it_was(song: RawMidi) -> None:
    out = returned(song)
    for old, new in zip(song.tracks, out.tracks, strict=True):
        assert _spans(new, False) == _spans(old, False)
        # On each channel by itself too: nothing hangs.
        assert sum(_spans(new, True).values()) == sum(_spans(old, True).values())


def _spans(track: RawTrack, by_channel: bool) -> Counter[tuple[int, ...]]:
    """(press, release, key) of every note, first in first out."""
    pressed: dict[tuple[int, int], list[int]] = {}
    found: Counter[tuple[int, ...]] = Counter()
    for tick, event in track.events:
        if isinstance(event, NoteOn) and event.velocity:
            place = (event.channel if by_channel else 0, event.key)
            pressed.setdefault(place, []).append(tick)
        elif isinstance(event, NoteOn | NoteOff):
            place = (event.channel if by_channel else 0, event.key)
            if pressed.get(place):
                found[pressed[place].pop(0), tick, event.key] += 1
    return found


@given(songs())
@settings(max_examples=60)
def test_bends_are_the_tuning_and_the_instruments_own(song: RawMidi) -> None:
    data = write_midi_file(song)
    tuned = tuned_from(data)
    out = read_midi_file(exported(tuned).data)
    own = {
        (number, channel): dict(bend_curve(track, channel))
        for number, track in enumerate(song.tracks)
        for channel in range(3)
    }
    wanted = {
        one.note.sources[0]: 100 * (one.note.pitch.key + one.segments[0].cents / 100)
        for one in tuned.notes
    }
    for number, (old, new) in enumerate(zip(song.tracks, out.tracks, strict=True)):
        presses = [p for p, (_, e) in enumerate(old.events) if isinstance(e, NoteOn) and e.velocity]
        channels = {c: dict(bend_curve(new, c)) for c in range(16)}
        heard = [
            (tick, event)
            for tick, event in new.events
            if isinstance(event, NoteOn) and event.velocity
        ]
        for place, (tick, event) in zip(presses, heard, strict=True):
            target = wanted.get(f"{number}.{place}")
            if target is None:
                continue
            original = old.events[place][1]
            assert isinstance(original, NoteOn)
            by_itself = own[number, original.channel].get(tick, 0.0)
            cents = 100 * event.key + channels[event.channel][tick]
            assert cents == pytest.approx(target + by_itself, abs=0.2)


@given(songs())
@settings(max_examples=30)
def test_no_release_is_bent_while_there_are_channels(song: RawMidi) -> None:
    out = returned(song)
    if len({e.channel for t in out.tracks for _, e in t.events if isinstance(e, NoteOn)}) > 11:
        return
    for track in out.tracks:
        released: dict[int, tuple[int, int]] = {}
        bend: dict[int, int] = {}
        bent_by_itself = {
            said.channels
            for _, e in track.events
            if isinstance(said := said_by(e), Lanes) and said.own_range
        }
        if bent_by_itself:
            continue
        sounding: Counter[int] = Counter()
        for tick, event in track.events:
            if isinstance(event, NoteOn) and event.velocity:
                sounding[event.channel] += 1
            elif isinstance(event, NoteOn | NoteOff):
                sounding[event.channel] -= 1
                released[event.channel] = (tick, bend.get(event.channel, 8192))
            elif isinstance(event, Bend):
                bend[event.channel] = event.value
                off = released.get(event.channel)
                if off is not None and not sounding[event.channel]:
                    # A quarter of a second: 40 ticks at 100 quarter notes a minute.
                    assert tick - off[0] > 20 or event.value == off[1]


def test_a_file_retuned_in_equal_temperament_is_the_file() -> None:
    score = read(FIXTURES / "lantern-street.musicxml")
    tuned = tune(score, analyse(score), Policy())
    plain = exported(tuned).data
    once = exported(tuned_from(plain)).data
    again = read_midi_file(exported(tuned_from(once, Policy(temperament=Temperament.EQUAL))).data)
    assert not any(
        isinstance(e, Bend) and e.value != 8192 for t in again.tracks for _, e in t.events
    )
    assert as_before(read_midi_file(once)) == as_before(read_midi_file(plain))


@given(songs())
@settings(max_examples=30)
def test_retuning_twice_is_retuning_once(song: RawMidi) -> None:
    data = write_midi_file(song)
    once = exported(tuned_from(data, Policy(drift=Drift.FOLLOW))).data
    twice = exported(tuned_from(once, Policy(drift=Drift.FOLLOW))).data
    for one, other in zip(read_midi_file(once).tracks, read_midi_file(twice).tracks, strict=True):
        assert _spans(one, True) == _spans(other, True)


def test_a_part_on_two_channels_is_read_as_one() -> None:
    score = read(FIXTURES / "tide-motet.musicxml")
    data = exported(tune(score, analyse(score), Policy())).data
    back = read_bytes(data, "motet.mid")
    assert [part.name for part in back.parts] == [part.name for part in score.parts]
    assert len(back.notes) == len(score.notes)
    sung = [n.lyric for n in score.notes if n.part == 0 and n.lyric]
    assert [n.lyric for n in back.notes if n.part == 0 and n.lyric] == sung


def test_drums_and_words_stay_and_controllers_follow() -> None:
    song = RawMidi(
        1,
        TICKS,
        (
            RawTrack(((0, Meta(MetaType.TEMPO, (500_000).to_bytes(3))),), 0),
            RawTrack(
                (
                    (0, Program(0, 19)),
                    (0, Control(0, 10, 20)),
                    (0, NoteOn(0, 60, 90)),
                    (0, NoteOn(0, 64, 90)),
                    (0, NoteOn(0, 67, 90)),
                    (48, Control(0, 11, 70)),
                    (192, NoteOff(0, 60)),
                    (192, NoteOff(0, 64)),
                    (192, NoteOff(0, 67)),
                ),
                192,
            ),
            RawTrack(((0, NoteOn(9, 36, 99)), (96, NoteOff(9, 36))), 192),
        ),
    )
    out = returned(song)
    assert out.tracks[2] == song.tracks[2]
    used = {e.channel for _, e in out.tracks[1].events if isinstance(e, NoteOn)}
    # A just triad has three bends: the root's, the third's, the fifth's.
    assert len(used) == 3
    for channel in used:
        told = [e for _, e in out.tracks[1].events if getattr(e, "channel", None) == channel]
        assert Program(channel, 19) in told
        assert Control(channel, 10, 20) in told
        assert Control(channel, 11, 70) in told


def test_smpte_and_format_0_keep_their_ticks() -> None:
    notes = tuple(
        entry
        for n, key in enumerate((60, 64, 67))
        for entry in ((10 * n, NoteOn(0, key, 80)), (200, NoteOff(0, key)))
    )
    song = RawMidi(
        0, SmpteDivision(25, 40), (RawTrack(tuple(sorted(notes, key=lambda e: e[0])), 200),)
    )
    out = returned(song)
    assert out.division == song.division
    assert as_before(out).tracks[0].events == song.tracks[0].events


def test_transposed_it_comes_back_transposed() -> None:
    score = read(FIXTURES / "evening-tide.musicxml")
    plain = exported(tune(score, analyse(score), Policy())).data
    up = exported(tuned_from(plain, transpose=2))
    assert "given back" in up.note
    keys = [
        e.key
        for t in as_before(read_midi_file(plain)).tracks
        for _, e in t.events
        if isinstance(e, NoteOn)
    ]
    moved = [
        e.key
        for t in as_before(read_midi_file(up.data)).tracks
        for _, e in t.events
        if isinstance(e, NoteOn)
    ]
    assert moved == [key + 2 for key in keys]


def test_new_writes_it_anew() -> None:
    score = read(FIXTURES / "evening-tide.musicxml")
    plain = exported(tune(score, analyse(score), Policy())).data
    assert "given back" not in exported(tuned_from(plain), MidiOptions(source=Source.NEW)).note


@pytest.mark.parametrize(
    "said", [Lanes((3,)), Lanes((0, 4, 15), 12), Share(2, -13.686), Share(0, 5.0)]
)
def test_markers_say_what_they_were_told(said: Lanes | Share) -> None:
    found = said_by(marker_of(said))
    if isinstance(said, Share):
        assert isinstance(found, Share)
        assert (found.channel, found.cents) == (said.channel, pytest.approx(said.cents, abs=5e-4))
    else:
        assert found == said


@pytest.mark.parametrize(
    "tail", [b"", b"\x01", b"\x01\x00\x63", b"\x02\x00", b"\x03\x00\x00", b"\x01\xff\x00"]
)
def test_damaged_markers_say_nothing(tail: bytes) -> None:
    assert said_by(Meta(0x7F, b"\x7dretune" + tail)) is None
    assert said_by(Meta(0x7F, b"\x7d")) is None


def test_times_are_fractions() -> None:
    tuned = tuned_from(
        write_midi_file(RawMidi(1, 7, (RawTrack(((0, NoteOn(0, 60, 9)), (5, NoteOff(0, 60))), 5),)))
    )
    assert tuned.notes[0].note.duration == Fraction(5, 7)


def test_a_bend_after_a_reset_at_the_same_tick_comes_back() -> None:
    track = RawTrack(
        (
            (0, Bend(0, 9000)),
            (0, NoteOn(0, 60, 80)),
            (24, NoteOff(0, 60)),
            (24, Control(0, 121, 0)),
            (24, Bend(0, 9000)),
            (24, NoteOn(0, 72, 80)),
            (24, NoteOn(0, 62, 80)),
            (48, NoteOff(0, 72)),
            (48, NoteOff(0, 62)),
        ),
        58,
    )
    before = as_before(returned(RawMidi(1, TICKS, (track,))))
    assert bend_curve(before.tracks[0], 0)[-1][1] == pytest.approx(19.73, abs=0.2)
