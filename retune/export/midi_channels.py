"""Which channel each note takes, so that no two notes with different bends share one.

Conventions
-----------
* Channels count from 0; channel 9 (the tenth) is for percussion and takes clicks alone.
* Two notes fit one channel while both sound if their keys differ and their bends agree.

A synth goes on bending a note's release tail after its note-off. So each part gets two
channels to alternate between while there are enough, and a note takes one whose last tail has
died away, or needs no other bend, where it can.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from enum import StrEnum
from itertools import pairwise

from retune.errors import OutputError
from retune.export.midi_plan import PlannedNote
from retune.score.model import Score

PERCUSSION = 9
CHANNELS = tuple(channel for channel in range(16) if channel != PERCUSSION)
TAIL_SECONDS = 0.25
"""How long a release tail is taken to be heard (our choice: about that of a sung sound)."""


_PER_PORT = len(CHANNELS)
_MOST_PORTS = 128
"""The port's number is one byte of seven bits."""


class Channels(StrEnum):
    """How many channels a part gets."""

    AUTO = "auto"
    TWO = "two"
    ONE = "one"


@dataclass(frozen=True, slots=True)
class PartNeeds:
    """One part's notes by onset, its program, and whether its pitch moves with the chords."""

    notes: Sequence[PlannedNote]
    program: int
    tuned: bool


@dataclass(frozen=True, slots=True)
class Lane:
    """One channel with its program and its notes by onset; `parts` are those that use it, `port`
    is the MIDI port that it belongs to."""

    channel: int
    program: int
    notes: tuple[PlannedNote, ...]
    port: int = 0

    @property
    def parts(self) -> frozenset[int]:
        """Indices of the parts whose notes are here."""
        return frozenset(note.part for note in self.notes)


@dataclass(frozen=True, slots=True)
class Allotment:
    """All channels in use, and what to tell the user about them."""

    lanes: tuple[Lane, ...]
    note: str


@dataclass(slots=True, eq=False)
class _OpenLane:
    """A channel while notes are being laid on it, in order of onset."""

    program: int
    notes: list[PlannedNote] = field(default_factory=list)
    sounding: list[PlannedNote] = field(default_factory=list)
    released: float = -1.0
    last_off: int = -1

    def takes(self, note: PlannedNote) -> bool:
        """Whether a note fits beside all that sound here at its onset."""
        still = [other for other in self.sounding if other.off > note.on]
        if len(still) < len(self.sounding):
            gone = [other for other in self.sounding if other.off <= note.on]
            self.released = max(self.released, *(other.stop for other in gone))
            self.sounding = still
        return all(other.key != note.key and agree(other, note) for other in still)

    def drags(self, note: PlannedNote) -> bool:
        """Whether the note would bend a tail that is still heard."""
        if not self.notes or self.sounding:
            return False
        moved = self.notes[-1].bends[-1][1] != note.bends[0][1]
        return moved and note.start - self.released < TAIL_SECONDS

    def lay(self, note: PlannedNote) -> None:
        self.notes.append(note)
        self.sounding.append(note)
        self.last_off = max(self.last_off, note.off)


def agree(earlier: PlannedNote, later: PlannedNote) -> bool:
    """Whether two notes want the same bends for as long as both sound."""
    if len(earlier.bends) == 1 and len(later.bends) == 1:
        return earlier.bends[0][1] == later.bends[0][1]
    end = min(earlier.off, later.off)
    held = [(tick, value) for tick, value in earlier.bends if tick < end]
    before = [value for tick, value in held if tick <= later.on]
    after = [(tick, value) for tick, value in held if tick > later.on]
    return [(later.on, before[-1]), *after] == [bend for bend in later.bends if bend[0] < end]


def _best(lanes: Iterable[_OpenLane], note: PlannedNote) -> _OpenLane | None:
    """The lane for a note: beside a chord note, else where no tail is dragged, else the one
    that has been silent longest."""
    fitting = [lane for lane in lanes if lane.takes(note)]
    return min(
        fitting,
        key=lambda lane: (not lane.sounding, lane.drags(note), lane.last_off),
        default=None,
    )


