"""Guide parts: starting notes, count-in and click, drone, as parts of a tuned score.

Guide notes stand after all notes of the music, so that the harmony's numbers stay true; they are
in no slice and no chord's purity counts them.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from fractions import Fraction
from itertools import pairwise

from retune.harmony.model import Role
from retune.pitch import Pitch, PitchClass
from retune.score.model import Note, Part, PartKind, Score
from retune.tracks.options import ClickSound, Drone, GuideSound
from retune.tuning.home import home_scale, home_tonic, tonic_path
from retune.tuning.model import Segment, TunedNote, TunedScore

STARTING_NOTES, COUNT_IN, CLICK, DRONE = "Starting notes", "Count-in", "Click", "Drone"

_PROGRAMS = {GuideSound.VOICE: 53, GuideSound.KEYS: 0, GuideSound.ORGAN: 19}
"""General MIDI programs, from 0: voice oohs, grand piano, church organ."""

# Keys of the General MIDI percussion map: the first beat of a bar and the others.
_CLICKS = {
    ClickSound.BLOCK: (Pitch.parse("E5"), Pitch.parse("F5")),
    ClickSound.STICKS: (Pitch.parse("C#2"), Pitch.parse("G1")),
    ClickSound.BELL: (Pitch.parse("A#1"), Pitch.parse("A1")),
}
_STRONG, _WEAK = 104, 76
_STARTING, _DRONING = 80, 64
_CLICK_LENGTH = Fraction(1, 8)
_SOUNDING = Fraction(9, 10)
"""Share of its time that a starting note sounds."""

_LOWEST_DRONE, _LOWEST_TONIC = 48, 53
"""A drone named without its octave lies from C3 to B3; the tonic as a starting note from F3 to
E4, where both men and women find it."""

Pitched = tuple[Pitch, float]
"""A pitch and its tuned cents."""


def first_note(tuned: TunedScore, part: int) -> Pitched | None:
    """A part's first note; grace notes are none."""
    for one in tuned.notes:
        if one.note.part == part and not one.note.grace:
            return one.note.pitch, one.segments[0].cents
    return None


def first_chord(tuned: TunedScore) -> list[Pitched]:
    """The sung notes of the first chord with singers, from the bottom up; unisons once.

    Of each part, the first note that it sings there.
    """
    sung = {part.index for part in sung_parts(tuned.score)}
    notes = [one for one in tuned.notes if one.note.part in sung and not one.note.grace]
    if not notes:
        return []
    chord = tuned.harmony.chords[notes[0].segments[0].chord]
    by_part: dict[int, Pitched] = {}
    for one in notes:
        for segment in one.segments:
            if segment.onset < chord.end and segment.end > chord.onset:
                by_part.setdefault(one.note.part, (one.note.pitch, segment.cents))
    by_key = {pitched[0].key: pitched for pitched in by_part.values()}
    return [by_key[key] for key in sorted(by_key)]


def sung_parts(score: Score) -> list[Part]:
    """Parts that have words or are for a kind of voice; where none is, all that can be tuned."""
    tuned = [part for part in score.parts if part.tuned]
    worded = {note.part for note in score.notes if note.lyric}
    return [one for one in tuned if one.voice_type or one.index in worded] or tuned


def tonic_note(tuned: TunedScore) -> Pitched:
    """The home tonic as a starting note, at its tuned pitch at the start."""
    tonic = home_tonic(tuned)
    return _from(_LOWEST_TONIC, tonic), home_scale(tuned)(tonic) + tonic_path(tuned)[0][1]


def with_part(tuned: TunedScore, part: Part, notes: Iterable[TunedNote]) -> TunedScore:
    """A tuned score with a guide part, whose notes name no part yet."""
    own = tuple(replace(one, note=replace(one.note, part=part.index)) for one in notes)
    score = replace(
        tuned.score,
        parts=(*tuned.score.parts, part),
        notes=(*tuned.score.notes, *(one.note for one in own)),
    )
    return replace(tuned, score=score, notes=(*tuned.notes, *own))


