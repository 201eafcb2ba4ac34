"""MPE by its specification (M1-100-UM v1.1; handbook, standards.md 3)."""

from __future__ import annotations

import pytest
from hypothesis import given, settings

from retune.adapters.midi import Bend, Control, Meta, NoteOff, NoteOn, Program, read_midi_file
from retune.errors import OutputError, WishError
from retune.export.base import OutputFile
from retune.export.mpe import MpeExporter, MpeOptions
from retune.score.read import read_bytes
from retune.tracks.learning import learning_takes
from retune.tracks.options import TrackOptions
from retune.tracks.take import Strip, Take
from retune.tuning.model import TunedScore
from retune.units import hz_of
from tests.export.building import choir, organ, sung, tuned_score
from tests.export.test_midi_property import scores
from tests.tracks.pieces import NAMES, tuned


def written(piece: TunedScore, **options: int) -> OutputFile:
    (file,) = MpeExporter().export([Take(piece)], MpeOptions(**options))
    assert file.check is not None
    file.check(file.data)
    return file


def events(file: OutputFile) -> list[tuple[int, object]]:
    return list(read_midi_file(file.data).tracks[1].events)


def test_the_configuration_comes_first_and_every_member_gets_its_range() -> None:
    """B0 65 00 64 06 06 0F for fifteen members; then RPN 0 on each (2.1, 2.2.5)."""
    said = [e for _, e in events(written(tuned("harbour-hymn"))) if isinstance(e, Control)]
    plain = [(e.channel, e.controller, e.value) for e in said]
    assert plain[1:4] == [(0, 101, 0), (0, 100, 6), (0, 6, 15)]
    ranges = [e.channel for e in said if e.controller == 6 and e.value == 48]
    assert ranges == list(range(1, 16))


def test_programs_stand_on_the_manager_alone() -> None:
    """Programs on members are prohibited (2.3)."""
    found = [e for _, e in events(written(tuned("lamp-night"))) if isinstance(e, Program)]
    assert [(e.channel, e.program) for e in found] == [(0, 53)]


@pytest.mark.parametrize("name", NAMES)
def test_each_note_has_a_member_for_itself(name: str) -> None:
    sounding: set[int] = set()
    for _, event in events(written(tuned(name))):
        if isinstance(event, NoteOn):
            assert event.channel not in sounding
            assert event.channel > 0
            sounding.add(event.channel)
        elif isinstance(event, NoteOff):
            sounding.discard(event.channel)
    assert not sounding


@pytest.mark.parametrize("name", NAMES)
def test_bends_come_before_their_notes(name: str) -> None:
    piece = tuned(name)
    bend = dict.fromkeys(range(16), 8192)
    heard = []
    for tick, event in events(written(piece)):
        if isinstance(event, Bend):
            bend[event.channel] = event.value
        elif isinstance(event, NoteOn):
            cents = (bend[event.channel] - 8192) * 100 * 48 / 8192
            heard.append((tick, hz_of(event.key, cents)))
    wanted = sorted((one.note.onset, piece.hz(one, one.segments[0])) for one in piece.notes)
    for (_, hz), (_, target) in zip(sorted(heard), wanted, strict=True):
        # Half a step of 0.586 cents.
        assert hz == pytest.approx(target, rel=0.3 / 1200 * 0.6932)


@given(scores())
@settings(max_examples=40, deadline=None)
def test_whatever_is_tuned_is_written_or_refused(piece: TunedScore) -> None:
    refusal = None
    try:
        written(piece)
    except OutputError as error:
        refusal = error
    if refusal is not None:
        assert "reads back wrong" not in refusal.what


def test_more_notes_than_members_are_refused_by_name() -> None:
    piece = tuned_score(
        [sung(0, 0, "C4", (4, 0.0)), sung(1, 0, "E4", (4, -13.686)), sung(2, 0, "G4", (4, 1.955))]
    )
    with pytest.raises(OutputError, match="3 notes sound here") as caught:
        written(piece, members=2)
    assert caught.value.where is not None
    assert (caught.value.where.bar, caught.value.where.beat) == ("1", "1")
    assert written(piece, members=3)


