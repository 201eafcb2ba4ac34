"""The exporter `mpe`: MIDI Polyphonic Expression, lower zone (M1-100-UM v1.1).

Each note sounds on a member channel of its own with its own bend, so that a piece of any texture
plays exactly on an instrument that supports MPE. The zone is one instrument: it has one sound, and
all parts stand in one track, as nothing orders one track's set-up before another's notes. Levels
of parts become velocities, since volume too is the zone's.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from itertools import chain
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
from retune.export.midi_channels import PERCUSSION
from retune.export.midi_check import check_midi
from retune.export.midi_conductor import conductor
from retune.export.midi_mix import VOICE_OOHS, file_name, program_of, remarks, strips_of
from retune.export.midi_plan import PlannedNote, Planner, bend_scale
from retune.export.midi_text import lyric_bytes, text_bytes
from retune.export.midi_tracks import CENTRE
from retune.export.mpe_members import Members, allotted
from retune.export.mpe_receiver import MANAGER, heard_in_zone
from retune.export.options import require_allowed
from retune.export.ticks import Ticks, ticks_for
from retune.score.model import PartKind, Score
from retune.score.titles import part_titles
from retune.tracks.take import Strip, Take
from retune.tuning.model import TunedScore

_RPN_MSB, _RPN_LSB, _DATA_MSB, _MPE = 101, 100, 6, 6
_RESET, _VOLUME, _PAN, _FULL = 121, 7, 10, 100
_ZONE_TRACK, _CLICK_TRACK = 1, 2
"""After the conductor's."""

_OFF, _SETUP, _BEND, _LYRIC, _ON = range(5)
_Timed = tuple[int, int, Event]
"""Tick, rank among the events of that tick, event."""


@dataclass(frozen=True, slots=True)
class MpeOptions:
    """Options of the exporter."""

    members: int = field(
        default=15,
        metadata={
            "help": "member channels, from channel 2 up; clicks sound with 8 or fewer",
            "least": 1,
            "most": 15,
        },
    )
    bend_range: int = field(
        default=48,
        metadata={
            "help": "bend range of the members in semitones",
            "least": 1,
            "most": 96,
        },
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
        metadata={
            "help": "General MIDI program of the zone, counting from 0",
            "least": 0,
            "most": 127,
        },
    )


class MpeExporter:
    """Writes each take as one MPE file."""

    name: ClassVar[str] = "mpe"
    summary: ClassVar[str] = "MPE for one instrument: each note on a channel of its own"
    suffixes: ClassVar[tuple[str, ...]] = (".mid",)
    Options: ClassVar[type[MpeOptions]] = MpeOptions

    def export(self, takes: Sequence[Take], options: MpeOptions) -> Iterator[OutputFile]:
        """Yield a file a take.

        Raises
        ------
        OutputError
            More different bends sound at once than there are members, or a pitch is beyond the
            keys of MIDI; bar and beat are named.
        WishError
            An option is out of its range.
        """
        require_allowed(self.name, options)
        for take in takes:
            yield _file_of(take, options)


def _file_of(take: Take, options: MpeOptions) -> OutputFile:
    played = take.played
    score = played.score
    if not take.tuned.score.notes:
        raise OutputError("there is no note to write as MPE", Place(score.file))
    strips, ticks = strips_of(take), ticks_for(played)
    tracks = _tracks_of(score, strips, options.members)
    scale = bend_scale(options.bend_range, "mpe.bend_range=48")
    planner = Planner(played, ticks, scale, options.glide_ms / 1000.0)
    planned = [_levelled(note, strips[note.part]) for note in planner.notes(tracks)]
    notes = [note for note in planned if tracks[note.part] == _ZONE_TRACK]
    clicks = [note for note in planned if tracks[note.part] == _CLICK_TRACK]
    members = allotted(score, notes, range(1, options.members + 1))
    end = max([ticks.at(score.end), *(note.off for note in planned)])
    made = [conductor(score, ticks, end), _zone(take.name, members, options, end)]
    if clicks:
        made.append(_click_track(clicks, end))
    data = write_midi_file(RawMidi(1, ticks.division, tuple(made)))
    return OutputFile(
        file_name("mpe", take),
        data,
        "; ".join(_words(score, ticks, strips, members, options)),
        lambda found: _checked(found, played, options.bend_range, tracks),
    )


def _tracks_of(score: Score, strips: Mapping[int, Strip], members: int) -> dict[int, int]:
    """The track of each part that sounds; clicks have none where their channel is a member's."""
    return {
        index: _CLICK_TRACK if score.parts[index].kind is PartKind.CLICK else _ZONE_TRACK
        for index in strips
        if score.parts[index].kind is not PartKind.CLICK or members < PERCUSSION
    }


