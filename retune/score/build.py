"""From the written score to the score as played.

`build_score` is the whole way on one page: bars are aligned, parts split into lines, repeats
and jumps played out, ties joined, grace notes placed, dynamics and tempo applied.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from fractions import Fraction

from retune.errors import Finding, LimitError, Place, RetuneError, UnreadableError
from retune.score.bars import Frame, align
from retune.score.fermatas import HeldSpan, held_spans
from retune.score.ledger import Ledger
from retune.score.lines import Line
from retune.score.model import Bar, ChordSymbol, Part, Score
from retune.score.naming import short_name
from retune.score.options import ReadOptions
from retune.score.order import Step, playing_order
from retune.score.pace import Pace
from retune.score.parts import cast_parts
from retune.score.sounding import sounding_notes
from retune.score.tempo import TempoMap
from retune.score.tempo_marks import tempo_map
from retune.score.usable import usable
from retune.score.verses import with_shared_words
from retune.written import MarkKind, WrittenChordSymbol, WrittenScore


def build_score(
    written: WrittenScore, *, stem: str, file: str | None, options: ReadOptions
) -> Score:
    """The score as played.

    Parameters
    ----------
    written : WrittenScore
        What a reader made of the file.
    stem : str
        The file's name without its ending, the NAME of all outputs.
    file : str or None
        The file's name for errors and findings.
    options : ReadOptions

    Raises
    ------
    UnreadableError
        There are no notes.
    LimitError
        More notes or more time than the limits allow, once repeats are played out.
    WishError
        A part that is named as accompaniment is not in the score.
    """
    try:
        return _built(written, stem, file, options)
    except RetuneError as error:
        raise error.in_file(file) if file is not None else error from None


def _built(written: WrittenScore, stem: str, file: str | None, options: ReadOptions) -> Score:
    ledger = Ledger(file)
    written = usable(written, ledger)
    if not any(bar.notes for part in written.parts for bar in part.bars):
        raise UnreadableError(
            "the score has no notes that can be sung", hint="Check that it is the right file"
        )
    frames = align(written, ledger)
    casting = cast_parts(written, frames, options, ledger)
    lines = with_shared_words(casting.lines, ledger)
    steps = playing_order(
        frames, _notes_in_bars(lines, frames), options.limits.max_notes, ledger, options.repeats
    )
    tempo = _tempo(written, frames, steps, ledger, options)
    bars = _bars(frames, steps)
    _check_time(bars, tempo, options.limits.max_seconds)
    notes = sounding_notes(written, frames, steps, lines, ledger)
    return Score(
        stem=stem,
        title=written.title or stem,
        parts=_parts(lines, written),
        notes=notes,
        bars=bars,
        tempo=tempo,
        composer=written.composer,
        lyricist=written.lyricist,
        copyright=written.copyright,
        format=written.format,
        file=file,
        chord_symbols=_chord_symbols(written, bars),
        left_out=casting.left_out,
        findings=(*_in_file(written, file), *ledger.findings([frame.number for frame in frames])),
    )


def own_tempo(written: WrittenScore, options: ReadOptions) -> TempoMap:
    """The tempo that a score gives itself, whatever pace is wished; for one that can be built."""
    ledger = Ledger(None)
    written = usable(written, ledger)
    frames = align(written, ledger)
    notes = [0] * len(frames)
    steps = playing_order(frames, notes, options.limits.max_notes, ledger, options.repeats)
    return _tempo(written, frames, steps, ledger, replace(options, tempo=Pace()))


def _tempo(
    written: WrittenScore,
    frames: Sequence[Frame],
    steps: Sequence[Step],
    ledger: Ledger,
    options: ReadOptions,
) -> TempoMap:
    fermatas: Sequence[tuple[HeldSpan, ...]] = [()] * len(frames)
    if options.fermatas:
        fermatas = held_spans(written, frames, options.holds)
    return tempo_map(written, frames, steps, fermatas, ledger, options.tempo, options.tempi)


def _in_file(written: WrittenScore, file: str | None) -> Iterator[Finding]:
    for finding in written.findings:
        named = finding.where.file is not None
        yield finding if named else replace(finding, where=replace(finding.where, file=file))


def _notes_in_bars(lines: Sequence[Line], frames: Sequence[Frame]) -> list[int]:
    return [sum(len(line.bars[frame.index]) for line in lines) for frame in frames]


def _bars(frames: Sequence[Frame], steps: Sequence[Step]) -> tuple[Bar, ...]:
    bars = []
    onset = Fraction(0)
    for index, step in enumerate(steps):
        frame = frames[step.written]
        bars.append(
            Bar(
                index=index,
                written=step.written,
                number=frame.number,
                onset=onset,
                duration=frame.length,
                metre=frame.metre,
                key=frame.key,
                begins=frame.begins,
                run=step.run,
                rehearsal=frame.rehearsal,
            )
        )
        onset += frame.length
    return tuple(bars)


def _check_time(bars: Sequence[Bar], tempo: TempoMap, max_seconds: float) -> None:
    if tempo.seconds(bars[-1].end) <= max_seconds:
        return
    bar = next(bar for bar in bars if tempo.seconds(bar.end) > max_seconds)
    raise LimitError(
        f"plays longer than {max_seconds:g} seconds",
        Place(bar=bar.number),
        "Read it without repeats, check its tempo marks, or raise the limit on playing time",
    )


def _parts(lines: Sequence[Line], written: WrittenScore) -> tuple[Part, ...]:
    return tuple(
        Part(
            index=index,
            name=line.label.name,
            kind=line.kind,
            voice_type=line.label.voice_type,
            abbreviation=_abbreviation(line, lines, written),
            program=written.parts[line.written].program,
            source=written.parts[line.written].id,
            staff=line.staff,
            voice=line.voice,
        )
        for index, line in enumerate(lines)
    )


def _abbreviation(line: Line, lines: Sequence[Line], written: WrittenScore) -> str:
    """The file's own abbreviation where the part is one line, else first letters and number."""
    own = written.parts[line.written].abbreviation.strip()
    if own and sum(other.written == line.written for other in lines) == 1:
        return own
    return short_name(line.label.name)


def _chord_symbols(written: WrittenScore, bars: Sequence[Bar]) -> tuple[ChordSymbol, ...]:
    """Chord symbols as played; of several at one onset the first part's counts."""
    by_bar: dict[int, dict[Fraction, WrittenChordSymbol]] = {}
    for part in written.parts:
        for index, bar in enumerate(part.bars):
            for mark in bar.marks:
                if mark.kind is MarkKind.CHORD_SYMBOL and isinstance(
                    mark.value, WrittenChordSymbol
                ):
                    by_bar.setdefault(index, {}).setdefault(mark.onset, mark.value)
    return tuple(
        ChordSymbol(bar.onset + onset, symbol.root, symbol.kind, symbol.bass)
        for bar in bars
        for onset, symbol in sorted(by_bar.get(bar.written, {}).items(), key=lambda entry: entry[0])
        if onset <= bar.duration
    )
