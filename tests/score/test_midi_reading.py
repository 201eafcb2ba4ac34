"""MIDI files as written scores: against scores exported by music21, RP-001 and RP-017."""

from __future__ import annotations

from collections import Counter
from contextlib import suppress
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st
from music21 import converter, corpus
from music21 import midi as other

from retune.adapters.midi import (
    Bend,
    Control,
    Event,
    Meta,
    MetaType,
    NoteOff,
    NoteOn,
    Program,
    RawMidi,
    RawTrack,
    SmpteDivision,
    write_midi_file,
)
from retune.errors import LimitError, RetuneError, UnreadableError, Weight
from retune.limits import Limits
from retune.score.midi import read_midi
from retune.written import MarkKind, WrittenLyric, WrittenNote, WrittenPart, WrittenScore

Timed = tuple[int, Event]
QUARTER = 480
FOUR_FOUR = Meta(MetaType.TIME_SIGNATURE, bytes((4, 2, 24, 8)))


def note(onset: int, length: int, key: int, channel: int = 0, velocity: int = 80) -> list[Timed]:
    return [(onset, NoteOn(channel, key, velocity)), (onset + length, NoteOff(channel, key))]


def read(*tracks: list[Timed], kind: int = 1, division: int | SmpteDivision = 480) -> WrittenScore:
    raw = RawMidi(kind, division, tuple(RawTrack(tuple(track)) for track in tracks))
    return read_midi(write_midi_file(raw))


def sounding(part: WrittenPart) -> list[tuple[Fraction, Fraction, int]]:
    """Onset from the start, duration and key of every note, tied noteheads joined."""
    found: dict[str, tuple[Fraction, Fraction, int]] = {}
    start = Fraction(0)
    for bar in part.bars:
        for one in bar.notes:
            onset, length, _ = found.get(one.source, (start + one.onset, Fraction(0), 0))
            assert one.tie_stop == (one.source in found)
            found[one.source] = (onset, length + one.duration, one.pitch.key)
        start += bar.length
    return sorted(found.values())


def heads(part: WrittenPart) -> list[WrittenNote]:
    return [one for bar in part.bars for one in bar.notes]


def told(score: WrittenScore, weight: Weight) -> str:
    return "\n".join(str(finding) for finding in score.findings if finding.weight is weight)


# --- time -------------------------------------------------------------------------------------


@pytest.mark.parametrize("number", ["bwv66.6", "bwv269", "bwv348", "bwv40.8"])
def test_a_chorale_exported_by_music21_is_read_note_for_note(number: str) -> None:
    path = corpus.getWork(f"bach/{number}")
    source = converter.parse(path, forceSource=True, storePickle=False).expandRepeats()
    data = other.translate.streamToMidiFile(source).writestr()
    score = read_midi(data)
    for part, line in zip(source.parts, score.parts, strict=True):
        wanted = [
            (Fraction(n.offset), Fraction(n.quarterLength), n.pitch.midi)
            for n in part.stripTies().flatten().notes
        ]
        assert sounding(line) == sorted(wanted)
        assert line.name == part.partName


def test_ticks_are_never_rounded() -> None:
    score = read([*note(7, 11, 60), *note(18, 962, 62)], division=960)
    assert sounding(score.parts[0]) == [
        (Fraction(7, 960), Fraction(11, 960), 60),
        (Fraction(18, 960), Fraction(962, 960), 62),
    ]


def test_frames_count_time_at_120_quarters_a_minute() -> None:
    # 25 frames of 40 ticks: 1000 ticks a second, half a second for a quarter note.
    score = read(note(1000, 500, 60), division=SmpteDivision(25, 40))
    assert sounding(score.parts[0]) == [(Fraction(2), Fraction(1), 60)]
    assert "frames" in told(score, Weight.DOUBT)


def test_tempo_is_the_exact_fraction_or_the_standards_default() -> None:
    tempo = Meta(MetaType.TEMPO, (600_001).to_bytes(3))
    score = read([(0, FOUR_FOUR), (960, tempo)], note(0, 1920, 60))
    marks = [mark for mark in score.parts[0].bars[0].marks if mark.kind is MarkKind.TEMPO]
    assert [(m.onset, m.value) for m in marks] == [
        (0, Fraction(120)),  # RP-001: 120 where the file says nothing
        (2, Fraction(60_000_000, 600_001)),
    ]
    assert "no tempo" in told(score, Weight.DOUBT)


# --- bars -------------------------------------------------------------------------------------


