"""The conductor track: title, tempo, metre, keys and rehearsal marks of a piece."""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from itertools import count, takewhile

from retune.adapters.midi import Meta, MetaType, RawTrack
from retune.export.midi_text import copyright_bytes, text_bytes
from retune.export.ticks import Ticks
from retune.score.model import Bar, Score

MOST_MICROSECONDS = 16_777_215
"""Longest quarter note a MIDI file can state; about 3.6 a minute."""

_CLOCKS_PER_QUARTER = 24
_FINEST_BEAT = 64


def conductor(score: Score, ticks: Ticks, end: int) -> RawTrack:
    """The first track of a format 1 file; `end` is the tick where the piece ends."""
    events = [(0, event) for event in _words(score)]
    events += _tempos(score, ticks)
    events += _bars(score, ticks)
    return RawTrack(tuple(sorted(events, key=lambda event: event[0])), end)


def slowest_tempo_lost(score: Score) -> bool:
    """Whether some tempo is too slow for a MIDI file to state."""
    return any(60_000_000 / change.qpm > MOST_MICROSECONDS for change in score.tempo.changes)


def _words(score: Score) -> Iterator[Meta]:
    """Copyright first, as RP-001 asks, then the title as the name of the sequence."""
    if score.copyright:
        yield Meta(MetaType.COPYRIGHT, copyright_bytes(score.copyright))
    yield Meta(MetaType.TRACK_NAME, text_bytes(score.title or score.stem))
    for label, words in (("Composer", score.composer), ("Words", score.lyricist)):
        if words:
            yield Meta(MetaType.TEXT, text_bytes(f"{label}: {words}"))


def _tempos(score: Score, ticks: Ticks) -> Iterator[tuple[int, Meta]]:
    """Tempo changes to the microsecond a quarter note."""
    by_tick = {ticks.at(change.onset): change.qpm for change in score.tempo.changes}
    written = None
    for tick, qpm in by_tick.items():
        microseconds = min(max(_rounded(60_000_000 / qpm), 1), MOST_MICROSECONDS)
        if microseconds != written:
            yield tick, Meta(MetaType.TEMPO, microseconds.to_bytes(3))
            written = microseconds


def _rounded(value: Fraction) -> int:
    return (2 * value.numerator + value.denominator) // (2 * value.denominator)


def _bars(score: Score, ticks: Ticks) -> Iterator[tuple[int, Meta]]:
    """Time and key signatures where they change, and rehearsal marks."""
    metre, key = None, None
    for bar in score.bars:
        tick = ticks.at(bar.onset)
        if (found := sounding_metre(bar)) != metre:
            metre = found
            yield tick, _time_signature(*found)
        if bar.key != key:
            key = bar.key
            if -7 <= key[0] <= 7:
                minor = key[1] in ("minor", "aeolian")
                yield tick, Meta(MetaType.KEY_SIGNATURE, bytes((key[0] & 0xFF, minor)))
        if bar.rehearsal:
            yield tick, Meta(MetaType.MARKER, text_bytes(bar.rehearsal))


def sounding_metre(bar: Bar) -> tuple[int, int]:
    """The time signature that makes a sequencer's bar as long as this one.

    A pick-up of one quarter note in 4/4 is a bar of 1/4, so that all bar lines after it stand
    where the score has them.
    """
    beats, unit = bar.metre
    # MIDI states the unit as a power of two; a score may have any.
    coarsest = unit if unit & (unit - 1) == 0 else 4
    for finer in takewhile(lambda one: one <= _FINEST_BEAT, (coarsest << n for n in count())):
        length = bar.duration * finer / 4
        if length.denominator == 1 and 0 < length <= 255:
            return int(length), finer
    return beats, coarsest


def _time_signature(beats: int, unit: int) -> Meta:
    """FF 58: a metronome click is a beat, three of them where the metre is compound."""
    grouped = 3 if unit >= 8 and beats % 3 == 0 and beats > 3 else 1
    clocks = min(_CLOCKS_PER_QUARTER * 4 * grouped // unit, 255)
    data = bytes((min(beats, 255), unit.bit_length() - 1, max(clocks, 1), 8))
    return Meta(MetaType.TIME_SIGNATURE, data)
