"""What a MIDI file says about the whole piece: clock, tempo, metres, keys, markers, words.

Conventions
-----------
* Onsets are `Fraction` quarter notes from the start.
* A file that counts frames (SMPTE) has no beats: half a second makes a quarter note there, the
  120 quarter notes a minute that RP-001 gives a file without a tempo.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from typing import TypeVar

from retune.adapters.midi import Meta, MetaType, RawMidi, RawTrack, SmpteDivision, text_of
from retune.errors import Finding, Weight

DEFAULT_QPM = Fraction(120)
"""Quarter notes a minute where a MIDI file gives no tempo (RP-001)."""

Value = TypeVar("Value")

_DROP_FRAME = 29
_DROP_FRAME_RATE = Fraction(30000, 1001)
_SMALLEST_BEAT = 7
_KEY_RANGE = range(-7, 8)


@dataclass(frozen=True)
class Conductor:
    """The values of the whole piece, by onset; a tempo always stands at 0."""

    tempos: dict[Fraction, Fraction]
    metres: dict[Fraction, tuple[int, int]]
    keys: dict[Fraction, tuple[int, str | None]]
    markers: dict[Fraction, str]
    copyright: str = ""
    findings: tuple[Finding, ...] = ()


def ticks_per_quarter(division: int | SmpteDivision) -> Fraction:
    """Ticks of one quarter note.

    >>> ticks_per_quarter(SmpteDivision(25, 40))
    Fraction(500, 1)
    """
    if isinstance(division, int):
        return Fraction(division)
    rate = _DROP_FRAME_RATE if division.frames == _DROP_FRAME else Fraction(division.frames)
    return rate * division.ticks * 60 / DEFAULT_QPM


def _tempo(data: bytes) -> Fraction | None:
    microseconds = int.from_bytes(data[:3])
    return Fraction(60_000_000, microseconds) if len(data) >= 3 and microseconds else None


def _metre(data: bytes) -> tuple[int, int] | None:
    if len(data) < 2 or data[0] == 0 or data[1] > _SMALLEST_BEAT:
        return None
    return data[0], 2 ** data[1]


def _key(data: bytes) -> tuple[int, str | None] | None:
    if len(data) < 2:
        return None
    fifths = int.from_bytes(data[:1], signed=True)
    return (fifths, "minor" if data[1] else "major") if fifths in _KEY_RANGE else None


def _text(data: bytes) -> str | None:
    return " ".join(text_of(data).split()) or None


def in_sequence(raw: RawMidi) -> RawMidi:
    """A format 2 file with its patterns one after another; any other file as it is."""
    if raw.format != 2:
        return raw
    tracks, start = [], 0
    for track in raw.tracks:
        events = tuple((start + tick, event) for tick, event in track.events)
        start += track.end
        tracks.append(RawTrack(events, start))
    return RawMidi(raw.format, raw.division, tuple(tracks))


class _Metas:
    """The meta events of all tracks, by tick; those that make no sense become findings."""

    def __init__(self, raw: RawMidi) -> None:
        per_quarter = ticks_per_quarter(raw.division)
        events = ((tick, event) for track in raw.tracks for tick, event in track.events)
        found = [(tick / per_quarter, event) for tick, event in events if isinstance(event, Meta)]
        self._metas = sorted(found, key=lambda item: item[0])
        self.findings: list[Finding] = []

    def read(
        self, kind: MetaType, name: str, decode: Callable[[bytes], Value | None]
    ) -> dict[Fraction, Value]:
        """The values of one kind, by onset; of two at one onset the later counts."""
        values: dict[Fraction, Value] = {}
        for onset, meta in self._metas:
            if meta.type != kind:
                continue
            value = decode(meta.data)
            if value is not None:
                values[onset] = value
            elif meta.data:
                what = f"a {name} that makes no sense was left out ({meta.data[:8].hex(' ')})"
                self.findings.append(Finding(Weight.LOSS, what))
        return values


def conductor_of(raw: RawMidi) -> Conductor:
    """Gather tempo, metre, key and markers from all tracks; what is missing is a finding."""
    metas = _Metas(raw)
    counts_time = isinstance(raw.division, SmpteDivision)
    tempos = {} if counts_time else metas.read(MetaType.TEMPO, "tempo", _tempo)
    metres = metas.read(MetaType.TIME_SIGNATURE, "time signature", _metre)
    notices = metas.read(MetaType.COPYRIGHT, "copyright notice", _text)
    start = Fraction(0)
    doubts = {
        "the file counts frames, not beats; half a second is read as a quarter note": counts_time,
        "no time signature at the start; the music is barred in 4/4": start not in metres,
        f"no tempo at the start; {DEFAULT_QPM} quarter notes a minute, the standard's default": (
            start not in tempos and not counts_time
        ),
        "patterns of a format 2 file are read one after another": raw.format == 2,
    }
    found = [Finding(Weight.DOUBT, what) for what, holds in doubts.items() if holds]
    return Conductor(
        tempos={start: DEFAULT_QPM, **tempos},
        metres=metres,
        keys=metas.read(MetaType.KEY_SIGNATURE, "key signature", _key),
        markers=metas.read(MetaType.MARKER, "marker", _text),
        copyright="; ".join(notices.values()),
        findings=(*found, *metas.findings),
    )
