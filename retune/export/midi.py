"""The exporter `midi`: a Standard MIDI File that sounds just on every synth that obeys bends.

Format 1, a conductor track and a track a part. Each note takes the key nearest its tuned pitch
and a small bend; the bend range is set by RPN 0 on every channel, so that the file sounds alike
everywhere. What is written is read back and compared with the tuned pitches.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from enum import StrEnum
from typing import ClassVar

from retune.adapters.midi import RawMidi, write_midi_file
from retune.errors import OutputError, Place
from retune.export.base import OutputFile
from retune.export.bend import DEFAULT_RANGE
from retune.export.midi_channels import Channels, PartNeeds, allot, percussion
from retune.export.midi_check import check_midi
from retune.export.midi_conductor import conductor, slowest_tempo_lost
from retune.export.midi_plan import PlannedNote, Planner
from retune.export.midi_return import returned, source_of
from retune.export.midi_return_check import check_returned
from retune.export.midi_tracks import CENTRE, pan, part_tracks, volume
from retune.export.names import safe_name
from retune.export.options import require_allowed
from retune.export.ticks import Ticks, ticks_for
from retune.score.model import Part, PartKind, Score
from retune.score.titles import part_titles
from retune.tracks.take import Strip, Take

VOICE_OOHS = 53
"""General MIDI program of sung parts, counting from 0. Its neighbour 52, choir aahs, is up to
42 cents out of tune in a common sound font, which no just third outlives."""

_PAN_WIDTH = 16
"""Voices stand this far to either side at most: enough to tell them apart."""


class Source(StrEnum):
    """What is made of a score that came as MIDI."""

    AUTO = "auto"
    NEW = "new"


@dataclass(frozen=True, slots=True)
class MidiOptions:
    """Options of the exporter."""

    channels: Channels = field(
        default=Channels.AUTO,
        metadata={"help": "channels a part: two, one, or auto for two while they fit"},
    )
    bend_range: int = field(
        default=DEFAULT_RANGE,
        metadata={"help": "pitch bend range in semitones", "least": 1, "most": 24},
    )
    glide_ms: float = field(
        default=40.0,
        metadata={
            "help": "milliseconds in which a held note moves to a new pitch",
            "least": 0,
            "most": 1000,
        },
    )
    source: Source = field(
        default=Source.AUTO,
        metadata={"help": "auto gives a MIDI file back as it came, retuned; new writes it anew"},
    )
    program: int = field(
        default=VOICE_OOHS,
        metadata={
            "help": "General MIDI program of the voices, counting from 0",
            "least": 0,
            "most": 127,
        },
    )


class MidiExporter:
    """Writes each take as one MIDI file."""

    name: ClassVar[str] = "midi"
    summary: ClassVar[str] = "MIDI with pitch bend on a channel or two a part; plays on any synth"
    suffixes: ClassVar[tuple[str, ...]] = (".mid",)
    Options: ClassVar[type[MidiOptions]] = MidiOptions

    def export(self, takes: Sequence[Take], options: MidiOptions) -> Iterator[OutputFile]:
        """Yield a file a take.

        Raises
        ------
        OutputError
            More different bends sound at once than MIDI has channels, or a pitch is beyond
            its keys; bar and beat are named.
        WishError
            An option is out of its range.
        """
        require_allowed(self.name, options)
        for take in takes:
            yield _returned_file(take, options) or _file_of(take, options)


def _file_of(take: Take, options: MidiOptions) -> OutputFile:
    played = take.played
    score = played.score
    if not take.tuned.score.notes:
        raise OutputError("there is no note to write as MIDI", Place(score.file))
    ticks = ticks_for(played)
    strips = _strips(take)
    planned = Planner(played, ticks, options.bend_range, options.glide_ms / 1000.0).notes(strips)
    by_part: dict[int, list[PlannedNote]] = {index: [] for index in strips}
    for note in planned:
        by_part[note.part].append(note)
    clicks = [index for index in strips if score.parts[index].kind is PartKind.CLICK]
    needs = [
        PartNeeds(notes, _program(score.parts[index], options.program), score.parts[index].tuned)
        for index, notes in by_part.items()
        if index not in clicks
    ]
    allotment = allot(score, needs, options.channels)
    lanes = [*allotment.lanes, *(percussion(by_part[index]) for index in clicks)]
    end = max(ticks.at(score.end), *(note.off for note in planned))
    titles = part_titles(score)
    names = {index: titles[index] for index in strips}
    tracks = part_tracks(names, lanes, _mix(score, strips), options.bend_range, end)
    data = write_midi_file(RawMidi(1, ticks.division, (conductor(score, ticks, end), *tracks)))
    return OutputFile(
        _file_name(take),
        data,
        "; ".join([allotment.note, *_remarks(score, ticks)]),
        lambda found: check_midi(found, played, options.bend_range, tuple(strips)),
    )


def _returned_file(take: Take, options: MidiOptions) -> OutputFile | None:
    """The user's own MIDI file, retuned; None where the score did not come as one."""
    if take.lead_in is not None or take.strips or options.source is Source.NEW:
        return None
    tuned = take.tuned
    raw = source_of(tuned)
    if raw is None:
        return None
    made = returned(tuned, raw, options.bend_range, options.glide_ms / 1000.0, options.channels)
    shift = tuned.score.transposition.semitones
    return OutputFile(
        _file_name(take),
        write_midi_file(made.raw),
        made.note,
        lambda found: check_returned(found, raw, made.instruments, made.bend_range, shift),
    )


def _strips(take: Take) -> dict[int, Strip]:
    """How each part that sounds stands in the mix, by part."""
    found = {part.index: take.strip(part.index) for part in take.played.score.parts}
    return {index: strip for index, strip in found.items() if strip is not None}


def _mix(score: Score, strips: dict[int, Strip]) -> dict[int, tuple[int, int]]:
    """Volume and pan of each part as MIDI has them."""
    plain = all(strip == Strip() for strip in strips.values())
    pans = dict(enumerate(_pans(score))) if plain else {}
    return {
        index: (volume(strip.gain_db), pans.get(index, pan(strip.pan)))
        for index, strip in strips.items()
    }


def _program(part: Part, voices: int) -> int:
    """The file's own program for instruments; singers get one that is in tune."""
    return voices if part.tuned or part.program is None else part.program


def _pans(score: Score) -> list[int]:
    """Voices from left to right in score order, accompaniment in the middle."""
    voices = [part.index for part in score.parts if part.tuned]
    pans = [CENTRE] * len(score.parts)
    if len(voices) > 1:
        for place, index in enumerate(voices):
            pans[index] = CENTRE - _PAN_WIDTH + 2 * _PAN_WIDTH * place // (len(voices) - 1)
    return pans


def _remarks(score: Score, ticks: Ticks) -> Iterator[str]:
    """What the file states less exactly than the score does."""
    if ticks.error:
        microseconds = 1e6 * float(ticks.error) * 60.0 / float(score.tempo.changes[0].qpm)
        yield f"onsets within {microseconds:.0f} microseconds, as no MIDI division holds them all"
    if slowest_tempo_lost(score):
        yield "a tempo under 3.6 quarter notes a minute is written as 3.6, the slowest there is"


def _file_name(take: Take) -> str:
    folders = ["midi", *([safe_name(take.folder)] if take.folder else [])]
    stem = safe_name(take.tuned.score.stem)
    return "/".join([*folders, f"{safe_name(take.name)} - {stem}.mid"])
