"""The exporter `scala`: tuning tables as .scl with .kbm, and a list of when each applies.

The plain table is the best single one for the whole piece, its error in its description. The
numbered ones are one for each distinct chord tuning, or the best few on request.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field, replace
from enum import StrEnum
from fractions import Fraction
from itertools import groupby
from typing import ClassVar

import numpy as np

from retune.errors import OutputError
from retune.export.base import OutputFile
from retune.export.chord_tunings import ChordTunings, alike, chord_tunings
from retune.export.clusters import best_groups
from retune.export.csvtext import Cell, csv_bytes, number_cell, text_cell
from retune.export.names import safe_name
from retune.export.options import require_allowed
from retune.export.places import Places
from retune.export.scala_messages import STEP, message_file
from retune.export.scala_tables import Table, TableMaker
from retune.export.scala_text import KBM, SCL, kbm_bytes, scl_bytes
from retune.harmony.symbols import chord_symbol
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.scl import parse_scl
from retune.units import ratio_to_cents

_COLUMNS = (
    "table",
    "file",
    "chords",
    "onset",
    "duration",
    "bar",
    "beat",
    "seconds",
    "length_seconds",
)


class Switch(StrEnum):
    """Where one table may take over from another."""

    CHORD = "chord"
    BAR = "bar"


_COUNTS = (1, 2, 4, 8)
"""Numbers of tables whose errors are told, for who plays live."""


@dataclass(frozen=True, slots=True)
class ScalaOptions:
    """Options of the exporter."""

    tables: int = field(
        default=0,
        metadata={
            "help": "how many tables to make do with; 0 for one per distinct chord tuning",
            "least": 0,
            "most": 9999,
        },
    )
    switch: Switch = field(
        default=Switch.CHORD,
        metadata={"help": "change tables at any chord, or at bar lines only"},
    )
    messages: bool = field(
        default=False,
        metadata={"help": "also a MIDI file that sends each table as a tuning message"},
    )


@dataclass(frozen=True, slots=True)
class _Error:
    """How far chord tones lie from their tables, in cents, and the chord that is worst off."""

    rms: float
    greatest: float
    chord: int

    def words(self, tuned: TunedScore) -> str:
        place = tuned.score.place(tuned.harmony.chords[self.chord].onset)
        return (
            f"chord tones {self.rms:.2f} cents off (root mean square), "
            f"{self.greatest:.2f} at most (bar {place.bar}, beat {place.beat})"
        )


class ScalaExporter:
    """Writes the tables of a piece, once however many takes there are."""

    name: ClassVar[str] = "scala"
    summary: ClassVar[str] = "Tuning tables in the Scala format, with a list of when each applies"
    suffixes: ClassVar[tuple[str, ...]] = (SCL, KBM, ".csv")
    Options: ClassVar[type[ScalaOptions]] = ScalaOptions

    def export(self, takes: Sequence[Take], options: ScalaOptions) -> Iterator[OutputFile]:
        """Yield the best single table, the numbered tables and the list of their times.

        Raises `WishError` for an option out of its range.
        """
        require_allowed(self.name, options)
        piece = _Piece(takes[0].tuned)
        yield from piece.single()
        yield from piece.numbered(options.tables, options.switch, options.messages)


class _Piece:
    """One piece on its way to tables."""

    def __init__(self, tuned: TunedScore) -> None:
        self._tuned = tuned
        self._tunings = chord_tunings(tuned)
        self._maker = TableMaker(tuned, self._tunings)
        self._stem = safe_name(tuned.score.stem)
        self._title = tuned.score.title or tuned.score.stem

    def single(self) -> Iterator[OutputFile]:
        """The table that fits the whole piece best."""
        chords = self._tunings.sounding
        table = self._maker.table(chords, close=False)
        words = f"best single table, 1/1 is {table.base.name}"
        error = _error(self._tunings, [chords], [table])
        note = error.words(self._tuned) if error else "no chord sounds; the home scale"
        yield from self._files(self._stem, table, f"{words}; {note}", f"{words}: {note}")

    def numbered(self, wished: int, switch: Switch, messages: bool) -> Iterator[OutputFile]:
        """A table for each group of chords, and when each applies."""
        groups = self._units(switch)
        few = 0 < wished < len(groups)
        close = switch is Switch.CHORD and not few
        told = self._told(groups)
        if few:
            groups = self._fewer(groups, wished)
        tables = [self._maker.table(group, close) for group in groups]
        digits = max(2, len(str(len(groups))))
        names = [
            f"{self._stem} {number:0{digits}d} {self._label(group)}"
            for number, group in enumerate(groups, start=1)
        ]
        for name, group, table in zip(names, groups, tables, strict=True):
            files = self._files(name, table, self._words(group, table), "")
            yield from (replace(file, series=f"tables/{self._stem}") for file in files)
        error = _error(self._tunings, groups, tables)
        note = "no chord sounds"
        if error:
            note = f"{len(groups)} tables; {error.words(self._tuned)}{told}"
        rows = csv_bytes(_COLUMNS, self._rows(groups, names))
        yield OutputFile(f"tables/{self._stem}.tables.csv", rows, note)
        if messages:
            switches = self._switches(groups, names, tables)
            yield OutputFile(
                f"tables/{self._stem}.tables.mid",
                message_file(self._tuned, switches),
                f"each table as a scale/octave message (08 09) to all channels, within "
                f"{STEP / 2:.4f} cents; the instrument must support it",
            )

    def _units(self, switch: Switch) -> list[list[int]]:
        """What must share a table: chords tuned alike, or all that begin in one bar."""
        chords = self._tuned.harmony.chords
        if switch is Switch.CHORD:
            return alike(self._tunings, chords)
        by_bar: dict[int, list[int]] = {}
        for index in self._tunings.sounding:
            by_bar.setdefault(self._tuned.score.bar_at(chords[index].onset).index, []).append(index)
        return list(by_bar.values())

    def _told(self, groups: list[list[int]]) -> str:
        """How far off chord tones are with a few tables."""
        found: dict[int, str] = {}
        for count in _COUNTS:
            if count < len(groups):
                fewer = self._fewer(groups, count)
                error = _error(
                    self._tunings, fewer, [self._maker.table(group, False) for group in fewer]
                )
                if error:
                    found[count] = f"{error.rms:.1f}"
        counts, errors = ", ".join(map(str, found)), ", ".join(found.values())
        return f"; with {counts} tables {errors}" if found else ""

    def _switches(
        self, groups: list[list[int]], names: list[str], tables: list[Table]
    ) -> list[tuple[Fraction, str, Sequence[float]]]:
        """Each time another table comes into force."""
        table_of = {chord: number for number, group in enumerate(groups) for chord in group}
        found: list[tuple[Fraction, str, Sequence[float]]] = []
        for number, run in groupby(sorted(table_of), key=lambda chord: table_of[chord]):
            onset = self._tuned.harmony.chords[next(run)].onset
            found.append((onset, names[number], tables[number].cents))
        return found

    def _fewer(self, groups: list[list[int]], count: int) -> list[list[int]]:
        """Chords in the given number of groups that lose least, in order of appearance."""
        tunings = self._tunings
        weights = np.array([tunings.weights[group].sum(axis=0) for group in groups])
        values = np.array([self._maker.table(group).cents for group in groups])
        labels = best_groups(values, weights, count)
        merged: dict[int, list[int]] = {}
        for label, group in zip(labels.tolist(), groups, strict=True):
            merged.setdefault(label, []).extend(group)
        return sorted((sorted(group) for group in merged.values()), key=lambda group: group[0])

    def _label(self, group: Sequence[int]) -> str:
        """The symbol that sounds longest in a group."""
        lengths: dict[str, float] = {}
        for chord in group:
            symbol = chord_symbol(self._tuned.harmony.chords[chord])
            lengths[symbol] = lengths.get(symbol, 0.0) + self._tunings.weights[chord].sum()
        return max(lengths, key=lambda symbol: lengths[symbol])

    def _words(self, group: Sequence[int], table: Table) -> str:
        chords = self._tuned.harmony.chords
        symbols = dict.fromkeys(chord_symbol(chords[chord]) for chord in group)
        place = self._tuned.score.place(chords[group[0]].onset)
        times = f", {len(group)} times" if len(group) > 1 else ""
        return (
            f"{' '.join(symbols)} from bar {place.bar} beat {place.beat}{times}; "
            f"1/1 is {table.base.name}, {table.cents[table.base.chroma]:+.2f} cents"
        )

    def _files(self, name: str, table: Table, words: str, note: str) -> Iterator[OutputFile]:
        labels = [table.names[chroma] for chroma in table.degrees()]
        pitches = table.pitches()
        data = scl_bytes(f"{name}{SCL}", f"{self._title}: {words}", pitches, labels)
        wanted = [p if isinstance(p, float) else ratio_to_cents(p) for p in pitches]
        yield OutputFile(
            f"tables/{name}{SCL}", data, note, lambda found: _check_scale(found, wanted)
        )
        hz = table.hz(self._tuned.policy.reference_hz)
        yield OutputFile(f"tables/{name}{KBM}", kbm_bytes(f"{name}{KBM}", table.first_key, hz, 12))

    def _rows(self, groups: list[list[int]], names: list[str]) -> Iterator[Sequence[Cell]]:
        """A row each time another table comes into force."""
        chords, places = self._tuned.harmony.chords, Places(self._tuned)
        table_of = {chord: number for number, group in enumerate(groups) for chord in group}
        for number, run in groupby(sorted(table_of), key=lambda chord: table_of[chord]):
            indices = list(run)
            first, last = chords[indices[0]], chords[indices[-1]]
            symbols = dict.fromkeys(chord_symbol(chords[index]) for index in indices)
            bar, beat = places.bar_and_beat(first.onset)
            start, length = places.seconds(first.onset, last.end)
            yield (
                number + 1,
                text_cell(f"{names[number]}{SCL}"),
                " ".join(symbols),
                str(first.onset),
                str(last.end - first.onset),
                text_cell(bar),
                beat,
                number_cell(start),
                number_cell(length),
            )


def _error(
    tunings: ChordTunings, groups: Sequence[Sequence[int]], tables: Sequence[Table]
) -> _Error | None:
    """How well chord tones are met, by sounding time; None where no chord sounds."""
    total = summed = greatest = 0.0
    worst = -1
    for group, table in zip(groups, tables, strict=True):
        if not group:
            continue
        weights = tunings.weights[group]
        apart = np.where(weights > 0, np.abs(tunings.tones[group] - np.array(table.cents)), 0.0)
        total += float(weights.sum())
        summed += float((weights * apart**2).sum())
        farthest = apart.max(axis=1)
        if worst < 0 or farthest.max() > greatest:
            greatest, worst = float(farthest.max()), group[int(farthest.argmax())]
    return _Error(math.sqrt(summed / total), greatest, worst) if worst >= 0 else None


def _check_scale(data: bytes, wanted: Sequence[float]) -> str:
    """Read a scale back and compare it with what was meant; raises `OutputError`."""
    _, found = parse_scl(data.decode("latin-1"))
    if len(found) != len(wanted) or any(
        abs(one - other) > 1e-5 for one, other in zip(found, wanted, strict=True)
    ):
        raise OutputError(
            "the scale reads back wrong", hint="This is a fault of retune; please report it"
        )
    return ""
