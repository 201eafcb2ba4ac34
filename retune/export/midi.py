"""The exporter `midi`: a Standard MIDI File that sounds just on every synth that obeys bends.

Format 1, a conductor track and a track a part. Each note takes the key nearest its tuned pitch
and a small bend; the bend range is set by RPN 0 on every channel, so that the file sounds alike
everywhere. What is written is read back and compared with the tuned pitches.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field, replace
from enum import StrEnum
from typing import ClassVar

from retune.adapters.midi import RawMidi, write_midi_file
from retune.errors import OutputError, Place
from retune.export.base import OutputFile
from retune.export.bend import DEFAULT_RANGE, bend_step
from retune.export.midi_channels import Channels, PartNeeds, allot, percussion
from retune.export.midi_check import check_midi
from retune.export.midi_conductor import conductor
from retune.export.midi_mix import VOICE_OOHS, file_name, mix_of, program_of, remarks, strips_of
from retune.export.midi_plan import PlannedNote, Planner, bend_scale
from retune.export.midi_return import returned, source_of
from retune.export.midi_return_check import check_returned
from retune.export.midi_tracks import part_tracks
from retune.export.options import require_allowed
from retune.export.ticks import ticks_for
from retune.score.model import PartKind
from retune.score.titles import part_titles
from retune.tracks.take import Strip, Take
from retune.tuning.model import TunedScore


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
    ports: bool = field(
        default=False,
        metadata={"help": "parts beyond 15 channels go to further MIDI ports"},
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
    parts: bool = field(
        default=False,
        metadata={"help": "also a file for each part, on one channel where it can be"},
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
            if options.parts and take.lead_in is None:
                yield from _part_files(take.tuned, options)


def _file_of(take: Take, options: MidiOptions) -> OutputFile:
    played = take.played
    score = played.score
    if not take.tuned.score.notes:
        raise OutputError("there is no note to write as MIDI", Place(score.file))
    ticks = ticks_for(played)
    strips = strips_of(take)
    scale = bend_scale(options.bend_range, "midi.bend_range=12")
    planned = Planner(played, ticks, scale, options.glide_ms / 1000.0).notes(strips)
    by_part: dict[int, list[PlannedNote]] = {index: [] for index in strips}
    for note in planned:
        by_part[note.part].append(note)
    clicks = [index for index in strips if score.parts[index].kind is PartKind.CLICK]
    needs = [
        PartNeeds(notes, program_of(score.parts[index], options.program), score.parts[index].tuned)
        for index, notes in by_part.items()
        if index not in clicks
    ]
    allotment = allot(score, needs, options.channels, options.ports)
    lanes = [*allotment.lanes, *(percussion(by_part[index]) for index in clicks)]
    end = max(ticks.at(score.end), *(note.off for note in planned))
    titles = part_titles(score)
    names = {index: titles[index] for index in strips}
    tracks = part_tracks(names, lanes, mix_of(score, strips), options.bend_range, end)
    data = write_midi_file(RawMidi(1, ticks.division, (conductor(score, ticks, end), *tracks)))
    return OutputFile(
        file_name("midi", take),
        data,
        "; ".join([allotment.note, *remarks(score, ticks)]),
        lambda found: check_midi(found, played, bend_step(options.bend_range), tuple(strips)),
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
        file_name("midi", take),
        write_midi_file(made.raw),
        made.note,
        lambda found: check_returned(found, raw, made.instruments, made.bend_range, shift),
    )


def _part_files(tuned: TunedScore, options: MidiOptions) -> Iterator[OutputFile]:
    """A file for each part alone, for synths that play one voice."""
    alone = replace(options, channels=Channels.ONE)
    for part, title in zip(tuned.score.parts, part_titles(tuned.score), strict=True):
        strips = tuple(Strip() if one is part else None for one in tuned.score.parts)
        yield _file_of(Take(tuned, title, strips=strips), alone)
