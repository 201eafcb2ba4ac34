"""The note list: its fields, their order, and that nothing in it runs in a spreadsheet."""

from __future__ import annotations

import csv
import io
import json
import math
from dataclasses import replace
from fractions import Fraction
from typing import Any

import pytest

from retune.export.notes import NotesExporter, NotesOptions, plain
from retune.harmony.model import Chord, Quality
from retune.harmony.symbols import chord_symbol, symbol_of
from retune.pitch import PitchClass
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.policy import NO_BOUND, Policy
from tests.export.building import cadence, sung, tuned_score


def listed(tuned: TunedScore) -> tuple[dict[str, Any], list[dict[str, str]]]:
    files = {f.name: f.data for f in NotesExporter().export([Take(tuned)], NotesOptions())}
    stem = tuned.score.stem
    text = files[f"notes/{stem}.notes.csv"].decode()
    return (
        json.loads(files[f"notes/{stem}.notes.json"]),
        list(csv.DictReader(io.StringIO(text, newline=""))),
    )


def test_the_order_of_fields() -> None:
    document, rows = listed(cadence())
    assert list(document) == [
        "format",
        "version",
        "title",
        "reference_hz",
        "policy",
        "parts",
        "chords",
        "notes",
        "figures",
    ]
    assert list(document["policy"]) == [
        "prime_limit",
        "drift",
        "held_shift",
        "temperament",
        "tonic",
    ]
    assert list(document["parts"][0]) == ["index", "name", "tuned"]
    assert list(document["chords"][0]) == [
        "index",
        "onset",
        "duration",
        "bar",
        "beat",
        "root",
        "quality",
        "symbol",
        "root_cents",
        "confidence",
        "runner_up",
    ]
    note = document["notes"][0]
    assert list(note) == [
        "part",
        "onset",
        "duration",
        "bar",
        "beat",
        "pitch",
        "key",
        "lyric",
        "seconds",
        "length_seconds",
        "segments",
    ]
    assert list(note["segments"][0]) == [
        "onset",
        "duration",
        "chord",
        "role",
        "ratio",
        "cents",
        "hz",
        "seconds",
        "length_seconds",
    ]
    shared = set(note) | set(note["segments"][0]) | {"root", "quality", "symbol"}
    assert set(rows[0]) - {"note", "name"} == shared - {"segments"}


def test_values_of_a_held_note() -> None:
    document, rows = listed(cadence())
    assert document["format"] == "retune-notes"
    assert document["version"] == 1
    note = document["notes"][1]
    assert (note["part"], note["pitch"], note["key"], note["duration"]) == (1, "C4", 60, "2")
    first, second = note["segments"]
    assert (first["ratio"], second["ratio"]) == ("1", "3/2")
    assert (first["cents"], second["cents"]) == (0.0, -1.955)
    # C4 in equal temperament at 440 Hz is 261.625565 Hz.
    assert first["hz"] == 261.625565
    # 72 quarter notes a minute: 5/6 s each.
    assert (second["seconds"], second["length_seconds"]) == (0.833333, 0.833333)
    assert [row["cents"] for row in rows if row["note"] == "1"] == ["0.000000", "-1.955000"]
    assert [row["beat"] for row in rows if row["note"] == "1"] == ["1", "2"]


def test_the_table_has_a_row_a_segment_with_the_same_values() -> None:
    document, rows = listed(cadence())
    flat = [(n, s) for n in document["notes"] for s in n["segments"]]
    assert len(rows) == len(flat)
    for row, (note, segment) in zip(rows, flat, strict=True):
        assert int(row["part"]) == note["part"]
        assert row["pitch"] == note["pitch"]
        assert row["lyric"] == note["lyric"]
        assert row["onset"] == segment["onset"]
        assert row["ratio"] == segment["ratio"]
        assert float(row["cents"]) == segment["cents"]
        assert float(row["hz"]) == segment["hz"]
        assert row["symbol"] == document["chords"][segment["chord"]]["symbol"]


