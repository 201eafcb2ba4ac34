"""Tables as tuning messages and tables that change at bar lines.

The message by the MIDI Tuning Updated Specification (CA-020/CA-021; handbook, standards.md 4).
"""

from __future__ import annotations

import csv
import io
import re
from fractions import Fraction
from itertools import pairwise

import pytest

from retune.adapters.midi import Sysex, read_midi_file
from retune.export.base import OutputFile
from retune.export.scala import ScalaExporter, ScalaOptions, Switch
from retune.export.scala_messages import octave_message
from retune.tracks.take import Take
from retune.units import ratio_to_cents
from tests.tracks.pieces import NAMES, tuned

CHROMATIC = "1 16/15 9/8 6/5 5/4 4/3 45/32 3/2 8/5 5/3 16/9 15/8"


def test_the_worked_message_of_the_handbook() -> None:
    cents = [ratio_to_cents(Fraction(r)) - 100 * n for n, r in enumerate(CHROMATIC.split())]
    assert octave_message(cents).data == bytes.fromhex(
        "7F 7F 08 09 03 7F 7F 40 00 47 41 42 40 4A 01 37 1F"
        " 3E 60 39 5F 41 20 48 61 35 7F 3D 40 38 3F"
    )


@pytest.mark.parametrize(("cents", "word"), [(0, "40 00"), (-100, "00 00"), (150, "7F 7F")])
def test_its_ends_and_its_middle(cents: float, word: str) -> None:
    assert octave_message([cents] * 12).data[-2:] == bytes.fromhex(word)


def files(name: str, options: ScalaOptions) -> dict[str, OutputFile]:
    found = ScalaExporter().export([Take(tuned(name))], options)
    return {file.name.rpartition("/")[2]: file for file in found}


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("tables", [1, 3, 8])
def test_tables_that_change_at_bar_lines_only(name: str, tables: int) -> None:
    made = files(name, ScalaOptions(tables=tables, switch=Switch.BAR))
    listed = csv.DictReader(io.StringIO(made[f"{name}.tables.csv"].data.decode("utf-8")))
    piece = tuned(name)
    starts = {bar.onset: bar.number for bar in piece.score.bars}
    first = piece.score.bars[0].number
    rows = list(listed)
    assert len({row["table"] for row in rows}) <= tables
    # The first chord of a bar may begin after the bar line, where the bar begins with a rest or
    # with a chord that is held over; nothing else begins in that bar before it.
    for row, before in zip(rows[1:], rows, strict=False):
        assert row["bar"] != before["bar"] or row["bar"] == first
    assert any(starts[onset] == row["bar"] for row in rows for onset in starts)


@pytest.mark.parametrize("name", NAMES)
def test_more_tables_err_less(name: str) -> None:
    note = files(name, ScalaOptions())[f"{name}.tables.csv"].note
    match = re.search(r"with ([\d, ]+) tables ([\d., ]+)", note)
    if match is None:
        return
    errors = [float(text) for text in match[2].rstrip(", ").split(", ")]
    assert errors == sorted(errors, reverse=True)
    assert len(errors) == len(match[1].split(", "))


def test_messages_stand_where_the_list_says() -> None:
    made = files("harbour-hymn", ScalaOptions(tables=4, messages=True))
    raw = read_midi_file(made["harbour-hymn.tables.mid"].data)
    sent = [(tick, e.data) for tick, e in raw.tracks[1].events if isinstance(e, Sysex)]
    rows = list(csv.DictReader(io.StringIO(made["harbour-hymn.tables.csv"].data.decode("utf-8"))))
    assert isinstance(raw.division, int)
    assert [tick / raw.division for tick, _ in sent] == [float(row["onset"]) for row in rows]
    assert all(a[1] != b[1] for a, b in pairwise(sent))
    # Each word is what the table's own .scl and .kbm say of that key.
    scl = made[rows[0]["file"]].data.decode()
    assert "1/1 is" in scl
    words = sent[0][1][-24:]
    cents = [((words[2 * n] << 7 | words[2 * n + 1]) - 8192) * 100 / 8192 for n in range(12)]
    piece = tuned("harbour-hymn")
    sung = {n.note.pitch.key % 12: n.segments[0].cents for n in piece.notes if n.note.onset == 0}
    for chroma, wanted in sung.items():
        assert cents[chroma] == pytest.approx(wanted, abs=12.0)
