"""What the page tells of each chord: tones, ratios, beats, shared partials, a vowel hint."""

from __future__ import annotations

from typing import Any

from retune.chordcard.fromscore import card_of
from retune.chordcard.model import ChordCard, Tone
from retune.harmony.model import Chord
from retune.harmony.symbols import chord_symbol, symbol_of
from retune.page.intervals import interval_name
from retune.score.moments import Moment, moments_of
from retune.tuning.model import TunedScore
from retune.tuning.policy import PRIME_LIMITS, Temperament
from retune.tuning.ratios import just_intervals
from retune.tuning.sounding import Row, sung_by_chord
from retune.units import ratio_to_cents
from retune.voice.beats import Pair

_MOST_PAIRS = 8
_NEAR = 60.0
"""Cents within which another size of an interval is still the same note."""


def cards(tuned: TunedScore) -> list[dict[str, Any]]:
    """One card for each chord, in order; short where nothing sounds."""
    rows, places = sung_by_chord(tuned), _places(tuned)
    return [
        _card(tuned, chord, row, places)
        for chord, row in zip(tuned.harmony.chords, rows, strict=True)
    ]


def _places(tuned: TunedScore) -> dict[int, list[Moment]]:
    """Moments by their bar in the file, for lines of the choices.

    None of a score that was transposed on wish: its choices are spelled as the file is.
    """
    found: dict[int, list[Moment]] = {}
    if not tuned.score.transposition.semitones:
        for moment in moments_of(tuned.score):
            found.setdefault(moment.written, []).append(moment)
    return found


def _card(
    tuned: TunedScore, chord: Chord, row: Row, places: dict[int, list[Moment]]
) -> dict[str, Any]:
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
    parts, found = sorted(row), card_of(tuned, row)
    root = tuned.root_cents[chord.index] or 0.0
    card |= {
        "symbol": chord_symbol(chord),
        "root": chord.root.name,
        "quality": str(chord.quality),
        "doubt": chord.doubtful,
        "confidence": round(chord.confidence, 2),
        "rootCents": round(root, 3),
        "tones": [_tone(part, one, root) for part, one in zip(parts, found.tones, strict=True)],
        "pairs": [_pair(pair, found) for pair in found.pairs[:_MOST_PAIRS]],
    }
    if chord.decided:
        card["decided"] = True
    own = places.get(bar.written, ())
    before = [one for one in own if one.inside <= chord.onset - bar.onset]
    if before and tuned.policy.temperament is Temperament.JUST:
        card["choose"] = {"at": before[-1].at, "sounds": before[-1].sounds}
        for tone, shown in zip(found.tones, card["tones"], strict=True):
            shown["sizes"] = _sizes(tone, chord, root)
    if chord.runner_up is not None:
        card["other"] = symbol_of(*chord.runner_up)
    if found.whole is not None:
        card["whole"] = round(found.whole.hz, 1)
    if found.hint is not None:
        card["hint"] = found.hint.words
    return card


def _sizes(tone: Tone, chord: Chord, root: float) -> list[list[Any]]:
    """Other just sizes of a tone's interval: the ratio, and how many times its Hz that is."""
    if tone.ratio is None or chord.root is None:
        return []
    fifths = tone.pitch.pitch_class.fifths - chord.root.fifths
    steps = (tone.pitch.key - chord.root.chroma) % 12
    here = tone.cents - root + 100.0 * steps
    found = []
    for ratio in just_intervals(fifths, max(PRIME_LIMITS)):
        away = (ratio_to_cents(ratio) - here + 600.0) % 1200.0 - 600.0
        if ratio != tone.ratio and abs(away) <= _NEAR:
            times = round(2.0 ** (away / 1200.0), 8)
            found.append([f"{ratio.numerator}/{ratio.denominator}", times])
    return found


def _tone(part: int, tone: Tone, root: float) -> dict[str, Any]:
    """`cents` are against equal temperament, `rel` those of the interval above the root."""
    return {
        "p": part,
        "n": tone.pitch.name,
        "ratio": f"{tone.ratio.numerator}:{tone.ratio.denominator}" if tone.ratio else "",
        "cents": round(tone.cents, 3),
        "rel": round(tone.cents - root, 3),
        "hz": round(tone.hz, 4),
        "eq": round(tone.equal_hz, 4),
        "role": tone.role,
    }


def _pair(pair: Pair, card: ChordCard) -> dict[str, Any]:
    low, high = card.tones[pair.low].pitch.key, card.tones[pair.high].pitch.key
    return {
        "a": pair.low,
        "b": pair.high,
        "name": interval_name(high - low),
        "ratio": f"{pair.ratio.numerator}:{pair.ratio.denominator}",
        "here": round(pair.beat_hz, 3),
        "equal": round(pair.equal_hz, 3),
        "shared": [[s.low_partial, s.high_partial, round(s.hz, 1)] for s in pair.shared],
    }
