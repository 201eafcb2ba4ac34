"""What the page tells of each chord: tones, ratios, beats, shared partials, a vowel hint."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

from retune.harmony.model import Chord, Role
from retune.harmony.symbols import chord_symbol, symbol_of
from retune.page.intervals import interval_name
from retune.score.model import VoiceType
from retune.tuning.model import Segment, TunedNote, TunedScore
from retune.tuning.sounding import Row, sung_by_chord
from retune.units import hz_of
from retune.voice.beats import Pair, SoundingTone, pairs
from retune.voice.partials import chord_partial
from retune.voice.vowelhint import hint

_MOST_PAIRS = 8


def cards(tuned: TunedScore) -> list[dict[str, Any]]:
    """One card for each chord, in order; short where nothing sounds."""
    rows = sung_by_chord(tuned)
    return [_card(tuned, chord, row) for chord, row in zip(tuned.harmony.chords, rows, strict=True)]


def _card(tuned: TunedScore, chord: Chord, row: Row) -> dict[str, Any]:
    bar = tuned.score.bar_at(chord.onset)
    start, end = tuned.seconds(chord.onset), tuned.seconds(chord.end)
    card: dict[str, Any] = {
        "t": round(start, 4),
        "d": round(end - start, 4),
        "bar": bar.number,
        "beat": str(tuned.score.beat_at(chord.onset)),
        "w": bar.written,
    }
    if chord.root is None or chord.quality is None:
        return card
    parts = sorted(row)
    sung = [row[part] for part in parts]
    tones = [_sounding(tuned, *one) for one in sung]
    found = pairs(tones, tuned.policy.prime_limit)
    root = tuned.root_cents[chord.index] or 0.0
    card |= {
        "symbol": chord_symbol(chord),
        "root": chord.root.name,
        "quality": str(chord.quality),
        "doubt": chord.doubtful,
        "confidence": round(chord.confidence, 2),
        "rootCents": round(root, 3),
        "tones": [_tone(tuned, note, segment, root) for note, segment in sung],
        "pairs": [_pair(pair, sung) for pair in found[:_MOST_PAIRS]],
    }
    if chord.runner_up is not None:
        card["other"] = symbol_of(*chord.runner_up)
    if (whole := _whole(tones)) is not None:
        card["whole"] = round(whole, 1)
    voices = [_voice(tuned, part) for part in parts]
    names = [tuned.score.parts[part].name for part in parts]
    advice = hint([tone.hz for tone in tones], voices, found, names=names)
    if advice is not None:
        card["hint"] = advice.words
    return card


def _sounding(tuned: TunedScore, note: TunedNote, segment: Segment) -> SoundingTone:
    equal = hz_of(note.note.pitch.key, 0.0, tuned.policy.reference_hz)
    return SoundingTone(tuned.hz(note, segment), equal, segment.ratio)


def _tone(tuned: TunedScore, note: TunedNote, segment: Segment, root: float) -> dict[str, Any]:
    """`cents` are against equal temperament, `rel` those of the interval above the root."""
    ratio = segment.ratio
    return {
        "p": note.note.part,
        "n": note.note.pitch.name,
        "ratio": f"{ratio.numerator}:{ratio.denominator}" if ratio is not None else "",
        "cents": round(segment.cents, 3),
        "rel": round(segment.cents - root, 3),
        "hz": round(tuned.hz(note, segment), 4),
        "eq": round(hz_of(note.note.pitch.key, 0.0, tuned.policy.reference_hz), 4),
        "role": "" if segment.role is Role.CHORD_TONE else str(segment.role),
    }


def _pair(pair: Pair, sung: list[tuple[TunedNote, Segment]]) -> dict[str, Any]:
    low, high = sung[pair.low][0].note.pitch.key, sung[pair.high][0].note.pitch.key
    return {
        "a": pair.low,
        "b": pair.high,
        "name": interval_name(high - low),
        "ratio": f"{pair.ratio.numerator}:{pair.ratio.denominator}",
        "here": round(pair.beat_hz, 3),
        "equal": round(pair.equal_hz, 3),
        "shared": [[s.low_partial, s.high_partial, round(s.hz, 1)] for s in pair.shared],
    }


def _whole(tones: list[SoundingTone]) -> float | None:
    """The lowest partial that all tones of a chord share, in Hz."""
    if len(tones) < 3:
        return None
    lowest = min(tones, key=lambda tone: tone.hz)
    ratios = []
    for tone in tones:
        if tone.ratio is None or lowest.ratio is None:
            return None
        octaves = round(math.log2(tone.hz / lowest.hz / float(tone.ratio / lowest.ratio)))
        ratios.append(tone.ratio / lowest.ratio * Fraction(2) ** octaves)
    found = chord_partial(ratios, lowest.hz)
    return None if found is None else found.hz


def _voice(tuned: TunedScore, part: int) -> VoiceType | None:
    return tuned.score.parts[part].voice_type
