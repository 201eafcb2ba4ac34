"""MIDI files as written scores: tick for tick, barred, spelled from context, never quantised.

Conventions
-----------
* One tick is exactly 1/division of a quarter note; onsets count from the start of the piece.
* Each channel of each track is a part; channel 10 has no pitches and is left out.
* A MIDI file is played out already: nothing in it is a repeat or a jump, and its markers are
  rehearsal marks.
* Pitch bends change nothing: notes stand at their keys.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from fractions import Fraction

from retune.adapters.midi import Bend, RawMidi, read_midi_file
from retune.errors import Finding, LimitError, Place, UnreadableError, Weight
from retune.limits import Limits
from retune.pitch import Pitch
from retune.score.midi.bars import BarGrid
from retune.score.midi.conductor import Conductor, conductor_of, in_sequence, ticks_per_quarter
from retune.score.midi.lyrics import lyrics_of
from retune.score.midi.notes import RHYTHM_CHANNEL, pedals_of
from retune.score.midi.parts import Line, Words, line_of, written_part
from retune.score.midi.streams import Stream, streams_of, title_of
from retune.score.midi.undo import as_before
from retune.score.spelling import spell
from retune.score.tempo import TempoChange, TempoMap
from retune.written import Mark, MarkKind, WrittenScore

_CENTRE_BEND = 8192


def read_midi(data: bytes, limits: Limits | None = None) -> WrittenScore:
    """Read a Standard MIDI File.

    Raises
    ------
    UnreadableError
        Not a MIDI file, a damaged one, or one without pitched notes.
    LimitError
        Larger or longer than `limits` allows.
    """
    limits = limits or Limits()
    raw = as_before(in_sequence(read_midi_file(data, limits)))
    conductor = conductor_of(raw)
    streams = streams_of(raw)
    clock = ticks_per_quarter(raw.division)
    lines = _pitched_lines(streams, clock)
    end = max(note.end for line in lines for note in line.notes)
    _check_length(conductor, end, limits)
    voices = sum(len(line.voices) for line in lines)
    grid = BarGrid(conductor.metres, end, limits.max_notes // voices)
    _check_noteheads(lines, grid, limits)
    lyrics, lost = lyrics_of(raw, lines, clock)
    words = Words(_pitches(lines, conductor), lyrics)
    keys = {grid.index_at(onset): key for onset, key in conductor.keys.items() if onset < end}
    marks = _marks(conductor, grid, end)
    pedals = pedals_of(raw)
    return WrittenScore(
        parts=tuple(
            written_part(
                line,
                grid,
                words,
                keys,
                {} if index else marks,
                [(down / clock, up / clock) for down, up in pedals.get(line.stream.channel, ())],
            )
            for index, line in enumerate(lines)
        ),
        title=title_of(raw, streams),
        copyright=conductor.copyright,
        format="midi",
        findings=(
            *conductor.findings,
            *_grid_findings(grid),
            *_stream_findings(streams, grid, clock),
            *_bend_findings(raw),
            *(Finding(Weight.LOSS, what, grid.place(onset)) for onset, what in lost),
            Finding(Weight.NOTE, "MIDI has no spelling; pitches were spelled from their context"),
        ),
    )


def _pitched_lines(streams: Sequence[Stream], clock: Fraction) -> list[Line]:
    lines = [line_of(stream, clock) for stream in streams if stream.channel != RHYTHM_CHANNEL]
    sounding = [line for line in lines if line.voices]
    if not sounding:
        raise UnreadableError(
            "the MIDI file has no notes with a pitch",
            hint="Export it again with the voices on channels other than 10",
        )
    return sounding


def _check_length(conductor: Conductor, end: Fraction, limits: Limits) -> None:
    changes = [TempoChange(onset, qpm) for onset, qpm in sorted(conductor.tempos.items())]
    seconds = TempoMap(tuple(changes)).seconds(end)
    if seconds > limits.max_seconds:
        raise LimitError(
            f"the MIDI file plays for {seconds:.0f} seconds; at most {limits.max_seconds:.0f} are"
            " read"
        )


def _check_noteheads(lines: Sequence[Line], grid: BarGrid, limits: Limits) -> None:
    """Notes held over many bars are cut into a notehead for each: hold them to the limit too."""
    heads = sum(len(grid.bars_of(note.onset, note.end)) for line in lines for note in line.notes)
    if heads > limits.max_notes:
        raise LimitError(
            f"tied over the bar lines, the MIDI file has {heads} noteheads; at most"
            f" {limits.max_notes} are read"
        )


def _pitches(lines: Sequence[Line], conductor: Conductor) -> Mapping[str, Pitch]:
    notes = [note for line in lines for note in line.notes]
    keys = sorted((onset, fifths) for onset, (fifths, _) in conductor.keys.items())
    spelled = spell([(note.onset, note.key) for note in notes], keys)
    return {note.source: pitch for note, pitch in zip(notes, spelled, strict=True)}


def _marks(conductor: Conductor, grid: BarGrid, end: Fraction) -> dict[int, list[Mark]]:
    """Tempos and markers up to the end of the music, by bar."""
    signs: list[tuple[Fraction, MarkKind, Fraction | str]] = [
        *((onset, MarkKind.TEMPO, qpm) for onset, qpm in conductor.tempos.items()),
        *((onset, MarkKind.REHEARSAL, text) for onset, text in conductor.markers.items()),
    ]
    marks: defaultdict[int, list[Mark]] = defaultdict(list)
    for onset, kind, value in sorted(signs, key=lambda sign: sign[0]):
        if onset < end:
            bar = grid.index_at(onset)
            marks[bar].append(Mark(kind, onset - grid.spans[bar].onset, value))
    return dict(marks)


def _grid_findings(grid: BarGrid) -> Iterator[Finding]:
    for index, span in enumerate(grid.spans):
        if span.cut:
            what = "a new metre begins inside this bar, which was cut short"
            yield Finding(Weight.DOUBT, what, Place(bar=str(index + 1)))


def _stream_findings(
    streams: Sequence[Stream], grid: BarGrid, clock: Fraction
) -> Iterator[Finding]:
    for stream in streams:
        name = stream.name or stream.id
        if stream.channel == RHYTHM_CHANNEL:
            what = "notes of the rhythm channel (10), which have no pitch, were left out"
            yield Finding(Weight.LOSS, f"{what}: {len(stream.notes)}", Place(part=name))
            continue
        hanging = [note for note in stream.notes if note.hanging]
        empty = [note for note in stream.notes if note.end == note.onset]
        for weight, what, notes in (
            (Weight.DOUBT, "notes that nothing releases were held to the end", hanging),
            (Weight.LOSS, "notes without length were left out", empty),
        ):
            if notes:
                place = grid.place(notes[0].onset / clock, name)
                yield Finding(weight, f"{what}: {len(notes)}", place)


def _bend_findings(raw: RawMidi) -> Iterator[Finding]:
    bends = sum(
        isinstance(event, Bend) and event.value != _CENTRE_BEND
        for track in raw.tracks
        for _, event in track.events
    )
    if bends:
        what = "pitch bends are not analysed; MIDI given back keeps them, other outputs do not"
        yield Finding(Weight.NOTE, f"{what}: {bends}")
