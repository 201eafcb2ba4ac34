"""More channels than one MIDI port has, on several (FF 21 01 pp; handbook, standards.md 1)."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from retune.errors import OutputError
from retune.export.base import OutputFile
from retune.export.midi import MidiExporter, MidiOptions
from retune.export.midi_channels import Channels
from retune.score.read import read_bytes
from retune.tracks.learning import learning_takes
from retune.tracks.options import TrackOptions
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from tests.export.building import cadence, choir, organ, sung, tuned_score
from tests.export.smf import Tone, parse, receive
from tests.export.test_midi import check_pitches, voices
from tests.export.test_midi_property import scores


def written(
    piece: TunedScore, channels: Channels = Channels.AUTO, ports: bool = True
) -> OutputFile:
    options = MidiOptions(channels=channels, ports=ports)
    (file,) = MidiExporter().export([Take(piece)], options)
    assert file.check is not None
    file.check(file.data)
    return file


def tones_of(piece: TunedScore, file: OutputFile) -> list[Tone]:
    smf = parse(file.data)
    tones, _ = receive(smf)
    check_pitches(piece, smf, tones)
    return tones


@pytest.mark.parametrize(
    ("count", "wish", "ports", "channels"),
    [
        (15, Channels.AUTO, 1, 15),
        (16, Channels.AUTO, 3, 32),
        (16, Channels.ONE, 2, 16),
        (8, Channels.TWO, 2, 16),
        (40, Channels.ONE, 3, 40),
    ],
)
def test_parts_beyond_15_channels_go_to_further_ports(
    count: int, wish: Channels, ports: int, channels: int
) -> None:
    """Each port has its own 15 channels for pitch: the tenth is for percussion on every one."""
    piece = voices(count)
    file = written(piece, wish)
    used = {tone.channel for tone in tones_of(piece, file)}
    assert len(used) == channels
    assert {channel // 16 for channel in used} == set(range(ports))
    assert 9 not in {channel % 16 for channel in used}
    assert ("not every program reads" in file.note) is (ports > 1)


def test_a_track_names_its_port_once_before_all_else() -> None:
    smf = parse(written(voices(16)).data)
    assert not [kind for _, kind, _ in smf.tracks[0].metas if kind == 0x21]
    for track in smf.tracks[1:]:
        assert [status for _, status, _ in track.order].count(0xFF21) == 1
        first = next(n for n, (_, status, _) in enumerate(track.order) if status < 0xFF00)
        tick, _, port = next(entry for entry in track.order[:first] if entry[1] == 0xFF21)
        assert tick == 0
        assert len(port) == 1


def test_where_one_port_is_enough_nothing_changes() -> None:
    assert written(cadence()).data == written(cadence(), ports=False).data


def test_without_the_option_it_is_named_as_a_way_out() -> None:
    piece = voices(16, cents=2.3)
    with pytest.raises(OutputError) as caught:
        written(piece, ports=False)
    assert "midi.ports=true" in caught.value.hint
    with pytest.raises(OutputError) as caught:
        written(voices(8), Channels.TWO, ports=False)
    assert "midi.ports=true" in caught.value.hint


def test_a_part_that_no_port_holds_is_named() -> None:
    notes = [sung(0, 4, f"C{n % 8}", (1, 2.0 * n)) for n in range(16)]
    with pytest.raises(OutputError, match="this part needs 16 channels") as caught:
        written(tuned_score(notes, parts=[organ(0)]))
    assert caught.value.where is not None
    assert caught.value.where.bar == "2"


def test_parts_without_notes_need_no_port() -> None:
    piece = tuned_score([sung(1, 0, "C4", (1, 0.0))], parts=choir(3))
    written(piece)


def test_it_is_read_back_as_its_parts() -> None:
    piece = voices(16)
    back = read_bytes(written(piece).data, "many.mid")
    assert len(back.parts) == 16
    assert len(back.notes) == len(piece.notes)


def test_learning_tracks_keep_their_clicks_on_the_first_port() -> None:
    takes = learning_takes(voices(16), TrackOptions(click=True))
    for file in MidiExporter().export(takes[:2], MidiOptions(ports=True)):
        assert file.check is not None
        file.check(file.data)
        tones, _ = receive(parse(file.data))
        assert 9 in {tone.channel for tone in tones}
        assert max(tone.channel for tone in tones) > 32


@settings(max_examples=40, deadline=None)
@given(scores(), st.sampled_from(list(Channels)))
def test_every_note_sounds_as_tuned(piece: TunedScore, wish: Channels) -> None:
    tones_of(piece, written(piece, wish))
