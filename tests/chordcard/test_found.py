"""A chord from pitches: ratios, beats, what is shared, what else it could be."""

from __future__ import annotations

from fractions import Fraction

import pytest

from retune.chordcard.found import FoundChord, chord_of
from retune.chordcard.model import proportion
from retune.chordcard.naming import parse_pitches
from retune.chordcard.others import alternatives, inversions, sound_equal, sound_here
from retune.chordcard.vowels import minor_third_rub, shared_by_voice
from retune.pitch import PitchClass
from retune.score.model import VoiceType

# Semitones above C3, name, p:q and beats a second in equal temperament: handbook, voice.md 3.1.
TABLE = [
    ("G3", 3, 2, 0.443),
    ("G4", 3, 1, 0.443),
    ("F3", 4, 3, 0.591),
    ("E3", 5, 4, 5.191),
    ("E4", 5, 2, 5.191),
    ("E5", 5, 1, 5.191),
    ("Eb3", 6, 5, 7.059),
    ("Eb4", 12, 5, 14.118),
    ("A3", 5, 3, 5.936),
    ("Ab3", 8, 5, 8.241),
    ("Bb3", 9, 5, 11.906),
    ("D3", 9, 8, 2.656),
    ("D4", 9, 4, 2.656),
]


def chord(text: str, limit: int = 5, **wishes: object) -> FoundChord:
    return chord_of(parse_pitches([text]), limit, **wishes)  # type: ignore[arg-type]


def numbers(found: FoundChord) -> tuple[int, ...] | None:
    return proportion([tone.sounding for tone in found.tones])


@pytest.mark.parametrize(("upper", "p", "q", "beats"), TABLE)
def test_beats_of_the_textbook_table(upper: str, p: int, q: int, beats: float) -> None:
    (pair,) = chord(f"C3 {upper}").card.pairs
    assert pair.ratio == Fraction(p, q)
    assert pair.equal_hz == pytest.approx(beats, abs=6e-4)
    assert pair.beat_hz == pytest.approx(0.0, abs=1e-9)


def test_natural_seventh_beats_as_in_the_table() -> None:
    pairs = chord("C3 E3 G3 Bb3", 7).card.pairs
    seventh = next(pair for pair in pairs if pair.ratio == Fraction(7, 4))
    assert seventh.equal_hz == pytest.approx(16.638, abs=6e-4)


# Whole numbers by quality: handbook, methods.md B5.
@pytest.mark.parametrize(
    ("text", "limit", "expected"),
    [
        ("C4 E4 G4", 5, (4, 5, 6)),
        ("C4 Eb4 G4", 5, (10, 12, 15)),
        ("C4 E4 G4 Bb4", 7, (4, 5, 6, 7)),
        ("C4 E4 G4 B4", 5, (8, 10, 12, 15)),
        ("D4 F4 A4 C5", 5, (10, 12, 15, 18)),
        ("B3 D4 F4", 7, (5, 6, 7)),
        ("C4 F4 G4", 5, (6, 8, 9)),
        ("C4 D4 G4", 5, (8, 9, 12)),
        ("C4 E4 G4 A4", 5, (12, 15, 18, 20)),
        ("C4 E4 G4 Bb4 D5", 7, (4, 5, 6, 7, 9)),
        ("C4 E4 G4", 3, (64, 81, 96)),
        ("C4 E4 G#4", 5, None),
    ],
)
def test_whole_numbers(text: str, limit: int, expected: tuple[int, ...] | None) -> None:
    assert numbers(chord(text, limit)) == expected


def test_cents_and_frequencies() -> None:
    """D3 as a piano has it; 386.314 and 701.955 cents above it (voice.md 3.1)."""
    found = chord("D3 F#4 A4 D5")
    assert [tone.cents for tone in found.tones] == pytest.approx(
        [0.0, -13.686, 1.955, 0.0], abs=1e-3
    )
    assert found.tones[1].hz == pytest.approx(146.8324 * 5 / 2, abs=1e-3)
    assert chord("A4", reference_hz=442.0).tones[0].hz == 442.0


def test_tonic_places_the_root_in_its_scale() -> None:
    """ii of C: D at 9/8, 3.910 cents above a piano's (methods.md B10)."""
    found = chord("D3 F3 A3", tonic=PitchClass("C"))
    assert found.root_cents == pytest.approx(3.910, abs=1e-3)
    assert found.tones[0].cents == pytest.approx(3.910, abs=1e-3)
    assert found.tones[1].cents == pytest.approx(3.910 + 15.641, abs=1e-3)


def test_bass_tenth_partial_meets_the_fourth_of_a_major_tenth() -> None:
    # Common practice, no source; it follows from 5:2 (voice.md 4.1), and beats at 10.382 Hz in
    # equal temperament on C3 (voice.md 3.1).
    found = chord("C3 E4")
    (pair,) = found.card.pairs
    assert (10, 4) in [(s.low_partial, s.high_partial) for s in pair.shared]
    assert 2 * pair.equal_hz == pytest.approx(10.382, abs=1e-3)


def test_minor_triad_shares_the_roots_sixth_partial() -> None:
    """10:12:15 meets at 60: partials 6, 5 and 4, at 785 Hz on C3 (voice.md 4.1)."""
    whole = chord("C3 Eb3 G3").card.whole
    assert whole is not None
    assert whole.numbers == (6, 5, 4)
    assert whole.hz == pytest.approx(784.88, abs=0.01)
    major = chord("C3 E3 G3").card.whole
    assert major is not None
    assert major.numbers == (15, 12, 10)


