"""Tuning tables, read back by a parser of the tests written from the published formats."""

from __future__ import annotations

import csv
import io
import math
from collections import defaultdict
from fractions import Fraction

import pytest
from music21.scale.scala import ScalaData

from retune.errors import WishError
from retune.export.scala import ScalaExporter, ScalaOptions
from retune.harmony.model import Quality, Role, Tonic
from retune.pitch import PitchClass
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.export.building import cadence, organ, sung, tuned_score
from tests.export.scala_files import hz, parse_kbm, parse_scl


def exported(tuned: TunedScore, tables: int = 0) -> dict[str, bytes]:
    files = list(ScalaExporter().export([Take(tuned)], ScalaOptions(tables)))
    for file in files:
        if file.check is not None:
            file.check(file.data)
    assert len({file.name for file in files}) == len(files)
    return {file.name: file.data for file in files}


def rows_of(files: dict[str, bytes], stem: str = "piece") -> list[dict[str, str]]:
    text = files[f"tables/{stem}.tables.csv"].decode()
    return list(csv.DictReader(io.StringIO(text)))


def cents_at(files: dict[str, bytes], scale: str, key: int, reference: float) -> float:
    """Cents off equal temperament of a key in a table."""
    scl, kbm = parse_scl(files[scale]), parse_kbm(files[scale[:-3] + "kbm"])
    return 1200 * math.log2(hz(scl, kbm, key) / (reference * 2 ** ((key - 69) / 12)))


def check_tables(tuned: TunedScore, files: dict[str, bytes], bound: float = 0.5) -> None:
    """Each chord tone lies within the bound of its table where the pitch holds still in its
    chord, else the mean does."""
    rows = rows_of(files, tuned.score.stem)
    for row in rows:
        assert f"tables/{row['file']}" in files
    spans = [(Fraction(r["onset"]), Fraction(r["onset"]) + Fraction(r["duration"])) for r in rows]
    values: dict[tuple[int, int], list[tuple[Fraction, float]]] = defaultdict(list)
    for note in tuned.notes:
        if tuned.score.parts[note.note.part].tuned:
            for segment in note.segments:
                if segment.role is Role.CHORD_TONE:
                    place = (segment.chord, note.note.pitch.key)
                    values[place[0], place[1] % 12].append((segment.duration, segment.cents))
    for (chord, chroma), found in values.items():
        onset = tuned.harmony.chords[chord].onset
        (row,) = [r for r, (start, end) in zip(rows, spans, strict=True) if start <= onset < end]
        for key in (chroma + 36, chroma + 72):
            table = cents_at(files, f"tables/{row['file']}", key, tuned.policy.reference_hz)
            mean = sum(float(d) * c for d, c in found) / sum(float(d) for d, _ in found)
            assert abs(table - mean) <= bound + 1e-4


def test_the_cadence_in_tables() -> None:
    tuned = cadence()
    files = exported(tuned)
    assert [name for name in files if name.endswith(".scl")] == [
        "tables/piece.scl",
        "tables/piece 01 C.scl",
        "tables/piece 02 F.scl",
        "tables/piece 03 G7.scl",
    ]
    check_tables(tuned, files)


def test_exact_ratios_where_they_are_exact() -> None:
    scl = parse_scl(exported(cadence())["tables/piece 01 C.scl"])
    assert scl.pitches[3] == Fraction(5, 4)
    assert scl.pitches[6] == Fraction(3, 2)
    assert scl.pitches[11] == Fraction(2)
    assert all(isinstance(p, float) for i, p in enumerate(scl.pitches) if i not in (3, 6, 11))


def test_no_ratio_where_the_pitch_bears_it_not_out() -> None:
    notes = [sung(0, 0, "C4", (1, 0.0, "1")), sung(1, 0, "E4", (1, -12.0, "5/4"))]
    scl = parse_scl(exported(tuned_score(notes))["tables/piece 01 C.scl"])
    assert scl.pitches[3] == pytest.approx(388.0)
    assert isinstance(scl.pitches[3], float)


