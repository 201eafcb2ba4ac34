"""A MIDI file given back as it came, only retuned.

Every event stays in its track at its tick: tempo, metre, words, programs, controllers, pedals,
aftertouch, system exclusive messages, the drum channel. What is added: bends, the setting of the
bend range on each channel that is bent, a marker that says so; notes that need another bend than
their neighbours move to a free channel, and whatever their instrument is told goes there too. An
instrument's own bends are kept: the tuning is added to them.

Conventions
-----------
* Ticks are those of the file. An instrument is one channel of one track.
* Tuning is in cents from the note's key, the reference pitch included.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

from retune.adapters.midi import (
    Bend,
    ChannelPressure,
    Control,
    Event,
    KeyPressure,
    NoteOff,
    NoteOn,
    Program,
    RawMidi,
    read_midi_file,
)
from retune.errors import OutputError, Place
from retune.export.bend import bend_cents
from retune.export.midi_channels import CHANNELS, Channels, PartNeeds, lanes_for
from retune.export.midi_plan import PlannedNote, pitch_of
from retune.export.midi_return_tracks import Instrument, Knob, retuned_track
from retune.limits import Limits
from retune.score.midi.conductor import conductor_of, ticks_per_quarter
from retune.score.midi.notes import PlayedNote, played_notes
from retune.score.midi.streams import last_key
from retune.score.midi.undo import as_before
from retune.score.tempo import TempoChange, TempoMap
from retune.tuning.model import TunedNote, TunedScore

_FINE = 1000
"""Parts of a cent in which tunings are compared."""

_NEAR = Fraction(1, 8)
"""Quarter notes by which a note may have been moved for the analysis."""

_GLIDE_STEPS = 8
_RANGES = (2, 4, 12, 24, 48, 96)
_RPN_MSB, _RPN_LSB, _DATA_MSB, _DATA_LSB, _RESET = 101, 100, 6, 38, 121


@dataclass(frozen=True, slots=True)
class Returned:
    """The file, the bend range in semitones, and what to tell the user."""

    raw: RawMidi
    bend_range: int
    note: str
    instruments: tuple[Instrument, ...]


def source_of(tuned: TunedScore) -> RawMidi | None:
    """The MIDI file that a score was read from, if it is played as it stands there.

    None for other formats, excerpts, another tempo, and format 2.
    """
    score = tuned.score
    if score.format != "midi" or not score.source:
        return None
    raw = as_before(read_midi_file(score.source, _no_limits(score.source)))
    if raw.format == 2:
        return None
    clock = ticks_per_quarter(raw.division)
    played = _pressed(raw)
    for one in tuned.notes:
        press = played.get(one.note.sources[0]) if one.note.sources else None
        if press is None or abs(press.onset / clock - one.note.onset) > _NEAR:
            return None
    changes = sorted(conductor_of(raw).tempos.items())
    tempo = TempoMap(tuple(TempoChange(onset, qpm) for onset, qpm in changes))
    end = max((note.end for note in score.notes), default=Fraction(0))
    same = abs(tempo.seconds(end) - score.tempo.seconds(end)) < 1e-6
    return raw if same and tuned.notes else None


def _no_limits(data: bytes) -> Limits:
    return Limits(max_bytes=len(data), max_notes=len(data))


def _pressed(raw: RawMidi) -> dict[str, PlayedNote]:
    last = last_key(raw)
    return {
        note.source: note
        for number, track in enumerate(raw.tracks)
        for note in played_notes(track, number, last)
    }


def returned(
    tuned: TunedScore, raw: RawMidi, bend_range: int, glide: float, wish: Channels
) -> Returned:
    """The file retuned.

    Parameters
    ----------
    raw : RawMidi
        From `source_of`.
    bend_range : int
        Semitones; widened where an instrument's own bends need it.
    glide : float
        Seconds in which a held note moves.

    Raises
    ------
    OutputError
        More channels are needed than there are.
    """
    plan = _Plan(tuned, raw, glide)
    instruments = plan.instruments(wish)
    semitones = _wide_enough(instruments, bend_range)
    by_track: dict[int, list[Instrument]] = defaultdict(list)
    for one in instruments:
        by_track[one.track].append(one)
    shared: dict[int, list[int]] = defaultdict(list)
    for one in instruments:
        if one.tuned or one.knob.own:
            shared[one.home] = list(dict.fromkeys((*shared[one.home], one.home, *one.channels)))
    tracks = [
        retuned_track(track, by_track.get(number, []), shared, semitones, plan.shift)
        for number, track in enumerate(raw.tracks)
    ]
    moved = sum(len(one.channels) - 1 for one in instruments)
    words = (
        f"given back as it came, retuned; {moved} further channels"
        if moved
        else ("given back as it came, retuned on its own channels")
    )
    if semitones != bend_range:
        words += f"; bend range {semitones} semitones, as it bends by itself"
    made = RawMidi(raw.format, raw.division, tuple(tracks))
    return Returned(made, semitones, words, tuple(instruments))


def _wide_enough(instruments: Sequence[Instrument], wished: int) -> int:
    """The wished bend range, or the next that holds all bends."""
    most = max((one.farthest for one in instruments), default=0.0)
    return next((r for r in sorted({wished, *_RANGES}) if r >= wished and 100.0 * r > most), 96)


class _Plan:
    """What every instrument of the file needs."""

    def __init__(self, tuned: TunedScore, raw: RawMidi, glide: float) -> None:
        self._tuned = tuned
        self._raw = raw
        self._glide = glide
        self._clock = ticks_per_quarter(raw.division)
        self.shift = tuned.score.transposition.semitones
        self._by_source = {one.note.sources[0]: one for one in tuned.notes}
        self._knobs = _knobs(raw)

    def instruments(self, wish: Channels) -> list[Instrument]:
        """Every channel of every track that plays a tuned note, with its lanes."""
        needs = self._needs()
        used = {
            event.channel
            for track in self._raw.tracks
            for _, event in track.events
            if isinstance(event, _ON_CHANNEL)
        }
        free = [channel for channel in CHANNELS if channel not in used]
        lanes = {key: lanes_for(need, wish is Channels.TWO) for key, need in needs.items()}
        taken: set[int] = set()
        extras = 0
        for key, own in lanes.items():
            extras += len(own) - (key[1] not in taken)
            taken.add(key[1])
        if extras > len(free):
            raise OutputError(
                f"{extras} more channels are needed, so that no two notes share a bend, and the "
                f"file leaves {len(free)} free",
                Place(self._tuned.score.file),
                "Leave out midi.channels=two, or have it written anew with --set midi.source=new",
            )
        if wish is Channels.AUTO:
            lanes = self._widened(needs, lanes, len(free) - extras)
        return list(self._numbered(lanes, iter(free)))

    def _widened(
        self,
        needs: dict[tuple[int, int], PartNeeds],
        lanes: dict[tuple[int, int], list[tuple[PlannedNote, ...]]],
        room: int,
    ) -> dict[tuple[int, int], list[tuple[PlannedNote, ...]]]:
        """Twice the channels for as many instruments as there is room for, in file order."""
        found = {}
        for key, tight in lanes.items():
            wide = lanes_for(needs[key], True)
            more = len(wide) - len(tight)
            if more <= room:
                room -= more
                found[key] = wide
            else:
                found[key] = tight
        return found

    def _numbered(
        self, lanes: dict[tuple[int, int], list[tuple[PlannedNote, ...]]], free: Iterator[int]
    ) -> Iterator[Instrument]:
        taken: set[int] = set()
        for (track, home), own in lanes.items():
            channels = []
            for place, _ in enumerate(own):
                at_home = place == 0 and home not in taken
                channels.append(home if at_home else next(free))
                taken.add(home)
            yield Instrument(track, home, tuple(channels), tuple(own), self._knobs[home])

    def _needs(self) -> dict[tuple[int, int], PartNeeds]:
        notes: dict[tuple[int, int], list[PlannedNote]] = defaultdict(list)
        for source, press in _pressed(self._raw).items():
            one = self._by_source.get(source)
            if one is not None:
                track, place = map(int, source.split("."))
                notes[track, press.channel].append(self._planned(one, press, place))
        return {
            key: PartNeeds(sorted(notes[key], key=lambda n: (n.on, n.key)), 0, True)
            for key in sorted(notes)
        }

    def _planned(self, one: TunedNote, press: PlayedNote, place: int) -> PlannedNote:
        """A note with its tuning as bends in parts of a cent; `note` is its event's place."""
        key = press.key + self.shift
        tempo = self._tuned.score.tempo
        off = max(press.end, press.onset + 1)
        return PlannedNote(
            place,
            one.note.part,
            press.onset,
            off,
            tempo.seconds(press.onset / self._clock),
            tempo.seconds(off / self._clock),
            key,
            press.velocity,
            "",
            tuple(self._steps(one, press, key)),
        )

    def _steps(self, one: TunedNote, press: PlayedNote, key: int) -> Iterator[tuple[int, int]]:
        tuned, tempo = self._tuned, self._tuned.score.tempo
        cents = [100.0 * (pitch_of(tuned, one, s) - key) for s in one.segments]
        yield press.onset, round(cents[0] * _FINE)
        last = press.onset
        for (before, after), segment in zip(pairwise(cents), one.segments[1:], strict=True):
            begin = max(round(segment.onset * self._clock), last + 1)
            if before == after or begin >= press.end:
                continue
            start, stop = tempo.seconds(segment.onset), tempo.seconds(segment.end)
            span = min(self._glide, (stop - start) / 2)
            end = max(int(tempo.quarters(start + span) * self._clock), begin)
            steps = min(_GLIDE_STEPS, end - begin + 1)
            for step in range(1, steps + 1):
                tick = begin + (end - begin) * (step - 1) // max(steps - 1, 1)
                yield tick, round((before + (after - before) * step / steps) * _FINE)
                last = tick


