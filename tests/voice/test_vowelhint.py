"""Vowel hints: small changes of a vowel that bring out a partial which two singers share."""

from __future__ import annotations

import math
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from retune.score.model import VoiceType
from retune.voice.beats import SoundingTone, pairs
from retune.voice.formants import formants
from retune.voice.spectrum import spectrum
from retune.voice.vowelhint import LEAST_GAIN_DB, MOST_MOVE, Hint, hint

F = Fraction
C3, G2 = 130.8127826502993, 97.99885899543733
BASS, TENOR, ALTO, SOPRANO = VoiceType.BASS, VoiceType.TENOR, VoiceType.ALTO, VoiceType.SOPRANO
CHOIR = [BASS, TENOR, ALTO, SOPRANO]
SUNG = ("i", "e", "a", "o", "u")
VOWEL = st.sampled_from(("neutral", *SUNG))

# Bass, tenor, alto and soprano: ratios above the root and sizes above the bass.
MAJOR_TENTH = [(F(1), 1.0), (F(3, 2), 1.5), (F(5, 4), 2.5), (F(1), 4.0)]
OPEN_MAJOR = [(F(1), 1.0), (F(5, 4), 2.5), (F(3, 2), 3.0), (F(1), 4.0)]
MINOR_TENTH = [(F(1), 1.0), (F(3, 2), 1.5), (F(6, 5), 2.4), (F(1), 4.0)]
CHORDS = st.sampled_from((MAJOR_TENTH, OPEN_MAJOR, MINOR_TENTH))


def tones_of(rows: list[tuple[Fraction, float]], root: float) -> list[SoundingTone]:
    return [SoundingTone(root * size, root * size, ratio) for ratio, size in rows]


def advice(
    rows: list[tuple[Fraction, float]], root: float, vowel: str = "neutral"
) -> tuple[list[SoundingTone], Hint | None]:
    tones = tones_of(rows, root)
    return tones, hint([tone.hz for tone in tones], CHOIR, pairs(tones), vowel)


def cents(a: float, b: float) -> float:
    return abs(1200.0 * math.log2(a / b))


def gain_of(hz: float, centre: float, bandwidth: float) -> float:
    """A resonance's gain by its poles, the handbook's formula in complex form (2.1)."""
    pole, at = complex(-math.pi * bandwidth, 2 * math.pi * centre), 2j * math.pi * hz
    return abs(pole) ** 2 / abs((at - pole) * (at - pole.conjugate()))


@pytest.mark.parametrize(
    ("hz", "voice", "vowel", "number", "off"),
    [
        # Nearest formants of the sung table (voice.md 4.2).
        (5 * C3, TENOR, "a", 0, 11),
        (3 * C3, BASS, "e", 0, 33),
        (3 * C3, BASS, "o", 0, 33),
        (6 * C3, ALTO, "a", 0, 33),
        (6 * C3, SOPRANO, "o", 1, 33),
        (3 * G2, TENOR, "i", 0, 24),
        (6 * G2, BASS, "a", 0, 35),
        (6 * G2, TENOR, "u", 1, 35),
        (5 * G2, ALTO, "o", 0, 147),
        (10 * G2, BASS, "a", 1, 103),
    ],
)
def test_the_formants_nearest_to_a_partial(
    hz: float, voice: VoiceType, vowel: str, number: int, off: int
) -> None:
    assert round(cents(hz, formants(voice, vowel).hz[number])) == off
    # Nothing of the four voices' table lies nearer.
    nearest = min(
        cents(hz, formants(one, name).hz[n]) for one in CHOIR for name in SUNG for n in (0, 1)
    )
    assert round(nearest) == off


def test_the_tenth_partial_on_c3_wants_an_open_central_vowel() -> None:
    # Nothing nearer than 223 cents (voice.md 4.2); a formant may move by 242 at the most.
    off = min(
        cents(10 * C3, formants(v, name).hz[n]) for v in CHOIR for name in SUNG for n in (0, 1)
    )
    assert round(off) == 223
    _, found = advice(MAJOR_TENTH, C3)
    assert found is None or round(found.hz) != 1308


def test_a_bass_on_a_low_a_with_the_alto_a_tenth_above() -> None:
    tones = tones_of([MAJOR_TENTH[0], MAJOR_TENTH[2]], 110.0)
    found = hint([tone.hz for tone in tones], [BASS, ALTO], pairs(tones), "a")
    assert found is not None
    # The bass's /a/ has F2 at 1040 Hz (voice.md 1.3), 5.8 % below its tenth partial.
    assert (found.tone, found.partial, found.other, found.other_partial) == (0, 10, 1, 4)
    assert found.moves[1] == pytest.approx(1100 / 1040 - 1)
    assert found.brighter
    assert found.words == (
        "A slightly brighter vowel in the bass, towards e, brings out its 10th partial at 1100 Hz, "
        "which meets the 4th of the alto: a mistuning between them is then easier to hear."
    )


