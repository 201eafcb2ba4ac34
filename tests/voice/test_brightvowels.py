"""Vowels for a partial, against the table of Bennett and Rodet (handbook, voice.md 1.3, 4.2)."""

from __future__ import annotations

import pytest

from retune.score.model import VoiceType
from retune.voice.brightvowels import SUNG_VOWELS, vowel_levels

C3 = 130.8128

# voice.md 4.2: the closest formants to partials of a bass's C3, in cents from partial to formant.
CLOSEST = [
    (VoiceType.TENOR, 5, "a", 1, 650.0, -11),
    (VoiceType.BASS, 3, "e", 1, 400.0, 33),
    (VoiceType.BASS, 3, "o", 1, 400.0, 33),
    (VoiceType.SOPRANO, 6, "a", 1, 800.0, 33),
    (VoiceType.ALTO, 6, "o", 2, 800.0, 33),
]


@pytest.mark.parametrize(("voice", "partial", "vowel", "formant", "hz", "cents"), CLOSEST)
def test_nearest_formant_is_that_of_the_table(
    voice: VoiceType, partial: int, vowel: str, formant: int, hz: float, cents: float
) -> None:
    found = {one.vowel: one for one in vowel_levels(C3, voice, partial)}[vowel]
    assert (found.formant, found.formant_hz) == (formant, hz)
    assert found.cents == pytest.approx(cents, abs=1.0)


def test_strongest_comes_first_and_all_vowels_of_the_table_are_there() -> None:
    found = vowel_levels(C3, VoiceType.BASS, 5)
    assert {one.vowel for one in found} == set(SUNG_VOWELS) == set("aeiou")
    assert [one.level_db for one in found] == sorted((one.level_db for one in found), reverse=True)
    # 654 Hz lies on F1 of /a/ (600) and between F1 and F2 of /i/ (250, 1750).
    assert found[0].vowel == "a"
    assert found[-1].vowel == "i"


def test_formants_follow_a_high_pitch() -> None:
    """F1 is never left below the fundamental (voice.md 1.3)."""
    for one in vowel_levels(700.0, VoiceType.SOPRANO, 1):
        assert one.formant_hz >= 700.0
