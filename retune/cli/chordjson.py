"""One chord as a JSON document, for programs.

Frequencies and beats are in Hz, cents against equal temperament, fractions are text.
"""

from __future__ import annotations

import json
from fractions import Fraction
from typing import Any

from retune.chordcard.found import FoundChord
from retune.chordcard.model import Tone, proportion
from retune.chordcard.others import Sound, alternatives, inversions, sound_equal, sound_here
from retune.chordcard.vowels import minor_third_rub, shared_by_voice
from retune.page.intervals import interval_name
from retune.voice.beats import Pair

_PLACES = 6


def chord_json(chord: FoundChord) -> str:
    """The document, indented."""
    return json.dumps(document(chord), ensure_ascii=False, indent=1)


def document(chord: FoundChord) -> dict[str, Any]:
    """The same as plain values; indices of tones count from the lowest, 0."""
    reading, card = chord.reading, chord.card
    rub = minor_third_rub(chord)
    numbers = proportion([tone.sounding for tone in chord.tones])
    return {
        "format": "retune-chord",
        "version": 1,
        "place": chord.place or None,
        "root": reading.root.name,
        "quality": str(reading.quality) if reading.quality is not None else None,
        "symbol": reading.symbol or None,
        "rivals": [one.symbol for one in chord.rivals],
        "reference_hz": chord.tones[0].reference_hz,
        "prime_limit": chord.limit,
        "root_cents": _round(chord.root_cents),
        "whole_numbers": list(numbers) if numbers is not None else None,
        "tones": [
            _tone(tone, str(degree) if degree is not None else None)
            for tone, degree in zip(chord.tones, reading.degrees, strict=True)
        ],
        "pairs": [_pair(pair, chord) for pair in card.pairs],
        "shared_by_all": None
        if card.whole is None
        else {"hz": _round(card.whole.hz), "partials": list(card.whole.numbers)},
        "here": _sound(sound_here(chord)),
        "equal": _sound(sound_equal(chord)),
        "vowels": [
            {
                "tone": one.tone,
                "partial": one.partial,
                "meets_tone": one.other,
                "meets_partial": one.other_partial,
                "hz": _round(one.hz),
                "levels_db": {v.vowel: round(v.level_db, 2) for v in one.vowels},
            }
            for one in shared_by_voice(chord)
        ],
        "hint": card.hint.words if card.hint is not None else None,
        "minor_third_rub": None
        if rub is None
        else {
            "tone": rub.bass,
            "third": rub.third,
            "cents": _round(rub.cents),
            "hz": _round(rub.hz),
        },
        "alternatives": [
            {
                "whole_numbers": list(one.numbers) or None,
                "chosen": one.chosen,
                "limit": one.limit,
                "differs": [
                    {"degree": str(degree), "ratio": _ratio(ratio), "cents": _round(cents)}
                    for degree, ratio, cents in one.differs
                ],
                **_sound(one.sound),
            }
            for one in alternatives(chord)
        ],
        "inversions": [
            {
                "pitches": [pitch.name for pitch in one.pitches],
                "whole_numbers": list(one.numbers) or None,
                "just": _sound(one.just),
                "equal": _sound(one.equal),
            }
            for one in inversions(chord)
        ],
    }


def _round(value: float) -> float:
    return round(value, _PLACES) + 0.0


def _ratio(ratio: Fraction | None) -> str | None:
    return None if ratio is None else f"{ratio.numerator}/{ratio.denominator}"


def _tone(tone: Tone, degree: str | None) -> dict[str, Any]:
    return {
        "voice": tone.name,
        "pitch": tone.pitch.name,
        "key": tone.pitch.key,
        "degree": degree,
        "ratio": _ratio(tone.ratio),
        "cents": _round(tone.cents),
        "hz": _round(tone.hz),
        "equal_hz": _round(tone.equal_hz),
    }


def _pair(pair: Pair, chord: FoundChord) -> dict[str, Any]:
    low, high = chord.tones[pair.low].pitch.key, chord.tones[pair.high].pitch.key
    return {
        "low": pair.low,
        "high": pair.high,
        "interval": interval_name(high - low),
        "ratio": _ratio(pair.ratio),
        "beats": _round(pair.beat_hz),
        "equal_beats": _round(pair.equal_hz),
        "shared": [
            {"low": one.low_partial, "high": one.high_partial, "hz": _round(one.hz)}
            for one in pair.shared
        ],
    }


def _sound(sound: Sound) -> dict[str, Any]:
    return {
        "roughness": _round(sound.roughness),
        "beating": [_round(hz) for hz in sound.beating],
    }