def test_notes_are_cut_and_tied_at_bar_lines_and_rests_fill_up() -> None:
    three_four = Meta(MetaType.TIME_SIGNATURE, bytes((3, 2, 24, 8)))
    score = read([(0, three_four)], note(QUARTER, 6 * QUARTER, 60))
    first, second, third = score.parts[0].bars
    assert (first.metre, second.metre) == ((3, 4), None)
    assert [(n.onset, n.duration, n.tie_stop, n.tie_start) for n in heads(score.parts[0])] == [
        (1, 2, False, True),
        (0, 3, True, True),
        (0, 1, True, False),
    ]
    assert len({n.source for n in heads(score.parts[0])}) == 1
    assert [(r.onset, r.duration) for r in (*first.rests, *third.rests)] == [(0, 1), (1, 2)]
    assert [bar.number for bar in score.parts[0].bars] == ["1", "2", "3"]
    assert third.length == 3


def test_a_metre_inside_a_bar_cuts_it_and_says_so() -> None:
    two_four = Meta(MetaType.TIME_SIGNATURE, bytes((2, 2, 24, 8)))
    score = read([(0, FOUR_FOUR), (1440, two_four), (1440, two_four)], note(0, 2400, 60))
    assert [bar.length for bar in score.parts[0].bars] == [3, 2]
    assert "bar 1: a new metre" in told(score, Weight.DOUBT)


def test_the_same_metre_again_changes_nothing() -> None:
    score = read([(0, FOUR_FOUR), (480, FOUR_FOUR), (1920, FOUR_FOUR)], note(0, 3840, 60))
    assert [bar.metre for bar in score.parts[0].bars] == [(4, 4), None]


def test_without_a_metre_the_default_is_told() -> None:
    score = read(note(0, 480, 60))
    assert score.parts[0].bars[0].metre == (4, 4)
    assert "4/4" in told(score, Weight.DOUBT)


def test_keys_spell_and_nonsense_is_left_out() -> None:
    keys = [
        (0, Meta(MetaType.KEY_SIGNATURE, b"\xfc\x01")),
        (1920, Meta(MetaType.KEY_SIGNATURE, b"\x04\x00")),
        (1920, Meta(MetaType.KEY_SIGNATURE, b"\x63\x00")),
    ]
    scale = [n for i, k in enumerate((68, 70, 72, 73) * 2) for n in note(i * 480, 480, k)]
    score = read([(0, FOUR_FOUR), *keys], scale)
    bars = score.parts[0].bars
    assert [bar.key for bar in bars] == [(-4, "minor"), (4, "major")]
    assert [n.pitch.name for n in bars[0].notes] == ["Ab4", "Bb4", "C5", "Db5"]
    assert [n.pitch.name for n in bars[1].notes] == ["G#4", "A#4", "B#4", "C#5"]
    assert "key signature that makes no sense" in told(score, Weight.LOSS)


# --- notes ------------------------------------------------------------------------------------


def test_overlapping_presses_of_one_key_end_first_in_first_out() -> None:
    track: list[Timed] = [
        (0, NoteOn(0, 60, 90)),
        (480, NoteOn(0, 60, 50)),
        (960, NoteOn(0, 60, 0)),
        (1440, NoteOff(0, 60)),
    ]
    score = read(track)
    assert sounding(score.parts[0]) == [(0, 2, 60), (1, 2, 60)]
    assert {n.dynamic for n in heads(score.parts[0])} == {90, 50}


def test_hanging_and_empty_notes_are_told() -> None:
    track: list[Timed] = [*note(0, 1920, 60), (480, NoteOn(0, 64, 80)), *note(960, 0, 67)]
    score = read(track)
    assert sounding(score.parts[0]) == [(0, 4, 60), (1, 3, 64)]
    assert "bar 1, beat 2: notes that nothing releases" in told(score, Weight.DOUBT)
    assert "bar 1, beat 3: notes without length" in told(score, Weight.LOSS)


def test_all_notes_off_releases() -> None:
    track: list[Timed] = [(0, NoteOn(0, 60, 80)), (960, Control(0, 123, 0)), *note(960, 960, 62)]
    assert sounding(read(track).parts[0]) == [(0, 2, 60), (2, 2, 62)]


def test_the_pedal_changes_no_duration() -> None:
    track: list[Timed] = [(0, Control(0, 64, 127)), *note(0, 480, 60), (1920, Control(0, 64, 0))]
    assert sounding(read(track).parts[0]) == [(0, 1, 60)]


