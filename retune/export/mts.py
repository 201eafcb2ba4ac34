"""The exporter `mts`: MIDI whose notes are tuned by tuning messages instead of bends.

Each part has one channel with a tuning program of its own (RPN 3), and a key is told its pitch
before it is struck, where that changes: equal tunings are not sent again. Chords of any size fit
one channel, as every key has its own pitch.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from enum import StrEnum
from itertools import pairwise
from operator import itemgetter
from typing import ClassVar

from retune.adapters.midi import (
    Control,
    Event,
    Meta,
    MetaType,
    NoteOff,
    NoteOn,
    Program,
    RawMidi,
    RawTrack,
    Sysex,
    write_midi_file,
)
from retune.errors import OutputError, Place
from retune.export.base import OutputFile
from retune.export.bend import nearest_key
from retune.export.midi_channels import CHANNELS, PERCUSSION
from retune.export.midi_conductor import conductor
from retune.export.midi_mix import VOICE_OOHS
from retune.export.midi_plan import pitch_of
from retune.export.midi_text import lyric_bytes, text_bytes
from retune.export.midi_tracks import CENTRE, pan, volume
from retune.export.mts_check import check_mts
from retune.export.mts_words import FRACTION, MOST_KEYS, bulk, octave, single_notes
from retune.export.names import safe_name
from retune.export.options import require_allowed
from retune.export.ticks import Ticks, ticks_for
from retune.score.model import PartKind
from retune.score.titles import part_titles
from retune.tracks.take import Take
from retune.tuning.model import TunedNote, TunedScore

_RESET, _VOLUME, _PAN = 121, 7, 10
_RPN_MSB, _RPN_LSB, _DATA_MSB, _TUNING_PROGRAM = 101, 100, 6, 3
_GLIDE_STEPS = 5

_OFF, _SETUP, _TUNE, _LYRIC, _ON = range(5)


class Form(StrEnum):
    """Which message says the pitch."""

    SINGLE = "single"
    OCTAVE = "octave"
    BULK = "bulk"


_SUPPORT = {
    Form.SINGLE: (
        "single-note tuning changes (08 02) and tuning programs (RPN 3) must be supported; "
        "rounding error 0.0031 cents"
    ),
    Form.OCTAVE: (
        "two-byte scale/octave tuning for single channels (08 09) must be supported; rounding "
        "error 0.0061 cents, within 100 cents of each key"
    ),
    Form.BULK: (
        "bulk tuning dumps (08 01) and tuning programs (RPN 3) must be supported; held notes "
        "keep their first pitch; rounding error 0.0031 cents"
    ),
}


@dataclass(frozen=True, slots=True)
class MtsOptions:
    """Options of the exporter."""

    form: Form = field(
        default=Form.SINGLE, metadata={"help": "which message: single, octave or bulk"}
    )
    glide_ms: float = field(
        default=40.0,
        metadata={
            "help": "milliseconds in which a held note moves to a new pitch",
            "least": 0,
            "most": 1000,
        },
    )
    program: int = field(
        default=VOICE_OOHS,
        metadata={"help": "program of the voices, counting from 0", "least": 0, "most": 127},
    )


class MtsExporter:
    """Writes each take as one MIDI file with tuning messages."""

    name: ClassVar[str] = "mts"
    summary: ClassVar[str] = "MIDI with tuning messages: one channel a part, each key tuned"
    suffixes: ClassVar[tuple[str, ...]] = (".mid",)
    Options: ClassVar[type[MtsOptions]] = MtsOptions

    def export(self, takes: Sequence[Take], options: MtsOptions) -> Iterator[OutputFile]:
        """Yield a file a take.

        Raises `OutputError` for more parts than channels, or one key at two pitches at once.
        """
        require_allowed(self.name, options)
        for take in takes:
            yield _file_of(take, options)


@dataclass(frozen=True, slots=True)
class _Struck:
    """One note: ticks, key, and its pitches as (tick, pitch), the first at `on`."""

    on: int
    off: int
    key: int
    velocity: int
    lyric: str
    pitches: tuple[tuple[int, float], ...]


def _file_of(take: Take, options: MtsOptions) -> OutputFile:
    played = take.played
    score = played.score
    if not take.tuned.score.notes:
        raise OutputError("there is no note to write as MIDI", Place(score.file))
    heard = [part for part in score.parts if take.strip(part.index) is not None]
    pitched = [part for part in heard if part.kind is not PartKind.CLICK]
    if len(pitched) > len(CHANNELS):
        raise OutputError(
            f"{len(pitched)} parts need a channel each, and MIDI has {len(CHANNELS)} for pitch",
            Place(score.file),
            "Export it with --to midi, where parts can share",
        )
    channels = {part.index: channel for part, channel in zip(pitched, CHANNELS, strict=False)}
    ticks, titles = ticks_for(played), part_titles(score)
    moves = options.form is not Form.BULK
    notes: dict[int, list[_Struck]] = defaultdict(list)
    for one in played.notes:
        notes[one.note.part].append(_struck(played, one, ticks, options.glide_ms / 1000.0, moves))
    end = max([ticks.at(score.end), *(n.off for part in notes.values() for n in part)])
    tracks, messages = [], []
    for part in heard:
        channel = channels.get(part.index, PERCUSSION)
        strip = take.strip(part.index)
        assert strip is not None
        place = pan(strip.pan) if take.strips else CENTRE
        program = options.program if part.tuned or part.program is None else part.program
        setup = [*_setup(channel, program, volume(strip.gain_db), place)]
        own = sorted(notes[part.index], key=lambda note: (note.on, note.key))
        sent: list[tuple[int, bytes]] = []
        if channel != PERCUSSION:
            sent = list(_messages(own, channel, options.form, played))
            messages += [tick for tick, _ in sent]
        tracks.append(_track(titles[part.index], channel, setup, own, sent, end))
    data = write_midi_file(RawMidi(1, ticks.division, (conductor(score, ticks, end), *tracks)))
    folders = ["mts", *([safe_name(take.folder)] if take.folder else [])]
    name = f"{safe_name(take.name)} - {safe_name(score.stem)}.mid"
    minutes = max(played.seconds(score.end) / 60.0, 1e-9)
    parts = tuple(part.index for part in heard)
    return OutputFile(
        "/".join([*folders, name]),
        data,
        f"{len(pitched)} channels; {_SUPPORT[options.form]}; {len(messages):,} messages, "
        f"{len(messages) / minutes:.0f} a minute",
        lambda found: check_mts(found, played, parts, moves, options.form is Form.OCTAVE),
    )


def _struck(tuned: TunedScore, one: TunedNote, ticks: Ticks, glide: float, moves: bool) -> _Struck:
    note, tempo = one.note, tuned.score.tempo
    on = ticks.at(note.onset)
    pitches = [pitch_of(tuned, one, segment) for segment in one.segments]
    key = nearest_key(pitches[0])
    if not 0 <= key <= 127:
        raise OutputError(
            f"{note.pitch.name} is beyond the keys of MIDI, which go from C-1 to G9",
            tuned.score.place(note.onset, note.part),
            "Transpose the score, or leave the part out",
        )
    found = {on: pitches[0]}
    for (before, after), segment in zip(pairwise(pitches), one.segments[1:], strict=True):
        if before == after or not moves:
            continue
        begin, start = ticks.at(segment.onset), tempo.seconds(segment.onset)
        span = min(glide, (tempo.seconds(segment.end) - start) / 2)
        length = max(int(tempo.quarters(start + span) * ticks.division) - begin, 0)
        for step in range(1, _GLIDE_STEPS + 1):
            tick = begin + length * (step - 1) // (_GLIDE_STEPS - 1)
            found[tick] = before + (after - before) * step / _GLIDE_STEPS
    off = max(ticks.at(note.end), on + 1)
    return _Struck(on, off, key, note.velocity, note.lyric, tuple(sorted(found.items())))


def _messages(
    notes: Sequence[_Struck], channel: int, form: Form, tuned: TunedScore
) -> Iterator[tuple[int, bytes]]:
    """What a part's keys are told, where it changes."""
    wanted: dict[int, dict[int, float]] = defaultdict(dict)
    for note in notes:
        for tick, pitch in note.pitches:
            wanted[tick][note.key] = pitch
    _require_one_pitch(notes, tuned)
    write = _WRITERS[form]
    told = {key: float(key) for key in range(128)}
    for tick in sorted(wanted):
        changes = {
            key: pitch
            for key, pitch in wanted[tick].items()
            if round(pitch * FRACTION) != round(told[key] * FRACTION)
        }
        if changes:
            told |= changes
            yield from ((tick, message) for message in write(channel, changes, told))


