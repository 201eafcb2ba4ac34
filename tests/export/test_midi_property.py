"""Whatever tuned score comes, the file sounds it, by the parser of the tests."""

from __future__ import annotations

from fractions import Fraction

from hypothesis import given, settings
from hypothesis import strategies as st

from retune.errors import OutputError
from retune.export.midi import MidiExporter, MidiOptions
from retune.export.midi_channels import Channels
from retune.pitch import Pitch, PitchClass
from retune.score.model import Part, PartKind
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.export.building import Sung, tuned_score
from tests.export.smf import parse, receive, seconds
from tests.export.test_midi import check_pitches

LENGTHS = st.sampled_from(["1/12", "1/4", "1/3", "1/2", "1", "3/2", "2", "5/7"]).map(Fraction)
CENTS = st.one_of(
    st.sampled_from([0.0, -13.686286, 1.955001, -31.174094, 49.99, -50.0]),
    st.floats(-60, 60, allow_nan=False),
)
SHIFTS = st.floats(-22, 22, allow_nan=False)


@st.composite
def lines(draw: st.DrawFn, part: int) -> list[Sung]:
    """One voice: notes and rests one after another, some moving while they sound."""
    onset, notes = Fraction(0), []
    for _ in range(draw(st.integers(1, 6))):
        onset += draw(st.sampled_from([Fraction(0), Fraction(0), Fraction(1, 2)]))
        cents, segments = draw(CENTS), []
        for _ in range(draw(st.integers(1, 3))):
            segments.append((draw(LENGTHS), cents, None))
            cents += draw(SHIFTS)
        key = draw(st.integers(36, 84))
        pitch = Pitch.at_key(key, PITCHES[key % 12])
        notes.append(Sung(part, onset, pitch, tuple(segments), draw(st.text(max_size=4))))
        onset += sum(segment[0] for segment in segments)
    return notes


PITCHES = [PitchClass.from_fifths((7 * chroma + 5) % 12 - 5) for chroma in range(12)]


@st.composite
def scores(draw: st.DrawFn) -> TunedScore:
    count = draw(st.integers(1, 9))
    parts = [
        Part(index, f"P{index}", draw(st.sampled_from(PITCHED)), program=draw(PROGRAMS))
        for index in range(count)
    ]
    notes = [note for index in range(count) for note in draw(lines(index))]
    reference = draw(st.sampled_from([440.0, 415.0, 442.0, 466.16]))
    tempo = draw(st.sampled_from([((0, 60),), ((0, 72), (2, 54), ("5/2", 97))]))
    return tuned_score(
        notes, parts=parts, tempo=tempo, policy=Policy(reference_hz=reference), title="T"
    )


PITCHED = [kind for kind in PartKind if kind is not PartKind.CLICK]
PROGRAMS = st.sampled_from([None, 19])


@settings(max_examples=60, deadline=None)
@given(scores(), st.sampled_from(list(Channels)), st.sampled_from([2, 3, 12]))
def test_every_note_sounds_as_tuned(tuned: TunedScore, wish: Channels, bend_range: int) -> None:
    options = MidiOptions(channels=wish, bend_range=bend_range)
    try:
        (file,) = MidiExporter().export([Take(tuned)], options)
    except OutputError as error:
        if wish is Channels.TWO and "two channels a part" in error.what:
            return
        raise
    assert file.check is not None
    file.check(file.data)
    smf = parse(file.data)
    tones, bends = receive(smf)
    check_pitches(tuned, smf, tones, 100 * bend_range / 8192 / 2)
    assert all(bend.channel != 9 for bend in bends)
    # A note moves only in the first 40 ms and the first half of a segment.
    by_place = {(n.note.part + 1, int(n.note.onset * smf.division)): n for n in tuned.notes}
    for tone in tones:
        segments = by_place[tone.track, tone.on].segments[1:]
        spans = [(int(g.onset * smf.division), int(g.end * smf.division)) for g in segments]
        for tick in (tick for tick, _ in tone.line if tick > tone.on):
            start, end = max(span for span in spans if span[0] <= tick)
            gone = seconds(smf, tick) - seconds(smf, start)
            assert gone <= 0.04 + 1e-4
            assert gone <= (seconds(smf, end) - seconds(smf, start)) / 2 + 1e-4


@settings(max_examples=60, deadline=None)
@given(st.integers(1, 7), st.data())
def test_tails_are_dragged_only_where_two_channels_cannot_help(
    count: int, data: st.DataObject
) -> None:
    """Notes of half a second in up to seven legato voices: no tail is bent for 250 ms."""
    notes = [
        Sung(part, Fraction(place), Pitch("C", 0, 4), ((Fraction(1), cents, None),))
        for part in range(count)
        for place, cents in enumerate(data.draw(st.lists(CENTS, min_size=2, max_size=6)))
    ]
    tuned = tuned_score(notes, parts=[f"P{index}" for index in range(count)], tempo=((0, 120),))
    (file,) = MidiExporter().export([Take(tuned)], MidiOptions())
    smf = parse(file.data)
    tones, bends = receive(smf)
    for tone in tones:
        assert tone.off is not None
        later = [b.tick for b in bends if b.channel == tone.channel and b.tick >= tone.off]
        if later:
            assert seconds(smf, min(later)) - seconds(smf, tone.off) >= 0.25
