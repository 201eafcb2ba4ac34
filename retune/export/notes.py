"""The exporter `notes`: every note with its chord, ratio and cents, as JSON and as CSV.

Fractions are text ("3/2", "4"); onsets and durations are quarter notes as played; cents, Hz
and seconds have six decimals.
"""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any, ClassVar

from retune.export.base import OutputFile
from retune.export.csvtext import Cell, csv_bytes, number_cell, text_cell
from retune.export.names import safe_name
from retune.export.places import Places, rounded
from retune.harmony.model import Chord
from retune.harmony.symbols import chord_symbol, chord_words
from retune.tracks.take import Take
from retune.tuning.model import Segment, TunedNote, TunedScore

_VERSION = 1
_COLUMNS = (
    "note",
    "part",
    "name",
    "onset",
    "duration",
    "bar",
    "beat",
    "pitch",
    "key",
    "lyric",
    "seconds",
    "length_seconds",
    "chord",
    "root",
    "quality",
    "symbol",
    "role",
    "ratio",
    "cents",
    "hz",
)


@dataclass(frozen=True, slots=True)
class NotesOptions:
    """Options of the exporter."""

    bom: bool = field(
        default=False,
        metadata={"help": "start the CSV with a byte order mark, which some spreadsheets need"},
    )


class NotesExporter:
    """Writes the note list of a piece, once however many takes there are."""

    name: ClassVar[str] = "notes"
    summary: ClassVar[str] = "Every note with chord, ratio, cents and Hz, for programs and tables"
    suffixes: ClassVar[tuple[str, ...]] = (".json", ".csv")
    Options: ClassVar[type[NotesOptions]] = NotesOptions

    def export(self, takes: Sequence[Take], options: NotesOptions) -> Iterator[OutputFile]:
        """Yield NAME.notes.csv and NAME.notes.json."""
        tuned = takes[0].tuned
        places = Places(tuned)
        chords = [_chord(tuned, places, chord) for chord in tuned.harmony.chords]
        notes = [_note(tuned, places, note) for note in tuned.notes]
        rows = _rows(tuned, places, chords, notes)
        name = f"notes/{safe_name(tuned.score.stem)}.notes"
        yield OutputFile(f"{name}.csv", csv_bytes(_COLUMNS, rows, options.bom))
        text = "".join(_json_text(tuned, chords, notes))
        yield OutputFile(f"{name}.json", text.encode("utf-8", "replace"))


_Object = dict[str, Any]


def _json_text(tuned: TunedScore, chords: list[_Object], notes: list[_Object]) -> Iterator[str]:
    """The document, an object a line inside its lists."""
    yield "{"
    yield ",\n ".join(f'"{key}": {_dumped(value)}' for key, value in _head(tuned).items())
    for key, values in (("parts", _parts(tuned)), ("chords", chords), ("notes", notes)):
        yield f',\n "{key}": ['
        yield ",".join(f"\n  {_dumped(value)}" for value in values)
        yield "]"
    if tuned.score.singer_notes:
        yield f',\n "notes_to_singers": {_dumped(_told(tuned))}'
    yield f',\n "figures": {_dumped(plain(tuned.figures))}}}\n'


_dumped = json.JSONEncoder(ensure_ascii=False, allow_nan=False, check_circular=False).encode


def _head(tuned: TunedScore) -> _Object:
    policy = tuned.policy
    held = "any" if math.isinf(policy.held_shift) else policy.held_shift
    return {
        "format": "retune-notes",
        "version": _VERSION,
        "title": tuned.score.title,
        "reference_hz": rounded(policy.reference_hz),
        "policy": {
            "prime_limit": policy.prime_limit,
            "drift": str(policy.drift),
            "held_shift": held,
            "temperament": str(policy.temperament),
            "tonic": tuned.harmony.tonic.root.name,
        },
    }


def _parts(tuned: TunedScore) -> list[_Object]:
    return [
        {"index": part.index, "name": part.name, "tuned": part.tuned} for part in tuned.score.parts
    ]


