"""Which member channel of an MPE zone each note takes (M1-100-UM v1.1, appendix A.3)."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from retune.errors import OutputError
from retune.export.midi_channels import agree
from retune.export.midi_plan import PlannedNote
from retune.score.model import Score


@dataclass(slots=True, eq=False)
class Member:
    """A member channel while notes are allotted, in order of onset."""

    channel: int
    notes: list[PlannedNote] = field(default_factory=list)
    sounding: list[PlannedNote] = field(default_factory=list)
    released: int = -1

    def until(self, tick: int) -> None:
        """Let go of what has ended by a tick."""
        if gone := [note.off for note in self.sounding if note.off <= tick]:
            self.released = max(self.released, *gone)
            self.sounding = [note for note in self.sounding if note.off > tick]

    def takes(self, note: PlannedNote) -> bool:
        """Whether a note fits beside all that sound here: another key, the same bends."""
        return all(other.key != note.key and agree(other, note) for other in self.sounding)

    def rank(self, note: PlannedNote) -> tuple[int, bool, int]:
        """The fewest notes; of these, the one that last played the key, then the one released
        longest ago."""
        return len(self.sounding), not self._played_last(note.key), self.released

    def lay(self, note: PlannedNote) -> None:
        """Put a note here."""
        self.notes.append(note)
        self.sounding.append(note)

    def _played_last(self, key: int) -> bool:
        return bool(self.notes) and self.notes[-1].key == key


@dataclass(frozen=True, slots=True)
class Members:
    """The notes of each member channel in use, by onset, and how many notes share one."""

    notes: dict[int, tuple[PlannedNote, ...]]
    shared: int


def allotted(score: Score, notes: Sequence[PlannedNote], channels: Sequence[int]) -> Members:
    """Give every note its member channel.

    Each note gets a channel for itself if that can be had all through the piece; else notes that
    need the very same bends share one, which is the least change of pitch there is: none.

    Raises
    ------
    OutputError
        More different bends are wanted at once than there are members; bar and beat are named.
    """
    try:
        return _laid(score, notes, channels, sparing=False)
    except OutputError:
        return _laid(score, notes, channels, sparing=True)


def _laid(
    score: Score, notes: Sequence[PlannedNote], channels: Sequence[int], sparing: bool
) -> Members:
    """Every note on its channel; `sparing` shares wherever bends agree, so that channels are
    left for the notes to come."""
    members = [Member(channel) for channel in channels]
    shared = 0
    for note in notes:
        for member in members:
            member.until(note.on)
        fitting = [member for member in members if member.takes(note)]
        if sparing:
            fitting = [member for member in fitting if member.sounding] or fitting
        best = min(fitting, key=lambda member: member.rank(note), default=None)
        if best is None:
            raise _overfull(score, note, members)
        shared += bool(best.sounding)
        best.lay(note)
    return Members({one.channel: tuple(one.notes) for one in members if one.notes}, shared)


def _overfull(score: Score, note: PlannedNote, members: Sequence[Member]) -> OutputError:
    sounding = sum(len(member.sounding) for member in members) + 1
    channels = "15 members are" if len(members) == 15 else f"mpe.members={len(members)} is"
    return OutputError(
        f"{sounding} notes sound here, and no member channel is left for their different bends: "
        f"{channels} too few",
        score.place(score.notes[note.note].onset, note.part),
        "Export the score with --to mts, where every key has a pitch of its own"
        if len(members) == 15
        else "Allow more with --set mpe.members=15",
    )