def starting_part(
    tuned: TunedScore,
    pitches: Sequence[Pitched],
    own: Pitched | None,
    slot: Fraction,
    own_slots: int,
    sound: GuideSound,
) -> TunedScore:
    """A tuned score with starting notes from its start, one a slot, the singer's own last."""
    notes = [
        _note(pitched, slot * place, slot * _SOUNDING) for place, pitched in enumerate(pitches)
    ]
    if own is not None:
        notes.append(_note(own, slot * len(pitches), slot * own_slots * _SOUNDING))
    return with_part(tuned, _part(tuned, STARTING_NOTES, PartKind.GUIDE, sound), notes)


def click_part(
    tuned: TunedScore, name: str, beats: Iterable[tuple[Fraction, bool]], sound: ClickSound
) -> TunedScore:
    """A tuned score with a click at each beat: (onset, whether it is the first of its bar)."""
    strong, weak = _CLICKS[sound]
    notes = [
        _note((strong if first else weak, 0.0), onset, _CLICK_LENGTH, _STRONG if first else _WEAK)
        for onset, first in beats
    ]
    part = replace(_part(tuned, name, PartKind.CLICK, GuideSound.KEYS), program=None)
    return with_part(tuned, part, notes)


def drone_part(tuned: TunedScore, drone: Drone, start: Fraction, sound: GuideSound) -> TunedScore:
    """A tuned score with a drone from `start` to the end, moving with the tuned pitches."""
    notes = _roots(tuned) if drone.root else [_held(tuned, drone, start)]
    return with_part(tuned, _part(tuned, DRONE, PartKind.GUIDE, sound), notes)


def _part(tuned: TunedScore, name: str, kind: PartKind, sound: GuideSound) -> Part:
    return Part(len(tuned.score.parts), name, kind, program=_PROGRAMS[sound])


def _note(
    pitched: Pitched, onset: Fraction, duration: Fraction, velocity: int = _STARTING
) -> TunedNote:
    pitch, cents = pitched
    segment = Segment(onset, duration, 0, Role.OTHER, None, cents)
    return TunedNote(Note(-1, onset, duration, pitch, velocity), (segment,))


def _from(lowest: int, pitch: PitchClass) -> Pitch:
    """The pitch of a class that lies in the octave from a key up."""
    return Pitch.at_key(lowest + (pitch.chroma - lowest) % 12, pitch)


def _held(tuned: TunedScore, drone: Drone, start: Fraction) -> TunedNote:
    """One note under the whole piece, at its place in the scale on the moving tonic."""
    wish = drone.pitch or home_tonic(tuned)
    pitch = wish if isinstance(wish, Pitch) else _from(_LOWEST_DRONE, wish)
    above = home_scale(tuned)(pitch.pitch_class)
    path = tonic_path(tuned)
    onsets = [start, *(onset for onset, _ in path if onset > start), tuned.score.end]
    offset = {max(onset, start): cents for onset, cents in path}
    segments = tuple(
        Segment(onset, end - onset, 0, Role.PEDAL, None, above + offset[onset])
        for onset, end in pairwise(onsets)
    )
    return TunedNote(Note(-1, start, tuned.score.end - start, pitch, _DRONING), segments)


def _roots(tuned: TunedScore) -> list[TunedNote]:
    """A note on each chord's root; one note through chords of one root."""
    notes: list[TunedNote] = []
    for chord, cents in zip(tuned.harmony.chords, tuned.root_cents, strict=True):
        if chord.root is None or cents is None:
            continue
        pitch = _from(_LOWEST_DRONE, chord.root)
        here = Segment(chord.onset, chord.duration, chord.index, Role.CHORD_TONE, None, cents)
        last = notes[-1] if notes else None
        if last is not None and last.note.pitch == pitch and last.note.end == chord.onset:
            longer = replace(last.note, duration=chord.end - last.note.onset)
            notes[-1] = TunedNote(longer, (*last.segments, here))
        else:
            note = Note(-1, chord.onset, chord.duration, pitch, _DRONING)
            notes.append(TunedNote(note, (here,)))
    return notes
