"""MusicXML made of a score that came in another format: as played, repeats played out.

Music that was played in is written to the nearest note values: sixteenths, or triplet eighths
where they are nearer. The tuned pitches stay those of the notes as they were played.
"""

from __future__ import annotations

from bisect import bisect_left
from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from retune.adapters.notation_writing import write_musicxml
from retune.errors import OutputError
from retune.limits import Limits
from retune.score.model import Note, Part, Score, Transposition, VoiceType
from retune.score.musicxml import read_musicxml
from retune.tuning.model import TunedScore
from retune.written import (
    Mark,
    MarkKind,
    WrittenBar,
    WrittenLyric,
    WrittenNote,
    WrittenPart,
    WrittenScore,
)

_GRIDS = (4, 3)
_EXACT = (1, 2, 3, 4, 6, 8)
_SHORTEST = Fraction(1, 8)
_MOST_NOTES = 50_000
_LOW = {VoiceType.TENOR: "G8", VoiceType.BARITONE: "F", VoiceType.BASS: "F"}
_MIDDLE_C, _TENOR_TOP = 60, 55


@dataclass(frozen=True, slots=True)
class _Placed:
    """A note with its written time."""

    note: Note
    index: int
    onset: Fraction
    end: Fraction


def as_musicxml(tuned: TunedScore) -> TunedScore:
    """The tuned score as if it had been read from a MusicXML file, which is its `source`.

    Raises `OutputError` where it cannot be written as notation.
    """
    score = tuned.score
    if len(score.notes) > _MOST_NOTES:
        raise OutputError(
            f"a score of more than {_MOST_NOTES} notes that is no MusicXML is not written as one",
            score.place(Fraction(0)),
            "Leave the output notation out",
        )
    placed = [list(_placed(score, part.index)) for part in score.parts]
    source = write_musicxml(_written(score, placed))
    sources = _sources(score, placed, source)
    notes = tuple(
        replace(one, note=replace(one.note, sources=sources.get(index, ())))
        for index, one in enumerate(tuned.notes)
    )
    parts = tuple(
        replace(part, source=f"P{part.index + 1}", staff=1, voice="1") for part in score.parts
    )
    bars = tuple(replace(bar, written=bar.index) for bar in score.bars)
    made = replace(
        score,
        parts=parts,
        bars=bars,
        notes=tuple(one.note for one in notes),
        format="musicxml",
        source=source,
        transposition=Transposition(),
    )
    return replace(tuned, score=made, notes=notes)


# --- written times ---------------------------------------------------------------------------


def _placed(score: Score, part: int) -> Iterator[_Placed]:
    """The notes of a part on the grid; one that ended before the next began still does."""
    own = [(index, note) for index, note in enumerate(score.notes) if note.part == part]
    starts = sorted({note.analysed_onset for _, note in own if not note.grace})
    for index, note in own:
        onset, end = note.analysed_onset, note.analysed_end
        if note.grace:
            # It is written where the note begins that it leads to.
            onset = end = _from(starts, note.end) or note.onset
        elif score.format == "midi":
            follower = _from(starts, end)
            onset, end = on_grid(onset), on_grid(end)
            if follower is not None:
                end = min(end, max(on_grid(follower), onset + _SHORTEST))
            end = max(end, onset + _SHORTEST)
        yield _Placed(note, index, onset, end)


def _from(starts: Sequence[Fraction], time: Fraction) -> Fraction | None:
    """The first of ascending times that is not before another."""
    at = bisect_left(starts, time)
    return starts[at] if at < len(starts) else None


def on_grid(time: Fraction) -> Fraction:
    """The nearest time that common note values reach.

    >>> [str(on_grid(Fraction(n, 96))) for n in (91, 24, 31, 12)]
    ['1', '1/4', '1/3', '1/8']
    """
    if time.denominator in _EXACT:
        return time
    return min(
        (Fraction(round(time * grid), grid) for grid in _GRIDS), key=lambda near: abs(near - time)
    )


# --- a written score -------------------------------------------------------------------------


def _written(score: Score, placed: Sequence[Sequence[_Placed]]) -> WrittenScore:
    return WrittenScore(
        parts=tuple(
            _part(score, part, notes) for part, notes in zip(score.parts, placed, strict=True)
        ),
        title=score.title or score.stem,
        composer=score.composer,
        lyricist=score.lyricist,
        copyright=score.copyright,
        format="musicxml",
    )


