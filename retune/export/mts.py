"""The exporter `mts`: MIDI whose notes are tuned by tuning messages instead of bends.

A key is told its pitch before it is struck, where that changes: equal tunings are not sent again.
As every key has its own pitch, a chord of any size fits one channel, and no release is bent by the
note that follows. What is written is read back by a receiver of the specification (MIDI Tuning
Updated Specification, CA-020, CA-021, RP-020) and compared with the tuned pitches.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field, replace
from enum import StrEnum
from fractions import Fraction
from typing import ClassVar

from retune.adapters.midi import RawMidi, write_midi_file
from retune.errors import OutputError, Place
from retune.export.base import OutputFile
from retune.export.midi_channels import Lane, PartNeeds, percussion
from retune.export.midi_check import check_midi
from retune.export.midi_conductor import conductor
from retune.export.midi_mix import VOICE_OOHS, file_name, mix_of, program_of, remarks, strips_of
from retune.export.midi_plan import PlannedNote, Planner, Scale
from retune.export.mts_channels import lay_out, other_class, other_key
from retune.export.mts_messages import Tables, octave_messages, single_messages, tables
from retune.export.mts_receiver import heard_by_tuning
from retune.export.mts_tracks import tuned_tracks
from retune.export.mts_words import (
    FRACTION,
    HIGHEST,
    OCTAVE_STEP,
    WORD_STEP,
    octave_value,
    word_value,
)
from retune.export.options import require_allowed
from retune.export.ticks import Ticks, ticks_for
from retune.score.model import PartKind, Score
from retune.score.titles import part_titles
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.units import reference_offset

_PACE = 0.01
"""Least time between two steps of a glide: a single-note message takes four milliseconds of a
MIDI cable."""


class Form(StrEnum):
    """Which message says the pitch."""

    SINGLE = "single"
    OCTAVE = "octave"
    BULK = "bulk"


_NEEDS = {
    Form.SINGLE: "single-note tuning changes (08 02) and tuning programs (RPN 3)",
    Form.OCTAVE: "two-byte scale/octave tuning of single channels (08 09)",
    Form.BULK: "bulk tuning dumps (08 01) and tuning programs (RPN 3)",
}


@dataclass(frozen=True, slots=True)
class MtsOptions:
    """Options of the exporter."""

    form: Form = field(
        default=Form.SINGLE,
        metadata={"help": "single keys, octave for a scale a channel, or bulk for whole tables"},
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
            "help": "General MIDI program of the voices, counting from 0",
            "least": 0,
            "most": 127,
        },
    )


class MtsExporter:
    """Writes each take as one MIDI file with tuning messages."""

    name: ClassVar[str] = "mts"
    summary: ClassVar[str] = "MIDI with tuning messages: one channel a part, each key tuned"
    suffixes: ClassVar[tuple[str, ...]] = (".mid",)
    Options: ClassVar[type[MtsOptions]] = MtsOptions

    def export(self, takes: Sequence[Take], options: MtsOptions) -> Iterator[OutputFile]:
        """Yield a file a take.

        Raises
        ------
        OutputError
            There are too few channels, or a pitch is beyond what the message can say; bar and
            beat are named.
        WishError
            An option is out of its range.
        """
        require_allowed(self.name, options)
        for take in takes:
            yield _file_of(take, options)


def _file_of(take: Take, options: MtsOptions) -> OutputFile:
    played = take.played
    score = played.score
    if not take.tuned.score.notes:
        raise OutputError("there is no note to write as MIDI", Place(score.file))
    obeyed = played if options.form is not Form.BULK else _unmoved(played)
    ticks, strips, form = ticks_for(played), strips_of(take), options.form
    planned = Planner(obeyed, ticks, _scale(form), options.glide_ms / 1000.0).notes(strips)
    by_part: dict[int, list[PlannedNote]] = {index: [] for index in strips}
    for note in planned:
        by_part[note.part].append(note)
    clicks = [index for index in strips if score.parts[index].kind is PartKind.CLICK]
    needs = [
        PartNeeds(notes, program_of(score.parts[index], options.program), score.parts[index].tuned)
        for index, notes in by_part.items()
        if index not in clicks
    ]
    lanes, words = lay_out(score, needs, other_class if form is Form.OCTAVE else other_key)
    if form is not Form.OCTAVE:
        _require_words(score, lanes)
    made = _messages(played, lanes, form)
    end = max([ticks.at(score.end), *(note.off for note in planned)])
    titles = part_titles(score)
    tracks = tuned_tracks(
        {index: titles[index] for index in strips},
        [*lanes, *(percussion(by_part[index]) for index in clicks)],
        mix_of(score, strips),
        made,
        end,
        programs=form is Form.SINGLE,
    )
    data = write_midi_file(RawMidi(1, ticks.division, (conductor(score, ticks, end), *tracks)))
    step = OCTAVE_STEP if form is Form.OCTAVE else WORD_STEP
    notes = [words, *_density(played, made, ticks), *_support(played, form, step)]
    return OutputFile(
        file_name("mts", take),
        data,
        "; ".join([*notes, *remarks(score, ticks)]),
        lambda found: check_midi(found, obeyed, step, tuple(strips), receive=heard_by_tuning),
    )


def _scale(form: Form) -> Scale:
    """How the form says how far a pitch is from its key."""
    if form is Form.OCTAVE:
        return Scale(
            octave_value,
            -100.0,
            100.0 - OCTAVE_STEP,
            "scale/octave tuning reaches 100 cents",
            "Leave out mts.form=octave",
            _PACE,
        )
    # As far as the keys of MIDI go; `_require_words` has the ends.
    return Scale(word_value, -12_800.0, 12_800.0, "MIDI has 128 keys", "Transpose it", _PACE)


def _require_words(score: Score, lanes: Sequence[Lane]) -> None:
    """Raise `OutputError` for a pitch below the lowest frequency word or above the highest."""
    for note in (note for lane in lanes for note in lane.notes):
        if any(not 0 <= note.key * FRACTION + value <= HIGHEST for _, value in note.bends):
            origin = score.notes[note.note]
            raise OutputError(
                f"{origin.pitch.name} is beyond the pitches that a tuning message can say",
                score.place(origin.onset, note.part),
                "Transpose the score, or leave the part out",
            )


def _messages(tuned: TunedScore, lanes: Sequence[Lane], form: Form) -> Tables:
    """What the channels are told, by the form chosen."""
    if form is Form.BULK:
        ground = word_value(reference_offset(tuned.policy.reference_hz))
        return tables(lanes, ground)
    write = octave_messages if form is Form.OCTAVE else single_messages
    return Tables((), tuple(told for lane in lanes for told in write(lane)))


def _unmoved(tuned: TunedScore) -> TunedScore:
    """The score as it sounds where held notes keep the pitch that they began with."""
    notes = [
        replace(one, segments=tuple(replace(s, cents=one.segments[0].cents) for s in one.segments))
        for one in tuned.notes
    ]
    return replace(tuned, notes=tuple(notes))


def _density(tuned: TunedScore, made: Tables, ticks: Ticks) -> Iterator[str]:
    """How many messages there are, and how many in the busiest minute."""
    if made.dumps:
        more = f", {made.later:,} more on the way" if made.later else ""
        yield f"{len(made.dumps)} tables of 408 bytes at the start{more}"
    if not made.told:
        yield "no message, as all keys stand where they are"
        return
    times = sorted(tuned.seconds(Fraction(told.tick, ticks.division)) for told in made.told)
    first, most = 0, 0
    for last, time in enumerate(times):
        while times[first] <= time - 60.0:
            first += 1
        most = max(most, last - first + 1)
    what = "selections of a table" if made.dumps else "messages"
    yield f"{len(times):,} {what}, at most {most:,} in a minute"


def _support(tuned: TunedScore, form: Form, step: float) -> Iterator[str]:
    """What the synth must know, and how near it then is."""
    yield f"the synth must know {_NEEDS[form]}"
    yield f"rounding error up to {step / 2:.4f} cents"
    if form is Form.BULK:
        moved = max(
            abs(s.cents - one.segments[0].cents) for one in tuned.notes for s in one.segments
        )
        if moved:
            yield f"held notes stay where they began, up to {moved:.1f} cents from their tuning"
