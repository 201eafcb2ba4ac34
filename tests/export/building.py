"""Tuned scores made by hand, so that exporters are tested without reading or tuning."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from retune.harmony.model import Chord, Degree, Fragment, Harmony, Quality, Role, Slice, Tonic
from retune.pitch import Pitch, PitchClass
from retune.score.model import Bar, Note, Part, PartKind, Score
from retune.score.tempo import TempoChange, TempoMap
from retune.tracks.take import Take
from retune.tuning.model import Segment, TunedNote, TunedScore
from retune.tuning.policy import Policy

Time = int | str | Fraction


@dataclass(frozen=True)
class Sung:
    """One note to be built: segments are (duration, cents) or (duration, cents, ratio)."""

    part: int
    onset: Fraction
    pitch: Pitch
    segments: tuple[tuple[Fraction, float, Fraction | None], ...]
    lyric: str = ""
    velocity: int = 80


def sung(
    part: int, onset: Time, pitch: str, *segments: tuple, lyric: str = "", velocity: int = 80
) -> Sung:
    """A note of a part: `sung(0, 0, "E4", (2, -13.686), (1, -11.7, "5/4"))`."""
    spans = tuple(
        (Fraction(span[0]), float(span[1]), Fraction(span[2]) if len(span) > 2 else None)
        for span in segments
    )
    return Sung(part, Fraction(onset), Pitch.parse(pitch), spans, lyric, velocity)


def tuned_score(
    notes: Sequence[Sung],
    *,
    parts: Sequence[str | Part] = ("Soprano", "Alto", "Tenor", "Bass"),
    chords: Sequence[tuple[Time, str | None, Quality | None, float | None]] = (),
    tempo: Sequence[tuple[Time, Time]] = ((0, 60),),
    policy: Policy | None = None,
    metre: tuple[int, int] = (4, 4),
    tonic: Tonic | None = None,
    **words: str,
) -> TunedScore:
    """A tuned score of these notes.

    Chords are (onset, root, quality, root cents); without any, all is one C major chord.
    """
    made_parts = tuple(
        part if isinstance(part, Part) else Part(index, part) for index, part in enumerate(parts)
    )
    ordered = sorted(notes, key=lambda note: (note.onset, note.part, note.pitch.key))
    end = max((n.onset + sum((s[0] for s in n.segments), Fraction(0)) for n in ordered), default=0)
    made_chords = _chords(chords or [(0, "C", Quality.MAJOR, 0.0)], Fraction(end))
    score = Score(
        words.pop("stem", "piece"),
        words.pop("title", "A Piece"),
        made_parts,
        tuple(_note(note) for note in ordered),
        _bars(metre, Fraction(end)),
        TempoMap(tuple(TempoChange(Fraction(t), Fraction(q)) for t, q in tempo)),
        **words,
    )
    tuned = tuple(
        TunedNote(made, _segments(note, made_chords))
        for note, made in zip(ordered, score.notes, strict=True)
    )
    slices = _slices(score)
    harmony = Harmony(slices, made_chords, _fragments(tuned), tonic or Tonic(PitchClass("C")))
    cents = tuple(chord[3] for chord in chords) if chords else (0.0,)
    return TunedScore(score, harmony, policy or Policy(), tuned, cents, {"purity": {"mean": 0.5}})


def _note(note: Sung) -> Note:
    duration = sum((span[0] for span in note.segments), Fraction(0))
    return Note(note.part, note.onset, duration, note.pitch, note.velocity, note.lyric)


def _bars(metre: tuple[int, int], end: Fraction) -> tuple[Bar, ...]:
    length = Fraction(4 * metre[0], metre[1])
    count = max(1, -(-end // length))
    return tuple(
        Bar(index, index, str(index + 1), index * length, length, metre) for index in range(count)
    )


def _chords(wanted: Sequence[tuple], end: Fraction) -> tuple[Chord, ...]:
    onsets = [Fraction(chord[0]) for chord in wanted] + [end]
    return tuple(
        Chord(
            index,
            onset,
            onsets[index + 1] - onset,
            index,
            index + 1,
            None if root is None else PitchClass.parse(root),
            quality,
            0.9,
        )
        for index, (onset, (_, root, quality, _)) in enumerate(zip(onsets, wanted, strict=False))
    )


def _segments(note: Sung, chords: Sequence[Chord]) -> tuple[Segment, ...]:
    onset, made = note.onset, []
    for duration, cents, ratio in note.segments:
        chord = bisect_right(chords, onset, key=lambda chord: chord.onset) - 1
        made.append(Segment(onset, duration, chord, Role.CHORD_TONE, ratio, cents))
        onset += duration
    return tuple(made)


def _slices(score: Score) -> tuple[Slice, ...]:
    return tuple(
        Slice(index, note.onset, note.duration, (index,)) for index, note in enumerate(score.notes)
    )


def _fragments(tuned: Sequence[TunedNote]) -> tuple[Fragment, ...]:
    return tuple(
        Fragment(index, segment.chord, 0, 1, segment.role, Degree.ROOT)
        for index, note in enumerate(tuned)
        for segment in note.segments
    )


def choir(count: int) -> list[Part]:
    """Voices enough for any test."""
    return [Part(index, f"Voice {index + 1}") for index in range(count)]


def organ(index: int) -> Part:
    """An accompaniment with a program of its own."""
    return Part(index, "Organ", PartKind.ACCOMPANIMENT, program=19)


def cadence() -> TunedScore:
    """Two bars, four parts: C, F with a held C that sinks a little, G7, C; just on C."""
    return tuned_score(
        [
            sung(0, 0, "E4", (1, -13.686, "5/4"), lyric="Ma-"),
            sung(0, 1, "F4", (1, -1.955, "1"), lyric="re"),
            sung(0, 2, "F4", (1, -1.955, "16/9"), lyric="ma-"),
            sung(0, 3, "E4", (4, -13.686, "5/4"), lyric="ris."),
            sung(1, 0, "C4", (1, 0.0, "1"), (1, -1.955, "3/2"), lyric="A"),
            sung(1, 2, "B3", (1, -11.731, "5/4")),
            sung(1, 3, "C4", (4, 0.0, "1")),
            sung(2, 0, "G3", (1, 1.955, "3/2")),
            sung(2, 1, "A3", (1, -15.641, "5/4")),
            sung(2, 2, "G3", (2, 1.955, "1")),
            sung(2, 4, "G3", (3, 1.955, "3/2")),
            sung(3, 0, "C3", (1, 0.0, "1")),
            sung(3, 1, "F2", (1, -1.955, "1")),
            sung(3, 2, "G2", (1, 1.955, "1")),
            sung(3, 3, "C3", (4, 0.0, "1")),
        ],
        chords=[
            (0, "C", Quality.MAJOR, 0.0),
            (1, "F", Quality.MAJOR, -1.955),
            (2, "G", Quality.DOMINANT_SEVENTH, 1.955),
            (3, "C", Quality.MAJOR, 0.0),
        ],
        tempo=((0, 72), (6, 36)),
        composer="A. Nyman",
        copyright="© 2031 A. Nyman",
    )


def take_of(tuned: TunedScore, **changes: str) -> Take:
    """A take, the full mix unless told otherwise."""
    return replace(Take(tuned), **changes)
