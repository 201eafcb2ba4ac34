"""MPE by its specification (M1-100-UM v1.1; handbook, standards.md 3)."""

from __future__ import annotations

import pytest
from hypothesis import given, settings

from retune.adapters.midi import Bend, Control, NoteOff, NoteOn, Program, read_midi_file
from retune.errors import OutputError, WishError
from retune.export.base import OutputFile
from retune.export.mpe import MpeExporter, MpeOptions
from retune.score.read import read_bytes
from retune.tracks.learning import learning_takes
from retune.tracks.options import TrackOptions
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.units import hz_of
from tests.export.building import sung, tuned_score
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
@settings(max_examples=40)
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
    with pytest.raises(OutputError, match="more than 2 notes") as caught:
        written(piece, members=2)
    assert caught.value.where is not None
    assert written(piece, members=3)


def test_learning_tracks_leave_their_clicks_out_and_say_so() -> None:
    takes = learning_takes(tuned("evening-tide"), TrackOptions())
    files = list(MpeExporter().export(takes, MpeOptions()))
    assert files[1].name == "mpe/Soprano/Soprano predominant - evening-tide.mid"
    assert "without click" in files[1].note
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