def _told(tuned: TunedScore) -> list[_Object]:
    """The director's notes to singers, as they come."""
    score = tuned.score
    found = []
    for note in score.singer_notes:
        inside = [bar.number for bar in score.bars if note.onset <= bar.onset < note.end]
        first, last = (inside or [score.bar_at(note.onset).number])[0], inside[-1:]
        bars = f"{first}-{last[0]}" if last and last[0] != first else first
        found.append(
            {
                "bars": bars,
                "onset": str(note.onset),
                "end": str(note.end),
                "parts": list(note.parts),
                "text": note.text,
            }
        )
    return found


def _chord(tuned: TunedScore, places: Places, chord: Chord) -> _Object:
    bar, beat = places.bar_and_beat(chord.onset)
    root_cents = tuned.root_cents[chord.index]
    return {
        "index": chord.index,
        "onset": str(chord.onset),
        "duration": str(chord.duration),
        "bar": bar,
        "beat": beat,
        "root": chord.root.name if chord.root else None,
        "quality": str(chord.quality) if chord.quality else None,
        "symbol": chord_symbol(chord) or None,
        "root_cents": None if root_cents is None else rounded(root_cents),
        "confidence": rounded(chord.confidence),
        "runner_up": chord_words(*chord.runner_up) if chord.runner_up else None,
    }


def _note(tuned: TunedScore, places: Places, tuned_note: TunedNote) -> _Object:
    note = tuned_note.note
    bar, beat = places.bar_and_beat(note.onset)
    seconds, length = places.seconds(note.onset, note.end)
    return {
        "part": note.part,
        "onset": str(note.onset),
        "duration": str(note.duration),
        "bar": bar,
        "beat": beat,
        "pitch": note.pitch.name,
        "key": note.pitch.key,
        "lyric": note.lyric,
        "seconds": seconds,
        "length_seconds": length,
        "segments": [
            _segment(tuned, places, tuned_note, segment) for segment in tuned_note.segments
        ],
    }


def _segment(tuned: TunedScore, places: Places, note: TunedNote, segment: Segment) -> _Object:
    seconds, length = places.seconds(segment.onset, segment.end)
    return {
        "onset": str(segment.onset),
        "duration": str(segment.duration),
        "chord": segment.chord,
        "role": str(segment.role),
        "ratio": None if segment.ratio is None else str(segment.ratio),
        "cents": rounded(segment.cents),
        "hz": rounded(tuned.hz(note, segment)),
        "seconds": seconds,
        "length_seconds": length,
    }


def _rows(
    tuned: TunedScore, places: Places, chords: list[_Object], notes: list[_Object]
) -> Iterator[Sequence[Cell]]:
    """A row a segment: its own times and place, and what its note and chord are."""
    names = [text_cell(part.name) for part in tuned.score.parts]
    chord_cells = [(one["root"], one["quality"], one["symbol"]) for one in chords]
    for index, (tuned_note, note) in enumerate(zip(tuned.notes, notes, strict=True)):
        part, lyric = note["part"], text_cell(note["lyric"])
        for segment, shown in zip(tuned_note.segments, note["segments"], strict=True):
            bar, beat = places.bar_and_beat(segment.onset)
            yield (
                index,
                part,
                names[part],
                shown["onset"],
                shown["duration"],
                text_cell(bar),
                beat,
                note["pitch"],
                note["key"],
                lyric,
                number_cell(shown["seconds"]),
                number_cell(shown["length_seconds"]),
                segment.chord,
                *chord_cells[segment.chord],
                shown["role"],
                shown["ratio"],
                number_cell(shown["cents"]),
                number_cell(shown["hz"]),
            )


def plain(value: Any) -> Any:
    """A figure as JSON can state it: fractions as text, floats to six decimals, no infinities.

    >>> plain({"drift": (1.25, Fraction(3, 2), float("inf"))})
    {'drift': [1.25, '3/2', None]}
    """
    if isinstance(value, Mapping):
        return {str(key): plain(inner) for key, inner in value.items()}
    if isinstance(value, Fraction):
        return str(value)
    if isinstance(value, str) or value is None or isinstance(value, int):
        return value
    if isinstance(value, Iterable):
        return [plain(inner) for inner in value]
    number = float(value)
    return rounded(number) if math.isfinite(number) else None
