"""Which channel each note takes where keys are tuned: two notes on one channel need two keys.

Conventions
-----------
* Channels count from 0; channel 9 (the tenth) is for percussion and takes clicks alone.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field

from retune.errors import OutputError
from retune.export.midi_channels import CHANNELS, Lane, PartNeeds, agree
from retune.export.midi_plan import PlannedNote
from retune.score.model import Score

Fits = Callable[[PlannedNote, PlannedNote], bool]
"""Whether a later note may sound beside an earlier one on the same channel."""


def other_key(earlier: PlannedNote, later: PlannedNote) -> bool:
    """Every key has a pitch of its own."""
    return earlier.key != later.key


def other_class(earlier: PlannedNote, later: PlannedNote) -> bool:
    """Octaves of a key have one tuning: they fit where they want the same."""
    if earlier.key == later.key:
        return False
    return (earlier.key - later.key) % 12 != 0 or agree(earlier, later)


@dataclass(slots=True, eq=False)
class _OpenLane:
    """A channel while notes are being laid on it, in order of onset."""

    program: int
    notes: list[PlannedNote] = field(default_factory=list)
    sounding: list[PlannedNote] = field(default_factory=list)

    def takes(self, note: PlannedNote, fits: Fits) -> bool:
        self.sounding = [other for other in self.sounding if other.off > note.on]
        return all(fits(other, note) for other in self.sounding)

    def lay(self, note: PlannedNote) -> None:
        self.notes.append(note)
        self.sounding.append(note)


def lay_out(score: Score, parts: Sequence[PartNeeds], fits: Fits) -> tuple[tuple[Lane, ...], str]:
    """Every note's channel, and words on them for the user.

    A part has a channel for itself, more where it holds one key twice. Where MIDI has too few,
    parts of one program share channels; their notes are then released a tick early, as nothing
    orders one track's note-off before another's tuning at the same tick.

    Raises
    ------
    OutputError
        Even then there are too few; bar and beat are named.
    """
    own: list[_OpenLane] = []
    for part in parts:
        lanes: list[_OpenLane] = []
        for note in part.notes:
            _lane_for(note, part.program, lanes, fits).lay(note)
        own += lanes
    if len(own) <= len(CHANNELS):
        return _numbered(own), f"a channel a part, {len(own)} in all"
    programs = {note.part: part.program for part in parts for note in part.notes}
    notes = sorted(
        (note.shortened() for part in parts for note in part.notes),
        key=lambda note: (note.on, note.part, note.key),
    )
    shared: list[_OpenLane] = []
    for note in notes:
        _lane_for(note, programs[note.part], shared, fits).lay(note)
        if len(shared) > len(CHANNELS):
            raise OutputError(
                f"more notes sound here than {len(CHANNELS)} channels have keys for",
                score.place(score.notes[note.note].onset, note.part),
                "Export a score with fewer parts, or --to midi with --set midi.ports=true",
            )
    return _numbered(shared), f"the parts want {len(own)} channels and share {len(shared)}"


def _lane_for(note: PlannedNote, program: int, lanes: list[_OpenLane], fits: Fits) -> _OpenLane:
    """The first lane that takes a note; a new one where none does."""
    matching = (lane for lane in lanes if lane.program == program)
    found = next((lane for lane in matching if lane.takes(note, fits)), None)
    if found is None:
        found = _OpenLane(program)
        lanes.append(found)
    return found


def _numbered(lanes: Iterable[_OpenLane]) -> tuple[Lane, ...]:
    return tuple(
        Lane(channel, lane.program, tuple(lane.notes))
        for channel, lane in zip(CHANNELS, lanes, strict=False)
    )
