"""Notes of a MIDI track: key presses paired with their releases, and lines made of them.

Conventions
-----------
* Times are ticks of the file.
* The sustain pedal changes no duration; the analysis hears it (`grouping`).
"""

from __future__ import annotations

from collections import defaultdict, deque
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import chain, groupby

from retune.adapters.midi import Control, NoteOff, NoteOn, RawMidi, RawTrack
from retune.errors import LimitError

RHYTHM_CHANNEL = 9
"""Channel 10 in its usual name: its keys are instruments, not pitches (General MIDI)."""

MAX_VOICES = 128
"""So many lines at once in one part are taken for a damaged file."""

# All sound off, all notes off.
_SILENCERS = (120, 123)


@dataclass(frozen=True, slots=True)
class PlayedNote:
    """One key press, from tick `onset` to tick `end`; `hanging` if nothing released it.

    `source` names its track and event, `released` is the event of its track that ends it.
    """

    channel: int
    key: int
    velocity: int
    onset: int
    end: int
    source: str
    hanging: bool = False
    released: int | None = None


def played_notes(track: RawTrack, number: int, last: int) -> list[PlayedNote]:
    """The notes of a track, by onset and from the highest down.

    Presses of one key that overlap are released first in, first out. A note that nothing
    releases ends at tick `last`, or at the track's end where that is later than its onset only.
    """
    pressed: defaultdict[int, dict[int, deque[PlayedNote]]] = defaultdict(dict)
    found: list[PlayedNote] = []

    def release(channel: int, key: int, tick: int, place: int) -> None:
        if key in pressed[channel]:
            waiting = pressed[channel][key]
            found.append(replace(waiting.popleft(), end=tick, released=place))
            if not waiting:
                del pressed[channel][key]

    for place, (tick, event) in enumerate(track.events):
        match event:
            case NoteOn(channel, key, velocity) if velocity:
                note = PlayedNote(channel, key, velocity, tick, tick, f"{number}.{place}")
                pressed[channel].setdefault(key, deque()).append(note)
            case NoteOn(channel, key, _) | NoteOff(channel, key, _):
                release(channel, key, tick, place)
            case Control(channel, controller, _) if controller in _SILENCERS:
                while pressed[channel]:
                    release(channel, next(iter(pressed[channel])), tick, place)
            case _:
                pass
    waiting_everywhere = chain.from_iterable(keys.values() for keys in pressed.values())
    for note in chain.from_iterable(waiting_everywhere):
        end = last if last > note.onset else max(track.end, note.onset)
        found.append(replace(note, end=end, hanging=True))
    return sorted(found, key=lambda note: (note.onset, -note.key, note.end))


_SUSTAIN, _DOWN = 64, 64


def pedals_of(raw: RawMidi) -> dict[int, list[tuple[int, int]]]:
    """By channel, the spans of ticks in which the sustain pedal is down."""
    found: defaultdict[int, list[tuple[int, int]]] = defaultdict(list)
    down: dict[int, int] = {}
    events = ((tick, event) for track in raw.tracks for tick, event in track.events)
    for tick, event in sorted(events, key=lambda entry: entry[0]):
        if isinstance(event, Control) and event.controller == _SUSTAIN:
            if event.value >= _DOWN:
                down.setdefault(event.channel, tick)
            elif event.channel in down:
                found[event.channel].append((down.pop(event.channel), tick))
    return found


def in_voices(notes: Sequence[PlayedNote], overlap: int = 0) -> list[list[PlayedNote]]:
    """The notes of a part as voices, each a line of notes and chords.

    Notes that begin and end together are one chord; what overlaps otherwise is another voice,
    unless it is by no more than `overlap` ticks and the note before has sounded for longer than
    that: played legato. Each goes on in the free voice that was last nearest in pitch. Voices
    come highest first.

    Raises
    ------
    LimitError
        More than `MAX_VOICES` voices.
    """
    voices: list[list[PlayedNote]] = []
    for chord in _chords(notes):
        onset = chord[0].onset
        free = [
            voice
            for voice in voices
            if voice[-1].end <= onset
            or (voice[-1].end <= onset + overlap and voice[-1].onset + 2 * overlap < onset)
        ]
        if free:
            min(free, key=lambda voice: abs(voice[-1].key - chord[-1].key)).extend(chord)
        elif len(voices) < MAX_VOICES:
            voices.append(list(chord))
        else:
            raise LimitError(f"more than {MAX_VOICES} lines overlap in one MIDI part")
    return sorted(voices, key=_mean_key, reverse=True)


def _chords(notes: Sequence[PlayedNote]) -> Iterator[list[PlayedNote]]:
    """Notes of one onset and one end, from the highest chord of an onset down."""
    for _, together in groupby(notes, key=lambda note: note.onset):
        chords: dict[int, list[PlayedNote]] = {}
        for note in together:
            chords.setdefault(note.end, []).append(note)
        yield from chords.values()


def _mean_key(voice: Sequence[PlayedNote]) -> float:
    return sum(note.key for note in voice) / len(voice)