def test_equal_notes_are_a_chord_and_unequal_ones_voices() -> None:
    score = read(
        [*note(0, 480, 72), *note(0, 480, 69), *note(0, 960, 48), *note(480, 480, 71)],
    )
    bar = score.parts[0].bars[0]
    assert [(n.pitch.name, n.onset, n.voice) for n in bar.notes] == [
        ("C5", 0, "1"),
        ("A4", 0, "1"),
        ("B4", 1, "1"),
        ("C3", 0, "2"),
    ]
    assert [(r.onset, r.duration, r.voice) for r in bar.rests] == [(2, 2, "1"), (2, 2, "2")]


def test_bends_are_told() -> None:
    score = read([(0, Bend(0, 8192)), (0, Bend(0, 9000)), *note(0, 480, 60)])
    assert "pitch bends are not analysed" in told(score, Weight.NOTE)


# --- parts ------------------------------------------------------------------------------------


def test_a_format_0_file_is_split_by_channel() -> None:
    track = sorted(
        [
            (0, Meta(MetaType.TRACK_NAME, b"Evening Song")),
            (0, Program(1, 53)),
            *note(0, 480, 72),
            *note(0, 480, 72, channel=1),
            *note(0, 480, 38, channel=9),
        ],
        key=lambda item: item[0],
    )
    score = read(track, kind=0)
    assert score.title == "Evening Song"
    assert [(p.id, p.name, p.program) for p in score.parts] == [
        ("track 1 channel 1", "", None),
        ("track 1 channel 2", "", 53),
    ]
    assert [sounding(part) for part in score.parts] == [[(0, 1, 72)], [(0, 1, 72)]]
    assert "rhythm channel (10), which have no pitch, were left out: 1" in told(score, Weight.LOSS)


def test_names_are_those_of_the_tracks_in_any_encoding() -> None:
    def named(name: bytes, *rest: Timed) -> list[Timed]:
        return [(0, Meta(MetaType.TRACK_NAME, name)), *rest]

    score = read(
        named(b"Evening Song", (0, Meta(MetaType.COPYRIGHT, b"(C) nobody"))),
        named("Soprän".encode("latin-1"), *note(0, 480, 72)),
        named("Ténor".encode(), *note(0, 480, 60, 1), *note(480, 480, 55, 2)),
    )
    assert (score.title, score.copyright) == ("Evening Song", "(C) nobody")
    assert [part.name for part in score.parts] == ["Soprän", "Ténor 1", "Ténor 2"]


def test_patterns_of_format_2_follow_each_other() -> None:
    score = read(note(0, 1920, 60), note(0, 480, 62), kind=2)
    assert [sounding(part) for part in score.parts] == [[(0, 4, 60)], [(4, 1, 62)]]
    assert "format 2" in told(score, Weight.DOUBT)


# --- words ------------------------------------------------------------------------------------


def sung(*texts: bytes, notes: int = 5) -> list[tuple[WrittenLyric, ...]]:
    track = [
        timed
        for i in range(notes)
        for timed in (
            *([(i * 480, Meta(MetaType.LYRIC, texts[i]))] if i < len(texts) else []),
            *note(i * 480, 480, 60 + i),
        )
    ]
    return [n.lyrics for n in heads(read(track).parts[0])]


@pytest.mark.parametrize(
    "texts",
    [
        (b"Ev", b"en", b"ing ", b"song"),  # RP-017: a space ends a word
        (b"Ev-", b"en-", b"ing", b"song"),  # hyphens: common practice, no source
        (b"Ev", b"en", b"ing", b" song"),  # the space before: common practice, no source
        (b"Ev", b"en", b"ing\r", b"song\n"),  # RP-017: CR ends a line
    ],
)
def test_syllables_make_words(texts: tuple[bytes, ...]) -> None:
    found = [(lyric.text, lyric.syllabic) for (lyric,) in sung(*texts)[:4]]
    assert found == [("Ev", "begin"), ("en", "middle"), ("ing", "end"), ("song", "single")]


def test_an_empty_lyric_is_a_melisma_and_a_tag_is_not_sung() -> None:
    # RP-017: FF 05 00; RP-026's tags stand in braces (from memory).
    texts = [[lyric.text for lyric in lyrics] for lyrics in sung(b"{@LATIN}", b"A", b"", b"men ")]
    assert texts == [[], ["A"], [], ["men"], []]


def test_lyrics_of_a_track_without_notes_go_to_the_part_they_fit() -> None:
    words: list[Timed] = [(480, Meta(MetaType.LYRIC, b"now ")), (960, Meta(MetaType.LYRIC, b"go "))]
    low = note(0, 1920, 48)
    high = [timed for i in range(4) for timed in note(i * 480, 480, 72)]
    score = read(words, low, high)
    assert not any(n.lyrics for n in heads(score.parts[0]))
    assert [[v.text for v in n.lyrics] for n in heads(score.parts[1])] == [[], ["now"], ["go"], []]


