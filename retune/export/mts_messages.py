"""What the keys of each channel are told, and when: only what changes.

A message stands in the track of the part whose notes need it. Values are those of the planned
notes: how far a key is from itself, in parts of a semitone that the form of message sets.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import chain

from retune.adapters.midi import Control, Event, Sysex
from retune.export.midi_channels import Lane
from retune.export.midi_plan import PlannedNote
from retune.export.mts_words import FRACTION, MOST_KEYS, bulk, octave, single_notes

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
    """A tuning program while keys are being put into it; `since` is the tick of its dump, -1 for
    the start of the piece, `used` the last tick that it was chosen at."""

    number: int
    since: int = -1
    used: int = -1
    keys: dict[int, int] = field(default_factory=dict)

    def takes(self, keys: Mapping[int, int]) -> bool:
        return all(self.keys.get(key, value) == value for key, value in keys.items())

    def dump(self, ground: int) -> Sysex:
        pitches = [key * FRACTION + self.keys.get(key, ground) for key in range(128)]
        return Sysex(bulk(self.number, f"Chords {self.number + 1}", pitches))


@dataclass(frozen=True, slots=True)
class Tables:
    """Bulk dumps for the start of the piece, what each channel is told after it, and how many
    more dumps are in that."""

    dumps: tuple[Sysex, ...]
    told: tuple[Told, ...]
    later: int = 0


def tables(lanes: Sequence[Lane], ground: int) -> Tables:
    """As few tuning programs as hold every chord of every channel; a held note keeps the pitch
    that it began with. Keys that never sound stand at `ground`.

    Where 128 programs are too few, the one that no channel has chosen for the longest time is
    sent anew, in the track of the notes that need it.
    """
    programs: list[_Table] = []
    chosen: dict[int, _Table] = {}
    choices: list[tuple[_Struck, _Table]] = []
    for chord in sorted(chain.from_iterable(map(_chords, lanes)), key=lambda one: one.tick):
        table = chosen.get(chord.channel)
        if table is None or not table.takes(chord.keys):
            # A table that is sent at this very tick may come after this track's notes.
            ready = (one for one in programs if one.since < chord.tick and one.takes(chord.keys))
            table = next(ready, None) or _fresh(programs, chosen, chord.tick)
            chosen[chord.channel] = table
            choices.append((chord, table))
        table.keys.update(chord.keys)
        table.used = chord.tick
    later = {id(table): table for _, table in choices if table.since >= 0}
    told = [
        Told(part, chord.tick, (*sent, *select(chord.channel, table.number)))
        for chord, table in choices
        for sent in [(table.dump(ground),) if table.since == chord.tick else ()]
        for part in sorted(chord.parts)
    ]
    start = {table.number: table for _, table in choices if table.since < 0}
    return Tables(tuple(table.dump(ground) for table in start.values()), tuple(told), len(later))


def _fresh(programs: list[_Table], chosen: Mapping[int, _Table], tick: int) -> _Table:
    """An empty table, in a program that none has had or that no channel needs any more."""
    if len(programs) < _MOST_TABLES:
        table = _Table(len(programs))
        programs.append(table)
        return table
    idle = (one for one in programs if all(one is not other for other in chosen.values()))
    number = min(idle, key=lambda one: one.used).number
    programs[number] = _Table(number, tick)
    return programs[number]


@dataclass(frozen=True, slots=True)
class _Struck:
    """What a channel strikes at a tick: in the tracks of which parts, and the first value of
    every key that sounds then."""

    channel: int
    tick: int
    parts: frozenset[int]
    keys: dict[int, int]


def _chords(lane: Lane) -> Iterator[_Struck]:
    by_tick: dict[int, list[PlannedNote]] = defaultdict(list)
    for note in lane.notes:
        by_tick[note.on].append(note)
    sounding: list[PlannedNote] = []
    for tick, struck in sorted(by_tick.items()):
        sounding = [*(note for note in sounding if note.off > tick), *struck]
        keys = {note.key: note.bends[0][1] for note in sounding}
        yield _Struck(lane.channel, tick, frozenset(note.part for note in struck), keys)