_ON_CHANNEL = (NoteOn, NoteOff, KeyPressure, Control, Program, ChannelPressure, Bend)


def _knobs(raw: RawMidi) -> dict[int, Knob]:
    """Each channel's own bends through the file: (tick, cents), and the range they were made in.

    A reset of all controllers centres the bend (General MIDI 2, 3.5.2).
    """
    knobs = {channel: Knob([], 0) for channel in range(16)}
    selected = dict.fromkeys(range(16), (127, 127))
    ranges = dict.fromkeys(range(16), 2)
    for tick, event in sorted(
        ((tick, event) for track in raw.tracks for tick, event in track.events),
        key=lambda entry: entry[0],
    ):
        _turn(tick, event, knobs, selected, ranges)
    return knobs


def _turn(
    tick: int,
    event: Event,
    knobs: dict[int, Knob],
    selected: dict[int, tuple[int, int]],
    ranges: dict[int, int],
) -> None:
    match event:
        case Bend(channel, value):
            knobs[channel].bends.append((tick, bend_cents(value, ranges[channel])))
            knobs[channel].semitones = max(knobs[channel].semitones, ranges[channel])
        case Control(channel, controller, _) if controller == _RESET:
            knobs[channel].bends.append((tick, 0.0))
            selected[channel] = (127, 127)
        case Control(channel, controller, value) if controller == _RPN_MSB:
            selected[channel] = (value, selected[channel][1])
        case Control(channel, controller, value) if controller == _RPN_LSB:
            selected[channel] = (selected[channel][0], value)
        case Control(channel, controller, value) if controller == _DATA_MSB:
            if selected[channel] == (0, 0):
                ranges[channel] = value
        case _:
            pass
