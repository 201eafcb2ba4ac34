"""MusicXML made of scores that came as MIDI, ABC, Humdrum or MEI."""

from __future__ import annotations

from collections import defaultdict
from fractions import Fraction
from pathlib import Path

import music21
import pytest

from retune.adapters.midi import NoteOff, NoteOn, RawMidi, RawTrack, write_midi_file
from retune.errors import OutputError
from retune.export import notation_made
from retune.export.midi import MidiExporter, MidiOptions, Source
from retune.export.notation import NotationExporter, NotationOptions, Parts
from retune.export.notation_made import as_musicxml
from retune.harmony import analyse
from retune.score.read import read_bytes
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.export.musicxml_checks import events_of, fault_of, tree_of
from tests.tracks.pieces import tuned as bundled

PACKAGE = Path(music21.__file__).parent
MEI = b"""<mei xmlns="http://www.music-encoding.org/ns/mei"><music><body><mdiv><score>
<scoreDef meter.count="4" meter.unit="4"><staffGrp>
<staffDef n="1" lines="5" clef.shape="G" clef.line="2" label="Soprano"/>
<staffDef n="2" lines="5" clef.shape="F" clef.line="4" label="Bass"/></staffGrp></scoreDef>
<section><measure n="1">
<staff n="1"><layer n="1"><note pname="e" oct="4" dur="2"/><note pname="g" oct="4" dur="2"/></layer>
</staff><staff n="2"><layer n="1"><note pname="c" oct="3" dur="1"/></layer></staff>
</measure></section></score></mdiv></body></music></mei>"""
ABC = b"""X:1
T:Two lines
M:3/4
L:1/4
K:D
V:1 name="Soprano"
V:2 name="Bass" clef=bass
[V:1] F2 A | (3ABA F E | F3 |]
w: La_ la la_ _ _ la la
[V:2] D,3 | D,2 A,, | D,3 |]
"""
KERN = b"""**kern\t**kern
*Ibass\t*Isoprn
*clefF4\t*clefG2
*M4/4\t*M4/4
=1\t=1
2C\t4.e
.\t8f
2G\t2d
=2\t=2
1C\t[2c
.\t2c]
==\t==
*-\t*-
"""


def of_bytes(data: bytes, name: str) -> TunedScore:
    score = read_bytes(data, name)
    return tune(score, analyse(score), Policy())


def midi_of(name: str) -> bytes:
    files = MidiExporter().export((Take(bundled(name)),), MidiOptions(source=Source.NEW))
    return next(files).data


def full(tuned: TunedScore) -> bytes:
    return next(NotationExporter().export((Take(tuned),), NotationOptions())).data


@pytest.mark.parametrize(
    ("data", "name"), [(MEI, "a.mei"), (ABC, "a.abc"), (KERN, "a.krn")], ids=["mei", "abc", "krn"]
)
def test_what_is_written_reads_as_the_same_music_and_is_valid(data: bytes, name: str) -> None:
    tuned = of_bytes(data, name)
    made = full(tuned)
    assert fault_of(made) == ""
    assert full(tuned) == made
    back = read_bytes(made, "made.musicxml")
    assert [part.name for part in back.parts] == [part.name for part in tuned.score.parts]
    assert [(n.part, n.onset, n.duration, n.pitch, n.lyric) for n in back.notes] == [
        (n.part, n.onset, n.duration, n.pitch, n.lyric) for n in tuned.score.notes
    ]
    assert [(b.onset, b.metre) for b in back.bars] == [(b.onset, b.metre) for b in tuned.score.bars]


def test_a_midi_file_is_written_with_its_words_bars_and_repeats_played_out() -> None:
    tuned = of_bytes(midi_of("regatta-day"), "regatta.mid")
    back = read_bytes(full(tuned), "made.musicxml")
    assert [(n.part, n.onset, n.duration, n.pitch.key, n.lyric) for n in back.notes] == [
        (n.part, n.onset, n.duration, n.pitch.key, n.lyric) for n in tuned.score.notes
    ]
    first = tuned.score.tempo.changes[0].qpm
    assert abs(back.tempo.changes[0].qpm - first) < Fraction(1, 50)