def test_the_mapping_places_the_root_at_its_solved_pitch() -> None:
    tuned = tuned_score(
        [sung(0, 0, "F#4", (1, -9.0, "1"))],
        chords=[(0, "F#", Quality.MAJOR, -9.0)],
        policy=Policy(reference_hz=442.0),
    )
    kbm = parse_kbm(exported(tuned)["tables/piece 01 F#.kbm"])
    assert (kbm.size, kbm.first, kbm.last, kbm.octave) == (12, 0, 127, 12)
    assert kbm.degrees == list(range(12))
    assert kbm.middle == kbm.reference
    assert kbm.reference % 12 == 6
    wanted = 442.0 * 2 ** ((kbm.reference - 69) / 12 - 9.0 / 1200)
    assert kbm.hz == pytest.approx(wanted, abs=1e-6)


def test_unused_keys_are_the_scale_of_the_home_tonic() -> None:
    # On a C major triad at 0 cents, D is 9/8 and F is 4/3 above C (the Ptolemaic scale).
    files = exported(cadence())
    assert cents_at(files, "tables/piece 01 C.scl", 62, 440.0) == pytest.approx(3.910, abs=1e-3)
    assert cents_at(files, "tables/piece 01 C.scl", 65, 440.0) == pytest.approx(-1.955, abs=1e-3)


def test_unused_keys_follow_a_chord_that_has_drifted() -> None:
    notes = [sung(0, 0, "C4", (1, -60.0, "1")), sung(1, 0, "G4", (1, -58.045, "3/2"))]
    tuned = tuned_score(notes, chords=[(0, "C", Quality.MAJOR, -60.0)])
    found = cents_at(exported(tuned), "tables/piece 01 C.scl", 62, 440.0)
    assert found == pytest.approx(3.910 - 60.0, abs=1e-3)


def test_a_non_chord_tone_has_its_own_pitch_in_the_table() -> None:
    tuned = cadence()
    passing = sung(0, 0, "D4", (1, 7.25))
    built = tuned_score([passing, sung(1, 0, "C4", (1, 0.0)), sung(2, 0, "E4", (1, -13.7))])
    note = next(one for one in built.notes if one.note.pitch.step == "D")
    object.__setattr__(note.segments[0], "role", Role.PASSING)
    assert cents_at(exported(built), "tables/piece 01 C.scl", 62, 440.0) == pytest.approx(7.25)
    assert tuned.score.stem == "piece"


def test_chords_tuned_alike_share_a_table_and_others_do_not() -> None:
    notes = [
        note
        for onset, cents in ((0, 0.0), (1, 0.7), (2, 1.4), (3, 0.1))
        for note in (sung(0, onset, "C4", (1, cents)), sung(1, onset, "G4", (1, cents + 1.955)))
    ]
    chords = [(onset, "C", Quality.MAJOR, 0.0) for onset in range(4)]
    tuned = tuned_score(notes, chords=chords)
    files = exported(tuned)
    assert [row["table"] for row in rows_of(files)] == ["1", "2", "1"]
    check_tables(tuned, files)


def test_when_each_table_applies() -> None:
    rows = rows_of(exported(cadence()))
    assert [(r["file"], r["bar"], r["beat"], r["seconds"]) for r in rows] == [
        ("piece 01 C.scl", "1", "1", "0.000000"),
        ("piece 02 F.scl", "1", "2", "0.833333"),
        ("piece 03 G7.scl", "1", "3", "1.666667"),
        ("piece 01 C.scl", "1", "4", "2.500000"),
    ]


