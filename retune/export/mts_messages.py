"""What the keys of each channel are told, and when: only what changes.

A message stands in the track of the part whose notes need it. Values are those of the planned
notes: how far a key is from itself, in parts of a semitone that the form of message sets.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field

from retune.adapters.midi import Control, Event, Sysex
from retune.errors import OutputError
from retune.export.midi_channels import Lane
from retune.export.midi_plan import PlannedNote
from retune.export.mts_words import FRACTION, MOST_KEYS, bulk, octave, single_notes
from retune.score.model import Score

_RPN_MSB, _RPN_LSB, _DATA_MSB, _TUNING_PROGRAM = 101, 100, 6, 3
_MOST_TABLES = 128


@dataclass(frozen=True, slots=True)
class Told:
    """Events of a channel at a tick, in the track of a part."""

    part: int
    tick: int
    events: tuple[Event, ...]


def select(channel: int, program: int) -> tuple[Control, ...]:
    """RPN 3, tuning program select; then the null RPN."""
    return tuple(
        Control(channel, controller, value)
        for controller, value in (
            (_RPN_MSB, 0),
            (_RPN_LSB, _TUNING_PROGRAM),
            (_DATA_MSB, program),
            (_RPN_MSB, 127),
            (_RPN_LSB, 127),
        )
    )


def single_messages(lane: Lane) -> Iterator[Told]:
    """A change of single keys, real time, in the channel's own tuning program."""
    told: dict[int, int] = {}
    for tick, wanted in _wanted(lane):
        for part, keys in wanted.items():
            changes = {key: value for key, value in keys.items() if told.get(key, 0) != value}
            told |= changes
            words = [(key, key * FRACTION + value) for key, value in changes.items()]
            for first in range(0, len(words), MOST_KEYS):
                data = single_notes(lane.channel, dict(words[first : first + MOST_KEYS]))
                yield Told(part, tick, (Sysex(data),))


def octave_messages(lane: Lane) -> Iterator[Told]:
    """A scale/octave tuning of the channel, real time, where a note name changes.

    It goes into every track that needs it: of tracks, nothing says which one comes first.
    """
    told = [0] * 12
    for tick, wanted in _wanted(lane):
        before = list(told)
        for keys in wanted.values():
            for key, value in keys.items():
                told[key % 12] = value
        message = Sysex(octave(lane.channel, told))
        for part, keys in wanted.items():
            if any(before[key % 12] != value for key, value in keys.items()):
                yield Told(part, tick, (message,))


def _wanted(lane: Lane) -> Iterator[tuple[int, dict[int, dict[int, int]]]]:
    """At each tick, by part, the value of every key that is struck or moves there."""
    found: dict[int, dict[int, dict[int, int]]] = defaultdict(lambda: defaultdict(dict))
    for note in lane.notes:
        for tick, value in note.bends:
            found[tick][note.part][note.key] = value
    return iter(sorted(found.items()))


@dataclass(slots=True, eq=False)
class _Table:
    """A tuning program while keys are being put into it."""

    number: int
    keys: dict[int, int] = field(default_factory=dict)

    def takes(self, keys: Mapping[int, int]) -> bool:
        return all(self.keys.get(key, value) == value for key, value in keys.items())


@dataclass(frozen=True, slots=True)
class Tables:
    """Bulk dumps for the start of the piece, and where each channel takes which."""

    dumps: tuple[Sysex, ...]
    told: tuple[Told, ...]


def tables(score: Score, lanes: Sequence[Lane], ground: int) -> Tables:
    """As few tuning programs as hold every chord of every channel; a held note keeps the pitch
    that it began with. Keys that never sound stand at `ground`.

    Raises `OutputError` where 128 programs are too few, with bar and beat.
    """
    made: list[_Table] = []
    told: list[Told] = []
    for lane in lanes:
        current: _Table | None = None
        for tick, struck, keys in _chords(lane):
            if current is None or not current.takes(keys):
                current = next((table for table in made if table.takes(keys)), None)
                if current is None:
                    if len(made) == _MOST_TABLES:
                        raise _too_many(score, struck[0])
                    current = _Table(len(made))
                    made.append(current)
                for part in {note.part for note in struck}:
                    told.append(Told(part, tick, select(lane.channel, current.number)))
            current.keys.update(keys)
    dumps = tuple(
        Sysex(
            bulk(
                table.number,
                f"Chords {table.number + 1}",
                [key * FRACTION + table.keys.get(key, ground) for key in range(128)],
            )
        )
        for table in made
    )
    return Tables(dumps, tuple(told))


def _chords(lane: Lane) -> Iterator[tuple[int, list[PlannedNote], dict[int, int]]]:
    """At each tick where notes are struck: these, and the first value of all keys that sound."""
    by_tick: dict[int, list[PlannedNote]] = defaultdict(list)
    for note in lane.notes:
        by_tick[note.on].append(note)
    sounding: list[PlannedNote] = []
    for tick, struck in sorted(by_tick.items()):
        sounding = [*(note for note in sounding if note.off > tick), *struck]
        yield tick, struck, {note.key: note.bends[0][1] for note in sounding}


def _too_many(score: Score, note: PlannedNote) -> OutputError:
    return OutputError(
        f"the chords need more than the {_MOST_TABLES} tuning programs there are",
        score.place(score.notes[note.note].onset, note.part),
        "Leave out mts.form=bulk, or export fewer bars",
    )