@given(CHORDS, st.floats(70.0, 300.0), VOWEL)
def test_a_hint_is_a_small_change_that_strengthens_the_weaker_partial(
    rows: list[tuple[Fraction, float]], root: float, vowel: str
) -> None:
    tones, found = advice(rows, root, vowel)
    if found is None:
        return
    voice, f0 = CHOIR[found.tone], tones[found.tone].hz
    assert found.partial > 1
    assert found.hz == pytest.approx(found.partial * f0)
    assert found.hz == pytest.approx(found.other_partial * tones[found.other].hz)
    # One formant lands on the partial, and neither goes far or beyond the vowel that is named.
    now, there = formants(voice, vowel), formants(voice, found.toward)
    moved = [now.hz[n] * (1 + found.moves[n]) for n in (0, 1)]
    assert min(abs(hz - found.hz) for hz in moved) < 1e-6
    assert max(map(abs, found.moves)) <= MOST_MOVE
    for n in (0, 1):
        assert min(now.hz[n], there.hz[n]) - 1e-6 <= moved[n] <= max(now.hz[n], there.hz[n]) + 1e-6
    # The pitch would raise neither F1.
    assert f0 < min(now.hz[0], moved[0])
    # Their levels, each singer's whole power the same.
    levels = []
    for tone, partial in ((found.tone, found.partial), (found.other, found.other_partial)):
        amplitudes = spectrum(tones[tone].hz, formants(CHOIR[tone], vowel), 1.1)
        levels.append(10 * math.log10(amplitudes[partial - 1] ** 2 / sum(amplitudes**2)))
    assert levels[0] + LEAST_GAIN_DB <= levels[1] + 1e-6
    assert found.gain_db >= LEAST_GAIN_DB


@given(CHORDS, st.floats(70.0, 300.0), VOWEL)
def test_the_gain_is_that_of_the_five_resonances(
    rows: list[tuple[Fraction, float]], root: float, vowel: str
) -> None:
    _, found = advice(rows, root, vowel)
    if found is None:
        return
    voice = CHOIR[found.tone]
    now, there = formants(voice, vowel), formants(voice, found.toward)
    # How far along the way to the vowel, from what F2 does (from F1 where that stands still).
    n = 1 if abs(found.moves[1]) > 1e-3 else 0
    share = math.log1p(found.moves[n]) / math.log(there.hz[n] / now.hz[n])
    gain = 0.0
    for k in range(5):
        centre = now.hz[k] ** (1 - share) * there.hz[k] ** share
        width = now.bandwidths[k] ** (1 - share) * there.bandwidths[k] ** share
        before = gain_of(found.hz, now.hz[k], now.bandwidths[k])
        gain += 20 * math.log10(gain_of(found.hz, centre, width) / before)
    assert found.gain_db == pytest.approx(gain, abs=1e-6)


@given(CHORDS, st.floats(70.0, 300.0), VOWEL)
def test_bright_is_forward_and_the_words_are_cautious(
    rows: list[tuple[Fraction, float]], root: float, vowel: str
) -> None:
    _, found = advice(rows, root, vowel)
    if found is None:
        return
    # F2 tells front vowels from back ones: i, e, a, o, u go from the brightest to the darkest
    # (common practice, no source).
    if vowel in SUNG:
        assert found.brighter == (SUNG.index(found.toward) < SUNG.index(vowel))
    assert ("brighter" in found.words) == found.brighter
    assert ("darker" in found.words) != found.brighter
    assert ("slightly" in found.words) == (max(map(abs, found.moves)) <= 0.08)
    assert f"towards {found.toward}," in found.words
    assert f"{found.hz:.0f} Hz" in found.words
    assert found.words.endswith("easier to hear.")
    assert "tune" not in found.words.replace("mistuning", "")


def test_about_every_second_chord_has_a_hint() -> None:
    found = [
        advice(rows, C3 * 2 ** (key / 12), vowel)[1]
        for rows in (MAJOR_TENTH, OPEN_MAJOR, MINOR_TENTH)
        for key in range(-7, 9)
        for vowel in ("neutral", "a")
    ]
    share = sum(one is not None for one in found) / len(found)
    assert 0.25 < share < 0.9


def test_no_hint_for_what_nobody_sings_or_for_high_sopranos() -> None:
    tones = tones_of(MAJOR_TENTH, 110.0)
    fundamentals = [tone.hz for tone in tones]
    assert hint(fundamentals, CHOIR, pairs(tones)) is not None
    assert hint(fundamentals, [None] * 4, pairs(tones)) is None
    high = [SoundingTone(880.0, 880.0, F(1)), SoundingTone(1100.0, 1100.0, F(5, 4))]
    for vowel in ("neutral", *SUNG):
        assert hint([880.0, 1100.0], [SOPRANO, SOPRANO], pairs(high), vowel) is None


def test_a_singer_above_500_hz_is_left_alone() -> None:
    def alto_at(hz: float) -> Hint | None:
        tones = [SoundingTone(hz * 0.75, hz * 0.75, F(1)), SoundingTone(hz, hz, F(4, 3))]
        return hint([tone.hz for tone in tones], [ALTO, ALTO], pairs(tones), "ɛ")

    below, above = alto_at(499.0), alto_at(501.0)
    assert below is not None
    assert (below.tone, below.partial) == (1, 3)
    assert above is None


def test_no_hint_for_octaves() -> None:
    for root in (82.4, 98.0, 110.0, 123.5):
        tones = tones_of([(F(1), 1.0), (F(1), 2.0), (F(1), 4.0)], root)
        assert hint([tone.hz for tone in tones], CHOIR[:3], pairs(tones)) is None


def test_names_are_those_that_are_given_and_two_of_a_kind_are_told_apart() -> None:
    tones = tones_of([MAJOR_TENTH[0], MAJOR_TENTH[2]], 110.0)
    fundamentals = [tone.hz for tone in tones]
    named = hint(fundamentals, [BASS, ALTO], pairs(tones), "a", ["Bass 2", "Alto 1"])
    assert named is not None
    assert "in Bass 2, towards" in named.words
    assert "the 4th of Alto 1:" in named.words
    alike = hint(fundamentals, [BASS, BASS], pairs(tones), "a")
    assert alike is not None
    assert "in the lower bass" in alike.words
    assert "of the higher bass" in alike.words