def _single(channel: int, changes: dict[int, float], told: dict[int, float]) -> Iterator[bytes]:
    keys = list(changes)
    for begin in range(0, len(keys), MOST_KEYS):
        yield single_notes(channel, {key: changes[key] for key in keys[begin : begin + MOST_KEYS]})


def _octave(channel: int, changes: dict[int, float], told: dict[int, float]) -> Iterator[bytes]:
    """All octaves of a changed pitch class move together."""
    for key, pitch in changes.items():
        told |= {other: other + pitch - key for other in range(key % 12, 128, 12)}
    yield octave(channel, [100.0 * (told[60 + step] - 60 - step) for step in range(12)])


def _bulk(channel: int, changes: dict[int, float], told: dict[int, float]) -> Iterator[bytes]:
    yield bulk(channel, "choir", [told[key] for key in range(128)])


_WRITERS: dict[Form, Callable[[int, dict[int, float], dict[int, float]], Iterator[bytes]]] = {
    Form.SINGLE: _single,
    Form.OCTAVE: _octave,
    Form.BULK: _bulk,
}


def _require_one_pitch(notes: Sequence[_Struck], tuned: TunedScore) -> None:
    """Raise `OutputError` where a part strikes a key that it holds at another pitch."""
    held: dict[int, _Struck] = {}
    for note in notes:
        before = held.get(note.key)
        if before is not None and before.off > note.on:
            raise OutputError(
                f"one part sounds key {note.key} twice at once",
                tuned.score.place(tuned.score.bars[0].onset),
                "Export it with --to midi",
            )
        held[note.key] = note