def _checked(found: bytes, tuned: TunedScore, bend_range: int, tracks: Mapping[int, int]) -> str:
    """The file as an MPE instrument plays it, and as a synth does that obeys RPN 0 alone."""
    step = bend_step(bend_range)
    check_midi(found, tuned, step, tracks=tracks, receive=heard_in_zone)
    return check_midi(found, tuned, step, tracks=tracks)


def _levelled(note: PlannedNote, strip: Strip) -> PlannedNote:
    """A note as loud as its part stands in the mix: 40 log10 of velocity, as of volume."""
    loud = round(note.velocity * math.pow(10.0, strip.gain_db / 40.0))
    return replace(note, velocity=min(max(loud, 1), 127))


def _words(
    score: Score,
    ticks: Ticks,
    strips: Mapping[int, Strip],
    members: Members,
    options: MpeOptions,
) -> Iterator[str]:
    """What the user should know of the file."""
    step = bend_step(options.bend_range)
    yield f"lower zone of {options.members} members, {len(members.notes)} used"
    yield (
        f"rounding error up to {step / 2:.4f} cents; the instrument must support MPE, or a bend "
        f"range of {options.bend_range} semitones on each channel"
    )
    if members.shared:
        yield f"{members.shared:,} notes share a member with others of the same bend"
    parts, titles = [score.parts[index] for index in strips], part_titles(score)
    pitched = [part for part in parts if part.kind is not PartKind.CLICK]
    others = [p for p in pitched if program_of(p, options.program) != options.program]
    if others:
        names = ", ".join(titles[part.index] for part in others)
        yield f"a zone has one sound, so {names} has that of the voices"
    if any(strip.pan for strip in strips.values()):
        yield "a zone has one place, so all parts are in the middle"
    if len(pitched) < len(parts) and options.members >= PERCUSSION:
        yield "without clicks, whose channel is a member; mpe.members=8 has them"
    yield from remarks(score, ticks)


def _zone(name: str, members: Members, options: MpeOptions, end: int) -> RawTrack:
    timed: list[_Timed] = [
        (0, -1, Meta(MetaType.TRACK_NAME, text_bytes(name))),
        *((0, _SETUP, event) for event in _setup(options)),
    ]
    for channel, notes in members.notes.items():
        bend = MIDDLE
        wanted = chain.from_iterable(note.bends for note in notes)
        for tick, value in sorted(wanted, key=itemgetter(0)):
            if value != bend:
                timed.append((tick, _BEND, Bend(channel, value)))
                bend = value
        for note in notes:
            timed += _struck(note, channel)
    timed += _lyrics(members)
    return _track(timed, end)


def _setup(options: MpeOptions) -> Iterator[Event]:
    """The configuration message first, as it resets all else; then every member's bend range."""
    yield Control(MANAGER, _RESET, 0)
    for controller, value in (
        (_RPN_MSB, 0),
        (_RPN_LSB, _MPE),
        (_DATA_MSB, options.members),
        (_RPN_MSB, 127),
        (_RPN_LSB, 127),
    ):
        yield Control(MANAGER, controller, value)
    yield Program(MANAGER, options.program)
    yield Control(MANAGER, _VOLUME, _FULL)
    yield Control(MANAGER, _PAN, CENTRE)
    for channel in range(1, options.members + 1):
        yield from range_setup(channel, options.bend_range)


def _struck(note: PlannedNote, channel: int) -> Iterator[_Timed]:
    yield note.on, _ON, NoteOn(channel, note.key, note.velocity)
    yield note.off, _OFF, NoteOff(channel, note.key)


def _lyrics(members: Members) -> Iterator[_Timed]:
    """Words of the first part that has any: those of several at once cannot be read."""
    sung = [
        (note.part, note.on, words)
        for note in chain.from_iterable(members.notes.values())
        if (words := lyric_bytes(note.lyric))
    ]
    first = min((part for part, _, _ in sung), default=None)
    for part, tick, words in sung:
        if part == first:
            yield tick, _LYRIC, Meta(MetaType.LYRIC, words)


def _click_track(clicks: Sequence[PlannedNote], end: int) -> RawTrack:
    timed: list[_Timed] = [(0, -1, Meta(MetaType.TRACK_NAME, b"Click"))]
    timed += chain.from_iterable(_struck(note, PERCUSSION) for note in clicks)
    return _track(timed, end)


def _track(timed: list[_Timed], end: int) -> RawTrack:
    timed.sort(key=itemgetter(0, 1))
    return RawTrack(tuple((tick, event) for tick, _, event in timed), end)