def test_times_are_exact_fractions() -> None:
    tuned = tuned_score([sung(0, 0, "C4", ("1/3", 0)), sung(0, "1/3", "C4", ("2/3", 0))])
    document, _ = listed(tuned)
    assert [note["onset"] for note in document["notes"]] == ["0", "1/3"]
    assert [Fraction(note["duration"]) for note in document["notes"]] == [
        Fraction(1, 3),
        Fraction(2, 3),
    ]
    assert document["notes"][1]["beat"] == "4/3"


def test_nothing_sounds_is_null() -> None:
    tuned = tuned_score([sung(0, 0, "C4", (2, 0))], chords=[(0, None, None, None)])
    document, rows = listed(tuned)
    chord = document["chords"][0]
    assert [chord[k] for k in ("root", "quality", "symbol", "root_cents", "runner_up")] == [
        None
    ] * 5
    assert rows[0]["root"] == rows[0]["ratio"] == ""


def test_the_runner_up_is_told_in_words() -> None:
    tuned = cadence()
    chords = tuned.harmony.chords
    second = replace(chords[0], runner_up=(PitchClass("A"), Quality.MINOR_SEVENTH))
    tuned = replace(tuned, harmony=replace(tuned.harmony, chords=(second, *chords[1:])))
    assert listed(tuned)[0]["chords"][0]["runner_up"] == "A minor seventh"


def test_no_bound_is_told_by_its_word() -> None:
    tuned = replace(cadence(), policy=Policy(held_shift=NO_BOUND))
    assert listed(tuned)[0]["policy"]["held_shift"] == "any"


@pytest.mark.parametrize(
    "text", ["=1+1", "+cmd", "-a", "@x", "\t=1", "  =1", "＝1", '=HYPERLINK("x")', "-"]
)
def test_no_cell_runs_as_a_formula(text: str) -> None:
    # OWASP, "CSV Injection".
    tuned = tuned_score([sung(0, 0, "C4", (1, -3.0), lyric=text)], parts=[text])
    document, rows = listed(tuned)
    assert rows[0]["lyric"] == rows[0]["name"] == f"'{text}"
    assert rows[0]["cents"] == "-3.000000"
    assert document["notes"][0]["lyric"] == text


def test_csv_is_rfc_4180_and_may_have_a_byte_order_mark() -> None:
    tuned = tuned_score([sung(0, 0, "C4", (1, 0), lyric='sé, "x"')])
    plain_csv, _ = NotesExporter().export([Take(tuned)], NotesOptions())
    assert plain_csv.data.startswith(b"note,part,")
    assert b',"s\xc3\xa9, ""x""",' in plain_csv.data
    assert plain_csv.data.count(b"\r\n") == 2
    marked, _ = NotesExporter().export([Take(tuned)], NotesOptions(bom=True))
    assert marked.data == b"\xef\xbb\xbf" + plain_csv.data


def test_figures_become_plain_numbers() -> None:
    assert plain({"a": math.nan, "b": [Fraction(1, 2), 1.23456789], "c": True, "d": None}) == {
        "a": None,
        "b": ["1/2", 1.234568],
        "c": True,
        "d": None,
    }


@pytest.mark.parametrize(
    ("quality", "symbol"),
    [
        # Common practice, no source.
        (Quality.MAJOR, "Bb"),
        (Quality.MINOR, "Bbm"),
        (Quality.DIMINISHED, "Bbdim"),
        (Quality.AUGMENTED, "Bbaug"),
        (Quality.DOMINANT_SEVENTH, "Bb7"),
        (Quality.MAJOR_SEVENTH, "Bbmaj7"),
        (Quality.MINOR_SEVENTH, "Bbm7"),
        (Quality.HALF_DIMINISHED, "Bbm7b5"),
        (Quality.DIMINISHED_SEVENTH, "Bbdim7"),
        (Quality.MINOR_MAJOR_SEVENTH, "Bbm(maj7)"),
    ],
)
def test_chord_symbols(quality: Quality, symbol: str) -> None:
    assert symbol_of(PitchClass("B", -1), quality) == symbol


def test_silence_has_no_symbol() -> None:
    assert chord_symbol(Chord(0, Fraction(0), Fraction(1), 0, 1, None, None, 0.0)) == ""