def _setup(channel: int, program: int, level: int, place: int) -> Iterator[Event]:
    """Controllers reset first, as that may undo tunings; then the channel's tuning program."""
    yield Control(channel, _RESET, 0)
    yield Program(channel, 0 if channel == PERCUSSION else program)
    yield Control(channel, _VOLUME, level)
    yield Control(channel, _PAN, place)
    if channel != PERCUSSION:
        for controller, value in (
            (_RPN_MSB, 0),
            (_RPN_LSB, _TUNING_PROGRAM),
            (_DATA_MSB, channel),
            (_RPN_MSB, 127),
            (_RPN_LSB, 127),
        ):
            yield Control(channel, controller, value)


def _track(
    name: str,
    channel: int,
    setup: Sequence[Event],
    notes: Sequence[_Struck],
    messages: Sequence[tuple[int, bytes]],
    end: int,
) -> RawTrack:
    timed: list[tuple[int, int, Event]] = [
        (0, -1, Meta(MetaType.TRACK_NAME, text_bytes(name))),
        *((0, _SETUP, event) for event in setup),
        *((tick, _TUNE, Sysex(message)) for tick, message in messages),
    ]
    for note in notes:
        timed.append((note.on, _ON, NoteOn(channel, note.key, note.velocity)))
        timed.append((note.off, _OFF, NoteOff(channel, note.key)))
        if words := lyric_bytes(note.lyric):
            timed.append((note.on, _LYRIC, Meta(MetaType.LYRIC, words)))
    timed.sort(key=itemgetter(0, 1))
    return RawTrack(tuple((tick, event) for tick, _, event in timed), end)