def test_a_syllable_without_a_note_is_told() -> None:
    score = read([*note(0, 960, 60), (480, Meta(MetaType.LYRIC, b"lost "))])
    assert "bar 1, beat 2: the syllable 'lost'" in told(score, Weight.LOSS)


def test_markers_are_rehearsal_marks() -> None:
    score = read([(0, FOUR_FOUR), (2400, Meta(MetaType.MARKER, b" Verse  2 "))], note(0, 3840, 60))
    marks = [(i, m.onset, m.value) for i, b in enumerate(score.parts[0].bars) for m in b.marks[:]]
    assert (1, Fraction(1), "Verse 2") in marks


# --- refusals ---------------------------------------------------------------------------------


@pytest.mark.parametrize("track", [[], note(0, 480, 38, channel=9), note(0, 0, 60)])
def test_a_file_without_pitched_notes_is_refused(track: list[Timed]) -> None:
    with pytest.raises(UnreadableError, match="no notes with a pitch"):
        read(track)


def test_limits_hold_for_time_bars_lines_and_noteheads() -> None:
    tiny = Meta(MetaType.TIME_SIGNATURE, bytes((1, 7, 24, 8)))
    fast = Meta(MetaType.TEMPO, b"\0\0\1")
    long = note(0, 1 << 27, 60)
    dense = [(i, NoteOn(0, 60 + i % 60, 80)) for i in range(200)]
    dense += [(300 + i, NoteOff(0, 60 + i % 60)) for i in range(200)]
    chord = [(0, NoteOn(0, key, 80)) for key in range(100)] + [(1 << 20, NoteOff(0, 0))]
    for tracks, words in (
        ([long], "seconds"),
        ([[(0, tiny), (0, fast)], long], "bars"),
        ([dense], "lines"),
        ([[(0, fast)], chord], "noteheads"),
    ):
        raw = RawMidi(1, 480, tuple(RawTrack(tuple(track)) for track in tracks))
        with pytest.raises(LimitError, match=words):
            read_midi(write_midi_file(raw), Limits(max_notes=10_000))


metas = st.builds(
    Meta,
    st.sampled_from([*MetaType]).filter(lambda kind: kind is not MetaType.END_OF_TRACK),
    st.binary(max_size=8),
)
keys = st.integers(55, 66)
events = st.one_of(
    st.builds(NoteOn, st.sampled_from((0, 1, 9)), keys, st.integers(0, 127)),
    st.builds(NoteOff, st.sampled_from((0, 1, 9)), keys),
    metas,
)
tracks = st.lists(st.tuples(st.integers(0, 4000), events), max_size=25)


@given(st.lists(tracks, min_size=1, max_size=3), st.sampled_from((0, 1, 2)))
def test_any_events_make_a_sound_score_or_a_clear_refusal(
    lists: list[list[Timed]], kind: int
) -> None:
    given_tracks = lists[:1] if kind == 0 else lists
    in_order = [sorted(track, key=lambda item: item[0]) for track in given_tracks]
    try:
        score = read(*in_order, kind=kind)
    except RetuneError:
        return
    presses = Counter(
        event.key
        for track in in_order
        for _, event in track
        if isinstance(event, NoteOn) and event.velocity and event.channel != 9
    )
    found = Counter(key for part in score.parts for _, _, key in sounding(part))
    assert found <= presses
    lengths = {tuple(bar.length for bar in part.bars) for part in score.parts}
    assert len(lengths) == 1
    for part in score.parts:
        for bar in part.bars:
            for voice in {r.voice for r in bar.rests} | {n.voice for n in bar.notes}:
                spans = {(n.onset, n.duration) for n in bar.notes if n.voice == voice}
                spans |= {(r.onset, r.duration) for r in bar.rests if r.voice == voice}
                assert sum(duration for _, duration in spans) == bar.length


@given(st.data())
def test_damaged_files_never_surprise(data: st.DataObject) -> None:
    song = [timed for i in range(6) for timed in note(i * 480, 480, 60 + i)]
    good = write_midi_file(RawMidi(1, 480, (RawTrack(((0, FOUR_FOUR),)), RawTrack(tuple(song)))))
    place = data.draw(st.integers(0, len(good) - 1))
    damaged = good[:place] + data.draw(st.binary(max_size=4)) + good[place + 1 :]
    with suppress(RetuneError):
        read_midi(damaged, Limits(max_notes=20_000))