def test_the_single_table_is_the_mean_by_sounding_time() -> None:
    # A sounds 1 s at 0 and 3 s at -20 cents: the best table has it at -15.
    notes = [sung(0, 0, "A4", (1, 0.0)), sung(0, 1, "A4", (3, -20.0))]
    chords = [(0, "A", Quality.MAJOR, 0.0), (1, "F", Quality.MAJOR, -6.0)]
    tuned = tuned_score(notes, chords=chords)
    files = list(ScalaExporter().export([Take(tuned)], ScalaOptions()))
    single = next(file for file in files if file.name == "tables/piece.scl")
    found = {file.name: file.data for file in files}
    assert cents_at(found, "tables/piece.scl", 69, 440.0) == pytest.approx(-15.0, abs=1e-4)
    # Root mean square of 15 for 1 s and 5 for 3 s: sqrt((225 + 75) / 4) = 8.66.
    for text in (single.note, parse_scl(single.data).description):
        assert "8.66 cents off" in text
        assert "15.00 at most (bar 1, beat 1)" in text


def test_the_best_few_tables() -> None:
    notes = [
        sung(0, onset, "C4", (1, cents))
        for onset, cents in enumerate([0.0, 20.0, 1.0, 21.0, 0.5, 40.0])
    ]
    chords = [(onset, "C", Quality.MAJOR, 0.0) for onset in range(6)]
    tuned = tuned_score(notes, chords=chords)
    files = exported(tuned, 3)
    assert len([name for name in files if name.endswith(".scl")]) == 4
    assert [row["table"] for row in rows_of(files)] == ["1", "2", "1", "2", "1", "3"]
    check_tables(tuned, files, 0.5)
    two = exported(tuned, 2)
    assert cents_at(two, "tables/piece 01 C.scl", 60, 440.0) == pytest.approx(0.5, abs=1e-4)
    assert cents_at(two, "tables/piece 02 C.scl", 60, 440.0) == pytest.approx(27.0, abs=1e-4)


def test_more_tables_than_there_are_tunings_are_not_made() -> None:
    assert exported(cadence(), 50).keys() == exported(cadence()).keys()


def test_an_accompaniment_does_not_pull_the_table_of_the_voices() -> None:
    notes = [sung(0, 0, "E4", (1, -13.686, "5/4")), sung(1, 0, "E3", (1, 0.0))]
    tuned = tuned_score(notes, parts=["Soprano", organ(1)])
    found = cents_at(exported(tuned), "tables/piece 01 C.scl", 64, 440.0)
    assert found == pytest.approx(-13.686, abs=0.1)


def test_a_piece_in_which_nothing_sounds_still_has_its_home_scale() -> None:
    tuned = tuned_score([], chords=[(0, None, None, None)], tonic=Tonic(PitchClass("D")))
    files = exported(tuned)
    assert sorted(files) == ["tables/piece.kbm", "tables/piece.scl", "tables/piece.tables.csv"]
    # The Ptolemaic scale on D.
    assert cents_at(files, "tables/piece.scl", 66, 440.0) == pytest.approx(-13.686, abs=1e-3)


def test_bytes_are_latin_1_with_line_feeds_whatever_the_title() -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 0.0))], title="! Ő, été 東\nline", stem="東 ű")
    files = exported(tuned)
    for name, data in files.items():
        if name.endswith(".scl"):
            scl = parse_scl(data)
            assert "O, été ? line" in scl.description
            assert not scl.description.startswith("!")


def test_a_well_known_reader_agrees_where_it_reads_rightly() -> None:
    # music21 keeps every digit, point and slash of a line, which is right for our lines.
    for name, data in exported(cadence()).items():
        if name.endswith(".scl"):
            found = ScalaData(data.decode("latin-1"))
            found.parse()
            cents = [pitch.cents for pitch in found.pitchValues]
            assert cents == pytest.approx(parse_scl(data).cents, abs=1e-6)


def test_a_negative_number_of_tables_is_refused() -> None:
    with pytest.raises(WishError, match="cannot be -1"):
        list(ScalaExporter().export([Take(cadence())], ScalaOptions(-1)))