def _part(score: Score, part: Part, notes: Sequence[_Placed]) -> WrittenPart:
    by_bar: dict[int, list[WrittenNote]] = defaultdict(list)
    free: dict[str, Fraction] = {}
    shapes: dict[str, tuple[Fraction, Fraction]] = {}
    inside_word = False
    for one in sorted(notes, key=lambda p: (p.onset, not p.note.grace, p.end, p.index)):
        voice = _voice(one, free, shapes)
        lyrics: tuple[WrittenLyric, ...] = ()
        if one.note.lyric:
            lyrics, inside_word = _lyric(one.note.lyric, inside_word)
        for index, note in _pieces(score, one, voice, lyrics):
            by_bar[index].append(note)
    bars = tuple(_bar(score, part, index, by_bar[index]) for index in range(len(score.bars)))
    return WrittenPart(
        id=f"P{part.index + 1}",
        name=part.name or f"Part {part.index + 1}",
        bars=bars,
        abbreviation=part.abbreviation,
        program=part.program,
        clefs=(_clef(part, notes),),
    )


def _voice(
    one: _Placed, free: dict[str, Fraction], shapes: dict[str, tuple[Fraction, Fraction]]
) -> str:
    """The first voice that is free, or that strikes a chord of the same length."""
    for number in range(1, len(free) + 2):
        name = str(number)
        if one.note.grace:
            return name
        shape = (one.onset, one.end)
        if free.get(name, Fraction(0)) <= one.onset or shapes.get(name) == shape:
            free[name], shapes[name] = one.end, shape
            return name
    raise AssertionError("there is always one more voice")


def _lyric(text: str, inside: bool) -> tuple[tuple[WrittenLyric, ...], bool]:
    goes_on = text.endswith("-")
    syllabic = ("middle" if inside else "begin") if goes_on else ("end" if inside else "single")
    return (WrittenLyric(text.rstrip("-"), syllabic),), goes_on


def _pieces(
    score: Score, one: _Placed, voice: str, lyrics: tuple[WrittenLyric, ...]
) -> Iterator[tuple[int, WrittenNote]]:
    """A note cut at bar lines, its pieces tied."""
    note, start = one.note, one.onset
    bar = score.bar_at(start)
    if note.grace:
        yield (
            bar.index,
            WrittenNote(start - bar.onset, Fraction(0), note.pitch, voice=voice, grace=True),
        )
        return
    while start < one.end:
        last = bar.index == len(score.bars) - 1
        end = one.end if last else min(one.end, bar.end)
        first = start == one.onset
        yield (
            bar.index,
            WrittenNote(
                start - bar.onset,
                end - start,
                note.pitch,
                voice=voice,
                tie_start=end < one.end,
                tie_stop=not first,
                lyrics=lyrics if first else (),
                marks=note.marks if end == one.end else frozenset(),
            ),
        )
        start = end
        if not last:
            bar = score.bars[bar.index + 1]


def _bar(score: Score, part: Part, index: int, notes: Sequence[WrittenNote]) -> WrittenBar:
    bar = score.bars[index]
    before = score.bars[index - 1] if index else None
    marks = []
    if part.index == 0:
        last: Fraction | None = None
        for change in score.tempo.changes:
            if bar.onset <= change.onset < bar.end and (index == 0 or change.qpm != last):
                marks.append(Mark(MarkKind.TEMPO, change.onset - bar.onset, change.qpm))
            last = change.qpm
    return WrittenBar(
        number=bar.number,
        length=bar.duration,
        notes=tuple(notes),
        marks=tuple(marks[:1]),
        implicit=bar.begins > 0,
        metre=bar.metre if before is None or before.metre != bar.metre else None,
        key=bar.key if before is None or before.key != bar.key else None,
    )


def _clef(part: Part, notes: Sequence[_Placed]) -> str:
    """The clef that keeps the part on its staff: by its voice, else by its middle pitch."""
    if part.voice_type in _LOW:
        return _LOW[part.voice_type]
    keys = sorted(one.note.pitch.key for one in notes)
    return "F" if keys and keys[len(keys) // 2] < _TENOR_TOP and part.voice_type is None else "G"


# --- which notehead is whose -------------------------------------------------------------------


def _sources(
    score: Score, placed: Sequence[Sequence[_Placed]], document: bytes
) -> dict[int, tuple[str, ...]]:
    """The noteheads of each note by its index, found again in what was written."""
    written = read_musicxml(document, Limits(max_bytes=len(document)))
    found: dict[int, tuple[str, ...]] = {}
    for own, part in zip(placed, written.parts, strict=True):
        heads: dict[int, list[tuple[Fraction, bool, str]]] = defaultdict(list)
        for bar, made in zip(score.bars, part.bars, strict=False):
            for note in made.notes:
                heads[note.pitch.key].append((bar.onset + note.onset, note.grace, note.source))
        for one in own:
            found[one.index] = tuple(
                source
                for onset, grace, source in heads[one.note.pitch.key]
                if grace == one.note.grace
                and (onset == one.onset if grace else one.onset <= onset < one.end)
            )
            if not found[one.index]:
                raise OutputError(
                    "a note was lost while it was written as notation",
                    score.place(one.note.onset, one.note.part),
                    "Leave the output notation out",
                )
    return found
