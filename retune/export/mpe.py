"""The exporter `mpe`: MIDI Polyphonic Expression, lower zone (M1-100-UM v1.1).

Each note sounds on a member channel of its own with its own bend, so that a piece of any texture
plays exactly on an instrument that supports MPE. The zone is one instrument: it has one sound, and
all parts stand in one track, as nothing orders one track's set-up before another's notes.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from operator import itemgetter
from typing import ClassVar

from retune.adapters.midi import (
    Bend,
    Control,
    Event,
    Meta,
    MetaType,
    NoteOff,
    NoteOn,
    Program,
    RawMidi,
    RawTrack,
    write_midi_file,
)
from retune.adapters.midi_marker import range_setup
from retune.errors import OutputError, Place
from retune.export.base import OutputFile
from retune.export.bend import MIDDLE, bend_step
from retune.export.midi_check import check_midi
from retune.export.midi_conductor import conductor
from retune.export.midi_mix import VOICE_OOHS
from retune.export.midi_plan import PlannedNote, Planner
from retune.export.midi_text import lyric_bytes, text_bytes
from retune.export.names import safe_name
from retune.export.options import require_allowed
from retune.export.ticks import ticks_for
from retune.score.model import PartKind, Score
from retune.tracks.take import Take

MANAGER = 0
_RPN_MSB, _RPN_LSB, _DATA_MSB, _MPE = 101, 100, 6, 6
_RESET, _VOLUME, _FULL = 121, 7, 100

_OFF, _SETUP, _BEND, _LYRIC, _ON = range(5)


@dataclass(frozen=True, slots=True)
class MpeOptions:
    """Options of the exporter."""

    members: int = field(
        default=15,
        metadata={"help": "member channels, from channel 2 up", "least": 1, "most": 15},
    )
    bend_range: int = field(
        default=48,
        metadata={"help": "bend range of the members in semitones", "least": 1, "most": 96},
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
        metadata={"help": "program of the zone, counting from 0", "least": 0, "most": 127},
    )


class MpeExporter:
    """Writes each take as one MPE file."""

    name: ClassVar[str] = "mpe"
    summary: ClassVar[str] = "MPE for one instrument: each note on a channel of its own"
    suffixes: ClassVar[tuple[str, ...]] = (".mid",)
    Options: ClassVar[type[MpeOptions]] = MpeOptions

    def export(self, takes: Sequence[Take], options: MpeOptions) -> Iterator[OutputFile]:
        """Yield a file a take.

        Raises `OutputError` where more notes sound than there are members, naming bar and beat.
        """
        require_allowed(self.name, options)
        for take in takes:
            yield _file_of(take, options)


def _file_of(take: Take, options: MpeOptions) -> OutputFile:
    played = take.played
    score = played.score
    if not take.tuned.score.notes:
        raise OutputError("there is no note to write as MPE", Place(score.file))
    parts = tuple(
        part.index
        for part in score.parts
        if take.strip(part.index) is not None and part.kind is not PartKind.CLICK
    )
    ticks = ticks_for(played)
    planned = Planner(played, ticks, options.bend_range, options.glide_ms / 1000.0).notes(parts)
    members = _allotted(score, planned, range(1, options.members + 1))
    end = max([ticks.at(score.end), *(note.off for note in planned)])
    track = _track(members, options, end)
    data = write_midi_file(RawMidi(1, ticks.division, (conductor(score, ticks, end), track)))
    folders = ["mpe", *([safe_name(take.folder)] if take.folder else [])]
    name = f"{safe_name(take.name)} - {safe_name(score.stem)}.mid"
    clicks = any(part.kind is PartKind.CLICK for part in score.parts)
    return OutputFile(
        "/".join([*folders, name]),
        data,
        f"lower zone, {options.members} members, {len(members)} used; the instrument must support "
        f"MPE, or a bend range of {options.bend_range} semitones on each channel; steps of "
        f"{bend_step(options.bend_range):.3f} cents" + ("; without click" if clicks else ""),
        lambda found: check_midi(found, played, options.bend_range, parts, one_track=True),
    )


@dataclass(slots=True)
class _Member:
    """A member channel while notes are allotted, in order of onset."""

    channel: int
    notes: list[PlannedNote] = field(default_factory=list)
    released: int = -1
    last_key: int = -1

    def active(self, tick: int) -> int:
        """How many notes sound here at a tick."""
        return sum(note.off > tick for note in self.notes[-8:])


def _allotted(
    score: Score, notes: Sequence[PlannedNote], channels: range
) -> dict[int, list[PlannedNote]]:
    """Each note's channel by the specification's appendix A.3: the one with the fewest notes,
    of these the one that last played the key, else the one released longest ago."""
    members = [_Member(channel) for channel in channels]
    for note in notes:
        best = min(
            members,
            key=lambda one: (one.active(note.on), one.last_key != note.key, one.released),
        )
        if best.active(note.on):
            raise OutputError(
                f"more than {len(members)} notes sound at once, and MPE has a channel for each",
                score.place(score.notes[note.note].onset, note.part),
                "Export it with --to midi, where notes that need the same bend share a channel",
            )
        best.notes.append(note)
        best.released = max(best.released, note.off)
        best.last_key = note.key
    return {one.channel: one.notes for one in members if one.notes}


def _track(members: dict[int, list[PlannedNote]], options: MpeOptions, end: int) -> RawTrack:
    timed: list[tuple[int, int, Event]] = [
        (0, -1, Meta(MetaType.TRACK_NAME, text_bytes("Choir"))),
        *((0, _SETUP, event) for event in _setup(options)),
    ]
    for channel, notes in members.items():
        bend = MIDDLE
        for note in notes:
            for tick, value in note.bends:
                if value != bend:
                    timed.append((tick, _BEND, Bend(channel, value)))
                    bend = value
            if words := lyric_bytes(note.lyric):
                timed.append((note.on, _LYRIC, Meta(MetaType.LYRIC, words)))
            timed.append((note.on, _ON, NoteOn(channel, note.key, note.velocity)))
            timed.append((note.off, _OFF, NoteOff(channel, note.key)))
    timed.sort(key=itemgetter(0, 1))
    return RawTrack(tuple((tick, event) for tick, _, event in timed), end)


def _setup(options: MpeOptions) -> Iterator[Event]:
    """The configuration message first, as it resets all else; then every member's bend range."""
    yield Control(MANAGER, _RESET, 0)
    for controller, value in ((_RPN_MSB, 0), (_RPN_LSB, _MPE), (_DATA_MSB, options.members)):
        yield Control(MANAGER, controller, value)
    for controller in (_RPN_MSB, _RPN_LSB):
        yield Control(MANAGER, controller, 127)
    yield Program(MANAGER, options.program)
    yield Control(MANAGER, _VOLUME, _FULL)
    for channel in range(1, options.members + 1):
        yield from range_setup(channel, options.bend_range)