def test_notes_with_equal_bends_share_a_member_where_there_are_too_few() -> None:
    """A.3: of full channels, the one that needs the least change of pitch; here none."""
    chord = ("C3", "G3", "E4", "C5")
    notes = [sung(0, 0, pitch, (2, 0.0), (2, 3.0)) for pitch in chord]
    file = written(tuned_score([*notes, sung(1, 0, "E5", (4, -13.686))]), members=2)
    assert "3 notes share a member" in file.note
    struck = [e.channel for _, e in events(file) if isinstance(e, NoteOn)]
    assert sorted(struck) == [1, 1, 1, 1, 2]


def test_a_note_goes_where_its_key_was_else_where_silence_is_longest() -> None:
    """Appendix A.3."""
    keys = ["C4", "D4", "E4", "C4", "F4"]
    notes = [sung(0, onset, key, (1, 0.0)) for onset, key in enumerate(keys)]
    said = [e for _, e in events(written(tuned_score(notes), members=3))]
    # C4 goes back to its channel, which makes that of D4 the one that is silent longest.
    assert [e.channel for e in said if isinstance(e, NoteOn)] == [1, 2, 3, 1, 2]


def test_levels_of_parts_are_velocities() -> None:
    """A member has no volume of its own. 12 dB less is 10 ** (-12 / 40) of the velocity."""
    piece = tuned_score([sung(0, 0, "E4", (1, 0.0)), sung(1, 0, "C4", (1, 0.0))])
    take = Take(piece, strips=(Strip(), Strip(-12.0, 0.5), None, None))
    (file,) = MpeExporter().export([take], MpeOptions())
    assert file.check is not None
    file.check(file.data)
    struck = {e.key: e.velocity for _, e in events(file) if isinstance(e, NoteOn)}
    assert struck == {64: 80, 60: 40}
    assert "all parts are in the middle" in file.note


def test_parts_with_another_sound_are_named() -> None:
    notes = [sung(0, 0, "E4", (1, 0.0)), sung(1, 0, "C4", (1, 0.0))]
    assert (
        "Organ has that of the voices"
        in written(tuned_score(notes, parts=[*choir(1), organ(1)])).note
    )


def test_words_are_those_of_one_part() -> None:
    notes = [sung(p, 0, "E4", (1, 0.0), lyric=w) for p, w in enumerate(("", "Sea-", "See,"))]
    found = [e for _, e in events(written(tuned_score(notes))) if isinstance(e, Meta)]
    assert [e.data for e in found if e.type == 5] == [b"Sea"]


def test_clicks_have_their_channel_where_it_is_no_member() -> None:
    takes = learning_takes(tuned("evening-tide"), TrackOptions())
    for file in MpeExporter().export(takes, MpeOptions(members=8)):
        assert "click" not in file.note
        assert file.check is not None
        file.check(file.data)
        clicks = [e for _, e in read_midi_file(file.data).tracks[2].events]
        assert {e.channel for e in clicks if isinstance(e, NoteOn)} == {9}


def test_learning_tracks_leave_their_clicks_out_and_say_so() -> None:
    takes = learning_takes(tuned("evening-tide"), TrackOptions())
    files = list(MpeExporter().export(takes, MpeOptions()))
    assert files[1].name == "mpe/Soprano/Soprano predominant - evening-tide.mid"
    assert "without clicks" in files[1].note
    for file in files:
        assert file.check is not None
        file.check(file.data)


def test_members_out_of_range() -> None:
    with pytest.raises(WishError, match=r"mpe\.members"):
        list(MpeExporter().export([Take(tuned("harbour-hymn"))], MpeOptions(members=16)))


def test_a_zone_is_read_as_one_instrument() -> None:
    piece = tuned("lantern-street")
    back = read_bytes(written(piece).data, "zone.mid")
    # One track, split into as many lines as sound at once: four voices.
    assert len(back.parts) == 4
    assert len(back.notes) == len(piece.notes)
