"""Reading a file of tuning messages back: what each key sounds, compared with the tuned pitches.

The receiver here knows the messages of the specification and nothing of how the file was made.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

from retune.adapters.midi import NoteOff, NoteOn, RawTrack, Sysex, read_midi_file
from retune.errors import OutputError, RetuneError
from retune.export.midi_plan import pitch_of
from retune.export.mts_words import word_pitch
from retune.export.ticks import Ticks
from retune.limits import Limits
from retune.score.model import PartKind
from retune.tuning.model import TunedScore

_BOUND, _OCTAVE_BOUND = 0.0062, 0.02
_FAULT = "This is a fault of retune; please report it with the score, if you may"


def check_mts(
    data: bytes, tuned: TunedScore, parts: Sequence[int], moves: bool, octaves: bool
) -> str:
    """Compare a file with the tuned score; a line with the greatest rounding error.

    `parts` are those of its tracks after the conductor's. Raises `OutputError` where a note is
    missing or off its pitch, at its start or, with `moves`, at the end of a segment. `octaves`
    says that all octaves of a key must sound alike.
    """
    try:
        raw = read_midi_file(data, Limits(max_bytes=len(data), max_notes=len(data)))
    except RetuneError as error:
        raise OutputError(f"the MIDI file reads back wrong: {error.what}", hint=_FAULT) from error
    assert isinstance(raw.division, int)
    ticks = Ticks(raw.division)
    worst, count = 0.0, 0
    for part, track in zip(parts, raw.tracks[1:], strict=True):
        wanted: dict[int, list[list[tuple[int, float]]]] = defaultdict(list)
        for one in tuned.notes:
            if one.note.part == part:
                ends = [(ticks.at(s.end), pitch_of(tuned, one, s)) for s in one.segments]
                wanted[ticks.at(one.note.onset)].append(ends)
        heard = sounded(track, tuned.score.parts[part].kind is PartKind.CLICK)
        for tick, notes in wanted.items():
            there = sorted(heard.get(tick, []), key=lambda line: line[0][1])
            if len(there) != len(notes):
                raise OutputError("a note is lost in the MIDI file", hint=_FAULT)
            for line, ends in zip(there, sorted(notes, key=lambda e: e[0][1]), strict=True):
                off = 100.0 * abs(line[0][1] - ends[0][1])
                for end, pitch in ends if moves else ():
                    now = [p for at, p in line if at < end] or [line[0][1]]
                    off = max(off, 100.0 * abs(now[-1] - pitch))
                worst, count = max(worst, off), count + 1
    if octaves and worst > _OCTAVE_BOUND:
        raise OutputError(
            f"a part sounds two octaves of one key {worst:.1f} cents apart, and these messages "
            "tune all octaves alike",
            hint="Use --set mts.form=single",
        )
    if worst > (_OCTAVE_BOUND if octaves else _BOUND):
        raise OutputError(f"a note reads back {worst:.4f} cents off its tuned pitch", hint=_FAULT)
    return f"read back: {count:,} notes, greatest rounding error {worst:.4f} cents"


def sounded(track: RawTrack, clicks: bool = False) -> dict[int, list[list[tuple[int, float]]]]:
    """By tick, the notes struck there: each its pitches as (tick, pitch) while it sounds."""
    pitch = {key: float(key) for key in range(128)}
    sounding: dict[int, list[tuple[int, float]]] = {}
    found: dict[int, list[list[tuple[int, float]]]] = defaultdict(list)
    for tick, event in track.events:
        match event:
            case Sysex(data):
                before = dict(pitch)
                live = _tune(data, pitch)
                for key, line in sounding.items():
                    if live and pitch[key] != before[key]:
                        line.append((tick, pitch[key]))
            case NoteOn(_, key, velocity) if velocity:
                sounding[key] = [(tick, float(key) if clicks else pitch[key])]
                found[tick].append(sounding[key])
            case NoteOn(_, key, _) | NoteOff(_, key, _):
                sounding.pop(key, None)
            case _:
                pass
    return found


def _tune(data: bytes, pitch: dict[int, float]) -> bool:
    """Obey a tuning message; whether it also moves notes that sound."""
    if data[2:4] == b"\x08\x02":
        for place in range(6, 6 + 4 * data[5], 4):
            pitch[data[place]] = word_pitch(data[place + 1 : place + 4])
    elif data[2:4] == b"\x08\x09":
        words = data[7:]
        for key in pitch:
            step = key % 12
            number = words[2 * step] << 7 | words[2 * step + 1]
            pitch[key] = key + (number - 8192) / 8192
    elif data[2:4] == b"\x08\x01":
        for key in pitch:
            pitch[key] = word_pitch(data[21 + 3 * key : 24 + 3 * key])
    return data[0] == 0x7F