def test_bright_bass_on_a_minor_chord_sounds_the_major_third() -> None:
    # Common practice, no source. 5/4 is 70.672 cents above 6/5 (25/24).
    found = chord("C3 G3 Eb4 C5")
    rub = minor_third_rub(found)
    assert rub is not None
    assert rub.cents == pytest.approx(70.672, abs=1e-3)
    assert rub.hz == pytest.approx(10 * 130.8128, abs=1e-2)
    assert found.tones[rub.third].pitch.name == "Eb4"
    assert minor_third_rub(chord("C3 G3 E4 C5")) is None
    assert minor_third_rub(chord("Eb3 G3 C4")) is None
    assert minor_third_rub(chord("B2 D3 F3 Ab3")) is None


def test_voices_are_told_by_height() -> None:
    names = [tone.name for tone in chord("D3 A3 F#4 D5").tones]
    assert names == ["Bass", "Tenor", "Alto", "Soprano"]
    given = chord("D4 F#4 A4", voices=(VoiceType.ALTO, VoiceType.ALTO, VoiceType.SOPRANO))
    assert [tone.name for tone in given.tones] == ["Alto 2", "Alto 1", "Soprano"]


def test_shared_partials_by_voice_are_shared() -> None:
    found = chord("C3 G3 E4 C5")
    for one in shared_by_voice(found):
        own, other = found.tones[one.tone], found.tones[one.other]
        assert one.partial > 1
        assert one.partial * own.hz == pytest.approx(one.other_partial * other.hz)
        assert one.vowels[0].level_db >= one.vowels[-1].level_db
    assert {one.tone for one in shared_by_voice(found)} == {0, 1, 2, 3}


def test_sevenths_that_a_dominant_may_have() -> None:
    """7/4, 16/9 and 9/5: 968.826, 996.090 and 1017.596 cents (methods.md B5, B6)."""
    found = alternatives(chord("C4 E4 G4 Bb4"))
    assert [one.numbers for one in found] == [(20, 25, 30, 36), (36, 45, 54, 64), (4, 5, 6, 7)]
    assert [one.chosen for one in found] == [True, False, False]
    ((_, ratio, cents),) = found[2].differs
    assert ratio == Fraction(7, 4)
    assert cents == pytest.approx(-31.174, abs=1e-3)
    # methods.md 1c gives their roughness on this very chord.
    by_numbers = {one.numbers: one.sound.roughness for one in found}
    assert by_numbers[4, 5, 6, 7] == pytest.approx(8.3822, abs=1e-4)
    assert by_numbers[36, 45, 54, 64] == pytest.approx(8.3154, abs=1e-4)
    assert by_numbers[20, 25, 30, 36] == pytest.approx(8.0107, abs=1e-4)
    assert sound_equal(chord("C4 E4 G4 Bb4")).roughness == pytest.approx(8.8910, abs=1e-4)
    assert found[2].sound.beating == ()
    assert found[0].sound.beating != ()


def test_alternatives_are_named_in_close_position_whatever_is_doubled() -> None:
    found = alternatives(chord("C2 C3 G3 E4 Bb4 C5 G5"))
    assert [one.numbers for one in found] == [(20, 25, 30, 36), (36, 45, 54, 64), (4, 5, 6, 7)]


def test_septimal_minor_is_an_alternative() -> None:
    """6:7:9 (methods.md B5) and its roughness on C4 (1c)."""
    here, other = alternatives(chord("C4 Eb4 G4"))
    assert here.chosen
    assert other.numbers == (6, 7, 9)
    assert other.sound.roughness == pytest.approx(4.8602, abs=1e-4)
    assert here.sound.roughness == pytest.approx(3.8013, abs=1e-4)


def test_major_triad_and_clusters_have_no_alternatives() -> None:
    assert alternatives(chord("C4 E4 G4")) == ()
    assert alternatives(chord("C4 Db4 D4")) == ()


def test_inversions_keep_the_tones_and_the_register() -> None:
    start = chord("D3 F#4 A4 D5")
    found = inversions(start)
    assert [one.bass.name for one in found] == ["D3", "F#3", "A2"]
    for one in found:
        assert {pitch.pitch_class for pitch in one.pitches} == {
            pitch.pitch_class for pitch in start.pitches
        }
        keys = [pitch.key for pitch in one.pitches]
        assert keys == sorted(set(keys))
        assert max(abs(key - old.key) for key, old in zip(keys, start.pitches, strict=True)) <= 12
        assert one.just.roughness < one.equal.roughness
    # A sixth chord in whole numbers is 5:6:8 (common practice: 6 and 6-4 chords of 4:5:6).
    assert [one.numbers for one in inversions(chord("C4 E4 G4"))][1:] == [(5, 6, 8), (3, 5, 8)]


def test_tempered_chord_sounds_as_on_a_piano_and_tells_what_it_could_be() -> None:
    found = chord("C3 E3 G#3")
    assert sound_here(found) == sound_equal(found)
    assert found.card.whole is None
    assert [one.numbers for one in alternatives(found)] == [(), (16, 20, 25)]


def test_single_tones_and_unisons() -> None:
    assert chord("C4").card.pairs == ()
    unison = chord("A4 A4")
    assert unison.card.pairs == ()
    assert inversions(unison) == ()
