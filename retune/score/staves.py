"""What stands on one staff, bar by bar and voice by voice, from top to bottom.

Conventions
-----------
* Voices are ordered from the top: by their numbers, unless the pitches plainly say otherwise.
* A hidden rest is nothing: where a voice has neither notes nor printed rests, its singers read
  what stands in the voice next to it.
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cmp_to_key
from itertools import combinations
from statistics import fmean

from retune.score.bars import Frame
from retune.written import WrittenNote, WrittenPart, WrittenRest

Chord = tuple[WrittenNote, ...]
"""Notes that begin together, highest first."""


@dataclass(frozen=True, slots=True)
class VoiceBar:
    """One voice in one bar: its chords in order, its grace notes, its printed rests."""

    voice: str
    chords: tuple[Chord, ...] = ()
    graces: tuple[WrittenNote, ...] = ()
    rests: tuple[WrittenRest, ...] = ()

    @property
    def need(self) -> int:
        """How many lines it takes to sing the voice here; 0 where it rests."""
        return max(map(len, self.chords), default=0)

    @property
    def sounding(self) -> bool:
        """Whether the voice has any notes here."""
        return bool(self.chords)


@dataclass(frozen=True, slots=True)
class StaffBar:
    """The voices that have notes or printed rests in one bar, the top one first.

    `borrowed` is True where a voice took notes of another one, having nothing of its own.
    """

    voices: tuple[VoiceBar, ...] = ()
    borrowed: bool = False


def read_staff(part: WrittenPart, staff: int, frames: Sequence[Frame]) -> list[StaffBar]:
    """The bars of one staff of a part, as many as there are frames."""
    bars = [list(_voices(notes, rests)) for notes, rests in _on_staff(part, staff)]
    order = _top_down(bars)
    result = []
    for voices, frame in zip(bars, frames, strict=False):
        voices.sort(key=lambda voice: order[voice.voice])
        result.append(_filled(voices, frame.length) if len(voices) > 1 else StaffBar(tuple(voices)))
    return result + [StaffBar()] * (len(frames) - len(bars))


def _on_staff(
    part: WrittenPart, staff: int
) -> Iterator[tuple[list[WrittenNote], list[WrittenRest]]]:
    for bar in part.bars:
        yield (
            [note for note in bar.notes if note.staff == staff],
            [rest for rest in bar.rests if rest.staff == staff and not rest.hidden],
        )


def _voices(notes: Iterable[WrittenNote], rests: Iterable[WrittenRest]) -> Iterator[VoiceBar]:
    sung: dict[str, list[WrittenNote]] = defaultdict(list)
    graces: dict[str, list[WrittenNote]] = defaultdict(list)
    silent: dict[str, list[WrittenRest]] = defaultdict(list)
    for note in notes:
        (graces if note.grace else sung)[note.voice].append(note)
    for rest in rests:
        silent[rest.voice].append(rest)
    for voice in {**sung, **graces, **silent}:
        yield VoiceBar(
            voice,
            chords_of(sung.get(voice, ())),
            tuple(graces.get(voice, ())),
            tuple(silent.get(voice, ())),
        )


def chords_of(notes: Sequence[WrittenNote]) -> tuple[Chord, ...]:
    """Notes drawn together by onset, in order; syllables of a chord go to all its notes."""
    ordered = sorted((float(note.onset), -note.pitch.key, at) for at, note in enumerate(notes))
    chords: list[list[WrittenNote]] = []
    reached = -1.0
    for onset, _, at in ordered:
        if onset == reached:
            chords[-1].append(notes[at])
        else:
            chords.append([notes[at]])
            reached = onset
    return tuple(tuple(chord) if len(chord) == 1 else _sharing_lyrics(chord) for chord in chords)


def _sharing_lyrics(chord: Sequence[WrittenNote]) -> Chord:
    lyrics = next((note.lyrics for note in chord if note.lyrics), ())
    marks = frozenset().union(*(note.marks for note in chord))
    return tuple(
        replace(note, lyrics=note.lyrics or lyrics, marks=marks)
        if marks != note.marks or (lyrics and not note.lyrics)
        else note
        for note in chord
    )


def _top_down(bars: Sequence[Sequence[VoiceBar]]) -> dict[str, int]:
    """The place of each voice on its staff, 0 for the top one."""
    above: Counter[tuple[str, str]] = Counter()
    for voices in bars:
        sounding = [voice for voice in voices if voice.sounding]
        if len(sounding) > 1:
            mean = {voice.voice: _mean_key(voice) for voice in sounding}
            for one, other in combinations(mean, 2):
                above[(one, other)] += mean[one] > mean[other]
                above[(other, one)] += mean[other] > mean[one]

    def compare(one: str, other: str) -> int:
        higher, lower = above[(one, other)], above[(other, one)]
        if higher != lower:
            return -1 if higher > lower else 1
        return -1 if _number(one) < _number(other) else 1

    names = sorted({voice.voice for voices in bars for voice in voices}, key=_number)
    return {name: place for place, name in enumerate(sorted(names, key=cmp_to_key(compare)))}


def _mean_key(voice: VoiceBar) -> float:
    return fmean(note.pitch.key for chord in voice.chords for note in chord)


def _number(voice: str) -> tuple[int, str]:
    return (int(voice), "") if voice.isdecimal() else (1_000_000, voice)


def _filled(voices: Sequence[VoiceBar], length: Fraction) -> StaffBar:
    """A bar in which voices borrow from the voice next to them where they have nothing."""
    filled = []
    for place, voice in enumerate(voices):
        gaps = _gaps(voice, length)
        others = sorted(
            (other for other in voices if other is not voice and other.sounding),
            key=lambda other: abs(voices.index(other) - place),
        )
        filled.append(_borrow(voice, others[0], gaps) if gaps and others else voice)
    return StaffBar(
        tuple(filled), any(new is not old for new, old in zip(filled, voices, strict=True))
    )


def _gaps(voice: VoiceBar, length: Fraction) -> list[tuple[Fraction, Fraction]]:
    """Where a voice has neither notes nor printed rests."""
    spans = sorted(
        [(chord[0].onset, max(n.onset + n.duration for n in chord)) for chord in voice.chords]
        + [(rest.onset, rest.onset + rest.duration) for rest in voice.rests]
    )
    gaps = []
    reached = Fraction(0)
    for start, stop in spans:
        if start > reached:
            gaps.append((reached, start))
        reached = max(reached, stop)
    if reached < length:
        gaps.append((reached, length))
    return gaps


def _borrow(
    voice: VoiceBar, other: VoiceBar, gaps: Sequence[tuple[Fraction, Fraction]]
) -> VoiceBar:
    taken = [
        tuple(_cut(note, stop) for note in chord)
        for start, stop in gaps
        for chord in other.chords
        if start <= chord[0].onset < stop
    ]
    if not taken:
        return voice
    chords = sorted((*voice.chords, *taken), key=lambda chord: chord[0].onset)
    return replace(voice, chords=tuple(chords))


def _cut(note: WrittenNote, stop: Fraction) -> WrittenNote:
    if note.onset + note.duration <= stop:
        return note
    return replace(note, duration=stop - note.onset, tie_start=False)
