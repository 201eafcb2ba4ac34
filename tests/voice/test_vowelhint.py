"""Vowel hints: small moves of a formant towards a partial that two singers share."""

from __future__ import annotations

from fractions import Fraction

import pytest

from retune.score.model import VoiceType
from retune.voice.beats import SoundingTone, pairs
from retune.voice.formants import formants
from retune.voice.vowelhint import LEAST_MOVE, MOST_MOVE, hint

F = Fraction
VOICES = [VoiceType.BASS, VoiceType.TENOR, VoiceType.ALTO, VoiceType.SOPRANO]


def chord(root: float) -> list[SoundingTone]:
    """A major triad with its third in the alto: bass, fifth, tenth, double octave."""
    rows = [(F(1), 1.0), (F(3, 2), 1.5), (F(5, 4), 2.5), (F(1), 4.0)]
    return [SoundingTone(root * size, root * size, ratio) for ratio, size in rows]


@pytest.mark.parametrize("root", [98.0, 110.0, 123.5, 130.8, 146.8])
def test_a_hint_moves_one_formant_a_little_to_a_shared_partial(root: float) -> None:
    tones = chord(root)
    found = hint([tone.hz for tone in tones], VOICES, pairs(tones))
    if found is None:
        return
    assert found.hz == pytest.approx(found.partial * tones[found.tone].hz)
    assert found.hz == pytest.approx(found.other_partial * tones[found.other].hz)
    now = formants(VOICES[found.tone], "neutral")
    moves = [found.hz / centre - 1.0 for centre in now.hz[:2]]
    move = min(moves, key=abs)
    assert LEAST_MOVE <= abs(move) <= MOST_MOVE
    assert found.brighter == (move > 0)
    # The vowel that is named lies on that side.
    number = moves.index(move)
    there = formants(VOICES[found.tone], found.toward).hz[number]
    assert (there > now.hz[number]) == found.brighter
    assert found.gain_db > 0


def test_some_chords_have_hints() -> None:
    found = [hint([t.hz for t in chord(r)], VOICES, pairs(chord(r))) for r in (98.0, 110.0, 130.8)]
    assert any(found)


def test_no_hint_for_what_nobody_sings_or_for_high_sopranos() -> None:
    tones = chord(130.8)
    assert hint([t.hz for t in tones], [None] * 4, pairs(tones)) is None
    high = [SoundingTone(880.0, 880.0, F(1)), SoundingTone(1100.0, 1100.0, F(5, 4))]
    assert hint([t.hz for t in high], [VoiceType.SOPRANO] * 2, pairs(high)) is None