def _fewest(part: PartNeeds) -> list[_OpenLane]:
    """A part on as few channels as its notes need; a new one opens only where none fits."""
    lanes: list[_OpenLane] = []
    for note in part.notes:
        lane = _best(lanes, note)
        if lane is None:
            lane = _OpenLane(part.program)
            lanes.append(lane)
        lane.lay(note)
    return lanes


def _spread(part: PartNeeds, count: int) -> list[_OpenLane] | None:
    """A part on a given number of channels; None if its notes do not fit that way."""
    lanes = [_OpenLane(part.program) for _ in range(count)]
    for note in part.notes:
        lane = _best(lanes, note)
        if lane is None:
            return None
        lane.lay(note)
    return [lane for lane in lanes if lane.notes]


def _alternating(part: PartNeeds, tight: list[_OpenLane]) -> list[_OpenLane]:
    """Twice the channels, unless the part never bends otherwise than it began."""
    values = {value for note in part.notes for _, value in note.bends}
    if len(values) < 2:
        return tight
    return _spread(part, 2 * len(tight)) or tight


def allot(
    score: Score, parts: Sequence[PartNeeds], wish: Channels, ports: bool = False
) -> Allotment:
    """Give every note its channel.

    Parameters
    ----------
    score : Score
        Where the notes stand, for messages.
    parts : sequence of PartNeeds
        In score order.
    wish : Channels
        Two alternating channels a part (an error if there are too few), one (or as few as the
        part's own notes need), or two while they fit.
    ports : bool
        Whether parts that do not fit on the channels of one MIDI port go to further ones.

    Raises
    ------
    OutputError
        Two a part were asked for and do not fit, or more different bends sound at once than
        there are channels; bar and beat are named.
    """
    one = [_fewest(part) for part in parts]
    if wish is not Channels.ONE:
        two = [_alternating(part, tight) for part, tight in zip(parts, one, strict=True)]
        if _count(two) <= len(CHANNELS):
            return _numbered(two, "two alternating channels a part")
        if wish is Channels.TWO and ports:
            return _on_ports(score, parts, two, one)
        if wish is Channels.TWO:
            raise OutputError(
                f"two channels a part make {_count(two)}, and MIDI has {len(CHANNELS)} for pitch",
                hint="Leave out midi.channels=two; as many as fit are then used. Or allow several "
                "MIDI ports with --set midi.ports=true",
            )
        mixed = [
            wide if part.tuned else tight for part, wide, tight in zip(parts, two, one, strict=True)
        ]
        if _count(mixed) <= len(CHANNELS):
            return _numbered(mixed, "two alternating channels a voice")
    if _count(one) <= len(CHANNELS):
        return _numbered(one, "one channel a part")
    if ports:
        return _on_ports(score, parts, one if wish is Channels.ONE else two, one)
    return _shared(score, parts, _count(one))


def _on_ports(
    score: Score,
    parts: Sequence[PartNeeds],
    wide: Sequence[list[_OpenLane]],
    tight: Sequence[list[_OpenLane]],
) -> Allotment:
    """Every part with its channels on one port, the first that has room for all of them.

    A part gets the channels of `wide`, or of `tight` where those are more than a port has.
    """
    ports: list[list[Lane]] = []
    for part, most, least in zip(parts, wide, tight, strict=True):
        lanes = most if len(most) <= _PER_PORT else least
        if len(lanes) > _PER_PORT:
            raise _too_few(
                score,
                part.notes[0],
                f"this part needs {len(lanes)} channels for its different bends, and a MIDI port "
                f"has {_PER_PORT} for pitch",
            )
        room = (n for n, port in enumerate(ports) if len(port) + len(lanes) <= _PER_PORT)
        place = next(room, len(ports))
        if place == _MOST_PORTS:
            raise _too_few(
                score, part.notes[0], f"a MIDI file can name no more than {_MOST_PORTS} ports"
            )
        if place == len(ports):
            ports.append([])
        port = ports[place]
        for lane in lanes:
            port.append(Lane(CHANNELS[len(port)], lane.program, tuple(lane.notes), place))
    made = tuple(lane for port in ports for lane in port)
    words = "one channel a part" if wide is tight else "two alternating channels a part"
    return Allotment(
        made,
        f"{words}, {len(made)} in all on {len(ports)} MIDI ports, which not every program reads",
    )