@pytest.mark.parametrize(
    ("data", "name"),
    [(ABC, "a.abc"), (KERN, "a.krn"), (None, "hymn.mid")],
    ids=["abc", "krn", "mid"],
)
def test_the_cents_at_the_notes_are_those_that_were_tuned(data: bytes | None, name: str) -> None:
    tuned = of_bytes(data or midi_of("harbour-hymn"), name)
    events = events_of(tree_of(full(tuned)), [bar.onset for bar in tuned.score.bars])
    wanted = defaultdict(list)
    for one in tuned.notes:
        for segment in one.segments:
            wanted[f"P{one.note.part + 1}", one.note.pitch.key].append(
                (segment.onset, segment.cents)
            )
    for key, segments in wanted.items():
        for onset, cents in segments:
            said = [value for start, value, _ in sorted(events[key]) if start <= onset]
            assert said[-1] == pytest.approx(cents, abs=1e-6)


def test_grace_notes_are_written_before_the_note_they_lead_to() -> None:
    graced = ABC.replace(b"F2 A | (3ABA", b"F2 {GE}A | (3{c}ABA")
    tree = tree_of(full(of_bytes(graced, "a.abc")))
    steps = [
        (note.find("grace") is not None, note.findtext("pitch/step"))
        for note in tree.find("part").iter("note")
    ]
    assert steps[:6] == [
        (False, "F"), (True, "G"), (True, "E"), (False, "A"), (True, "C"), (False, "A"),
    ]  # fmt: skip


def test_what_was_played_in_is_written_to_common_values() -> None:
    # Notes 91/96 of a quarter long, and a little late each: quarters are meant.
    events = []
    for index, key in enumerate((60, 64, 67, 72)):
        events += [(96 * index + index, NoteOn(0, key, 80)), (96 * index + 91, NoteOff(0, key, 0))]
    data = write_midi_file(RawMidi(1, 96, (RawTrack(tuple(events)),)))
    back = read_bytes(full(of_bytes(data, "played.mid")), "made.musicxml")
    assert [(n.onset, n.duration) for n in back.notes] == [(Fraction(n), 1) for n in range(4)]


def test_an_accompaniment_of_several_voices_keeps_every_note() -> None:
    tuned = of_bytes(midi_of("lamp-night"), "lamp.mid")
    made = as_musicxml(tuned)
    back = read_bytes(made.score.source, "made.musicxml")
    assert len({n.part for n in tuned.score.notes}) == len(tuned.score.parts)
    for part in tuned.score.parts:
        own = sorted((n.onset, n.pitch.key) for n in tuned.score.notes if n.part == part.index)
        found = {
            (bar.onset + note.onset, note.pitch.key)
            for bar, written in zip(
                tuned.score.bars, _written(made.score.source)[part.index].bars, strict=True
            )
            for note in written.notes
        }
        assert set(own) <= found
    assert back.title == tuned.score.title


def _written(data: bytes):  # type: ignore[no-untyped-def]
    from retune.limits import Limits
    from retune.score.musicxml import read_musicxml

    return read_musicxml(data, Limits()).parts


def test_parts_of_other_formats_are_written_too() -> None:
    tuned = of_bytes(KERN, "a.krn")
    wish = NotationOptions(parts=Parts.YES)
    files = list(NotationExporter().export((Take(tuned),), wish))
    assert len(files) == 3
    assert "made anew" in files[0].note
    for file, part in zip(files[1:], tuned.score.parts, strict=True):
        alone = read_bytes(file.data, "alone.musicxml")
        assert [(n.onset, n.pitch) for n in alone.notes] == [
            (n.onset, n.pitch) for n in tuned.score.notes if n.part == part.index
        ]


def test_a_transposed_midi_file_is_written_at_its_new_pitch() -> None:
    from retune.score.options import ReadOptions

    score = read_bytes(midi_of("gull-song"), "gull.mid", ReadOptions(transpose=3))
    tuned = tune(score, analyse(score), Policy())
    back = read_bytes(full(tuned), "made.musicxml")
    assert [n.pitch.key for n in back.notes] == [n.pitch.key for n in score.notes]


def test_too_long_a_performance_is_refused_with_advice(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(notation_made, "_MOST_NOTES", 3)
    with pytest.raises(OutputError, match="more than 3 notes"):
        full(of_bytes(KERN, "a.krn"))
