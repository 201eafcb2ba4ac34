"""The cards of chords of a tuned score, and the chord that sounds at a place of it."""

from __future__ import annotations

import re
from bisect import bisect_right
from fractions import Fraction

from retune.chordcard.found import FoundChord
from retune.chordcard.model import ChordCard, Tone, chord_card
from retune.chordcard.reading import Reading
from retune.errors import Place, WishError
from retune.harmony.model import Chord, Degree, Role
from retune.score.model import Bar, Score
from retune.tuning.model import Segment, TunedNote, TunedScore
from retune.tuning.ratios import AUGMENTED_SIXTH
from retune.tuning.sounding import Row

_PLACE = re.compile(r"\s*([^:\s]+)\s*(?::\s*(\d+)(?:\s+(\d+)/([1-9]\d*)|(\.\d+))?\s*)?")


def tone_of(tuned: TunedScore, note: TunedNote, segment: Segment) -> Tone:
    """A stretch of a note as a tone."""
    part = tuned.score.parts[note.note.part]
    return Tone(
        note.note.pitch,
        segment.cents,
        segment.ratio,
        tuned.policy.reference_hz,
        part.name or f"Part {part.index + 1}",
        part.voice_type,
        "" if segment.role is Role.CHORD_TONE else str(segment.role),
    )


def card_of(tuned: TunedScore, row: Row) -> ChordCard:
    """The card of what parts sing in one chord, tones in the order of the parts."""
    tones = [tone_of(tuned, *row[part]) for part in sorted(row)]
    return chord_card(tones, tuned.policy.prime_limit)


def onset_at(score: Score, place: str, run: int | None = None) -> Fraction:
    """Where a bar and beat begin, in quarter notes.

    Parameters
    ----------
    place : str
        BAR or BAR:BEAT, as 12:3 or 12:3 1/2 or 12:3.5; the bar's printed number.
    run : int, optional
        Which time the bar is played, from 1; the first unless given.

    Raises
    ------
    WishError
        There is no such bar, beat or time through.
    """
    match = _PLACE.fullmatch(place)
    if match is None:
        raise WishError(f"'{place}' is not a place in a score", hint="Write bar and beat like 12:3")
    found = [bar for bar in score.bars if bar.number == match[1]]
    if not found:
        numbers = [bar.number for bar in score.bars if bar.number]
        raise WishError(
            f"there is no bar {match[1]}",
            hint=f"The bars are numbered {numbers[0]} to {numbers[-1]}" if numbers else "",
        )
    if run is not None and run > len(found):
        times = "once" if len(found) == 1 else f"{len(found)} times"
        raise WishError(f"bar {match[1]} is not played {run} times", hint=f"It is played {times}")
    bar = found[(run or 1) - 1]
    beat = _first_beat(bar) if match[2] is None else Fraction(int(match[2]))
    if match[3]:
        beat += Fraction(int(match[3]), int(match[4]))
    elif match[5]:
        beat += Fraction(match[5])
    onset = bar.onset - bar.begins + (beat - 1) * bar.beat_length
    if not bar.onset <= onset < bar.end:
        last = _first_beat(bar) + bar.duration / bar.beat_length
        raise WishError(
            f"bar {bar.number} has no beat {float(beat):g}",
            Place(score.file),
            f"Its beats are from {float(_first_beat(bar)):g} to before {float(last):g}",
        )
    return onset


def _first_beat(bar: Bar) -> Fraction:
    return 1 + bar.begins / bar.beat_length


def chord_at(tuned: TunedScore, onset: Fraction) -> FoundChord:
    """The chord that sounds at an onset, as it is tuned there.

    Its tones are those of the voices; of all parts where no voice sounds.

    Raises
    ------
    WishError
        Nothing sounds there.
    """
    slices = tuned.harmony.slices
    here = (
        slices[max(bisect_right([one.onset for one in slices], onset) - 1, 0)] if slices else None
    )
    sung = []
    for index in here.notes if here is not None and onset < here.onset + here.duration else ():
        note = tuned.notes[index]
        segment = next((s for s in note.segments if s.onset <= onset < s.end), None)
        if segment is not None:
            sung.append((index, note, segment))
    voices = [one for one in sung if tuned.score.parts[one[1].note.part].tuned]
    sung = sorted(voices or sung, key=lambda one: (one[1].note.pitch.key, -one[1].note.part))
    if not sung:
        place = tuned.score.place(onset)
        raise WishError(
            "nothing sounds there",
            Place(place.file, None, place.bar, place.beat),
            "See retune show for what sounds where",
        )
    chord = tuned.harmony.chords[sung[0][2].chord]
    known = {f.note: f.degree for f in tuned.harmony.fragments if f.chord == chord.index}
    degrees = tuple(known.get(index) for index, _, _ in sung)
    tones = tuple(tone_of(tuned, note, segment) for _, note, segment in sung)
    root = chord.root or tones[0].pitch.pitch_class
    bar = tuned.score.bar_at(onset)
    return FoundChord(
        tones,
        Reading(root, chord.quality, chord.added, degrees, _is_sixth(tones, degrees, chord)),
        _rivals(chord),
        tuned.root_cents[chord.index] or 0.0,
        tuned.policy.prime_limit,
        f"bar {bar.number}, beat {_beat_text(tuned.score.beat_at(onset))}",
    )


def _is_sixth(tones: tuple[Tone, ...], degrees: tuple[Degree | None, ...], chord: Chord) -> bool:
    return chord.root is not None and any(
        degree is Degree.SEVENTH
        and tone.pitch.pitch_class.fifths - chord.root.fifths == AUGMENTED_SIXTH
        for tone, degree in zip(tones, degrees, strict=True)
    )


def _rivals(chord: Chord) -> tuple[Reading, ...]:
    return () if chord.runner_up is None or not chord.doubtful else (Reading(*chord.runner_up),)


def _beat_text(beat: Fraction) -> str:
    whole, rest = divmod(beat, 1)
    return f"{whole} {rest}" if rest else str(whole)