def _too_few(score: Score, note: PlannedNote, what: str) -> OutputError:
    place = score.place(score.notes[note.note].onset, note.part)
    return OutputError(what, place, "Export a score with fewer parts")


def lanes_for(part: PartNeeds, wide: bool) -> list[tuple[PlannedNote, ...]]:
    """One instrument's notes by lane: as few as they need, or so many that no release is bent,
    but no more than four times as many."""
    lanes = tight = _fewest(part)
    for times in range(2, _MOST_TIMES + 1) if wide else ():
        if not any(_drags(lane.notes) for lane in lanes):
            break
        lanes = _spread(part, times * len(tight)) or lanes
    return [tuple(lane.notes) for lane in lanes]


_MOST_TIMES = 4


def _drags(notes: Sequence[PlannedNote]) -> bool:
    """Whether some note of a lane bends the release of one before it."""
    return any(
        before.off <= after.on
        and after.start - before.stop < TAIL_SECONDS
        and before.bends[-1][1] != after.bends[0][1]
        for before, after in pairwise(notes)
    )


def percussion(notes: Sequence[PlannedNote]) -> Lane:
    """The lane of clicks, on the percussion channel."""
    return Lane(PERCUSSION, 0, tuple(notes))


def _count(lanes: Sequence[Sequence[_OpenLane]]) -> int:
    return sum(len(part) for part in lanes)


def _numbered(parts: Sequence[Sequence[_OpenLane]], words: str) -> Allotment:
    lanes = [lane for part in parts for lane in part]
    numbered = tuple(
        Lane(channel, lane.program, tuple(lane.notes))
        for channel, lane in zip(CHANNELS, lanes, strict=False)
    )
    return Allotment(numbered, f"{words}, {len(lanes)} in all")


def _shared(score: Score, parts: Sequence[PartNeeds], wanted: int) -> Allotment:
    """All parts of one program together on as few channels as their bends need.

    Notes are released a tick early here: parts lie on different tracks, and nothing orders
    one track's note-off before another's bend at the same tick.
    """
    programs = {note.part: part.program for part in parts for note in part.notes}
    notes = sorted(
        (note.shortened() for part in parts for note in part.notes),
        key=lambda note: (note.on, note.part, note.key),
    )
    lanes: list[_OpenLane] = []
    for note in notes:
        program = programs[note.part]
        lane = _best((lane for lane in lanes if lane.program == program), note)
        if lane is None:
            if len(lanes) == len(CHANNELS):
                raise _overfull(score, note, lanes)
            lane = _OpenLane(program)
            lanes.append(lane)
        lane.lay(note)
    return _numbered(
        [lanes],
        f"the parts want {wanted} channels and share the {len(CHANNELS)} there are, "
        "notes with equal bends together",
    )


def _overfull(score: Score, note: PlannedNote, lanes: Sequence[_OpenLane]) -> OutputError:
    sounding = [other for lane in lanes for other in lane.sounding if other.off > note.on]
    return OutputError(
        f"{len(sounding) + 1} notes sound here, and no channel is left for their different bends: "
        f"MIDI has {len(CHANNELS)} for pitch",
        score.place(score.notes[note.note].onset, note.part),
        "Name instruments with --accompaniment, so that they share a channel, allow several MIDI "
        "ports with --set midi.ports=true, or export a score with fewer parts",
    )
