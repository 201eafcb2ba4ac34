"""Ratios and templates against published tables."""

from __future__ import annotations

from fractions import Fraction
from math import prod

import pytest

from retune.harmony.model import Quality
from retune.tuning.fixed import MEANTONE_FIFTH
from retune.tuning.intervals import consonances, steps
from retune.tuning.ratios import just_intervals, scale_cents, scale_ratio, templates
from retune.units import largest_prime, octave_reduced, ratio_to_cents

# Barlow 1987, Computer Music Journal 11(1) p. 45, Table 2: ratios and their cents.
BARLOW = {
    "16/15": 111.731,
    "10/9": 182.404,
    "9/8": 203.910,
    "8/7": 231.174,
    "7/6": 266.871,
    "32/27": 294.135,
    "6/5": 315.641,
    "5/4": 386.314,
    "81/64": 407.820,
    "9/7": 435.084,
    "4/3": 498.045,
    "27/20": 519.551,
    "3/2": 701.955,
    "14/9": 764.916,
    "8/5": 813.686,
    "5/3": 884.359,
    "27/16": 905.865,
    "12/7": 933.129,
    "7/4": 968.826,
    "16/9": 996.090,
    "9/5": 1017.596,
    "15/8": 1088.269,
}


@pytest.mark.parametrize(("ratio", "cents"), BARLOW.items())
def test_cents_of_ratios(ratio: str, cents: float) -> None:
    assert ratio_to_cents(Fraction(ratio)) == pytest.approx(cents, abs=5e-4)


# By interval: place on the line of fifths, the sizes a singer may choose from in the 5-limit.
# Zarlino 1558 for the consonances; the doublets differ by the syntonic comma 81/80.
SIZES = {
    0: {"1"},
    1: {"3/2", "40/27"},
    -1: {"4/3", "27/20"},
    2: {"9/8", "10/9"},
    -2: {"16/9", "9/5"},
    3: {"27/16", "5/3"},
    -3: {"32/27", "6/5"},
    4: {"5/4"},
    -4: {"8/5"},
    -5: {"16/15", "27/25"},
    7: {"135/128", "25/24"},
    6: {"45/32", "25/18"},
    -6: {"64/45", "36/25"},
}


@pytest.mark.parametrize(("fifths", "sizes"), SIZES.items())
def test_just_sizes_by_spelling(fifths: int, sizes: set[str]) -> None:
    assert set(just_intervals(fifths, 5)) == {Fraction(one) for one in sizes}


@pytest.mark.parametrize("fifths", range(-24, 25))
@pytest.mark.parametrize("limit", [3, 5, 7])
def test_sizes_keep_the_limit_and_the_spelling(fifths: int, limit: int) -> None:
    for ratio in just_intervals(fifths, limit):
        assert 1 <= ratio < 2
        assert largest_prime(ratio) <= limit
        # A just size lies within a third of a tone of its tempered one, for usual spellings.
        if abs(fifths) <= 10:
            away = (ratio_to_cents(ratio) - 700 * fifths + 600) % 1200 - 600
            assert abs(away) < 70


# The chords as whole-number proportions: 4:5:6 and 10:12:15 (Zarlino), 4:5:6:7 (the harmonic
# seventh), 10:12:15:18, 8:10:12:15, 25:30:36, 40:48:60:75 and their usual alternatives.
PROPORTIONS = [
    (Quality.MAJOR, 5, 0, "4:5:6"),
    (Quality.MINOR, 5, 0, "10:12:15"),
    (Quality.MAJOR, 7, 0, "4:5:6"),
    (Quality.MINOR, 7, 0, "10:12:15"),
    (Quality.MAJOR, 3, 0, "64:81:96"),
    (Quality.MINOR, 3, 0, "54:64:81"),
    (Quality.DIMINISHED, 5, 0, "25:30:36"),
    (Quality.DIMINISHED, 5, 1, "45:54:64"),
    (Quality.DIMINISHED, 7, 0, "5:6:7"),
    (Quality.AUGMENTED, 5, 1, "16:20:25"),
    (Quality.DOMINANT_SEVENTH, 5, 0, "20:25:30:36"),
    (Quality.DOMINANT_SEVENTH, 5, 1, "36:45:54:64"),
    (Quality.DOMINANT_SEVENTH, 7, 0, "4:5:6:7"),
    (Quality.DOMINANT_SEVENTH, 3, 0, "576:729:864:1024"),
    (Quality.MAJOR_SEVENTH, 5, 0, "8:10:12:15"),
    (Quality.MINOR_SEVENTH, 5, 0, "10:12:15:18"),
    (Quality.MINOR_SEVENTH, 5, 1, "90:108:135:160"),
    (Quality.HALF_DIMINISHED, 5, 0, "25:30:36:45"),
    (Quality.HALF_DIMINISHED, 5, 1, "45:54:64:81"),
    (Quality.HALF_DIMINISHED, 7, 0, "5:6:7:9"),
    (Quality.HALF_DIMINISHED, 7, 1, "60:70:84:105"),
    (Quality.DIMINISHED_SEVENTH, 5, 2, "225:270:320:384"),
    (Quality.MINOR_MAJOR_SEVENTH, 5, 0, "40:48:60:75"),
]


@pytest.mark.parametrize(("quality", "limit", "index", "proportion"), PROPORTIONS)
def test_templates(quality: Quality, limit: int, index: int, proportion: str) -> None:
    numbers = [int(one) for one in proportion.split(":")]
    wanted = tuple(octave_reduced(Fraction(one, numbers[0])) for one in numbers)
    assert templates(quality, limit)[index].ratios == wanted


def test_augmented_sixths_by_spelling() -> None:
    five, seven = (templates(Quality.DOMINANT_SEVENTH, limit, True)[0] for limit in (5, 7))
    # German sixth: 128:160:192:225 in the 5-limit, 4:5:6:7 in the 7-limit.
    assert five.ratios == tuple(Fraction(one, 128) for one in (128, 160, 192, 225))
    assert seven.ratios == tuple(Fraction(one, 4) for one in (4, 5, 6, 7))
    assert five.cents[3] - seven.cents[3] == pytest.approx(7.712, abs=5e-4)  # 225/224


@pytest.mark.parametrize("limit", [3, 5, 7])
@pytest.mark.parametrize("quality", list(Quality))
def test_no_template_leaves_its_limit(quality: Quality, limit: int) -> None:
    for template in templates(quality, limit):
        assert len(template.cents) == len(template.spelled) == len(template.semitones)
        assert all(largest_prime(one) <= limit for one in template.ratios or ())
        assert template.limit <= limit


def test_tempered_chords_divide_the_octave_evenly() -> None:
    # Equal weights on 5/4, 5/4, 8/5 give exactly 400 and 800 cents (Stange et al. 2018).
    augmented = templates(Quality.AUGMENTED, 5)[0]
    assert augmented.ratios is None
    assert augmented.semitones == (0, 4, 8)
    assert augmented.cents == (0.0, 0.0, 0.0)


def test_the_home_scale_is_the_ptolemaic_one() -> None:
    # Ptolemy's intense diatonic, as Zarlino gives it: 1 9/8 5/4 4/3 3/2 5/3 15/8.
    degrees = [scale_ratio(fifths, 5) for fifths in (0, 2, 4, -1, 1, 3, 5)]
    assert degrees == [Fraction(one) for one in ["1", "9/8", "5/4", "4/3", "3/2", "5/3", "15/8"]]
    # In minor the third, sixth and seventh degrees are 6/5, 8/5, 9/5.
    assert [scale_ratio(one, 5) for one in (-3, -4, -2)] == [
        Fraction(6, 5),
        Fraction(8, 5),
        Fraction(9, 5),
    ]


def test_remote_spellings_stay_near() -> None:
    assert all(abs(scale_cents(fifths, 5)) < 60 for fifths in range(-40, 41))


def test_consonances_and_steps_by_limit() -> None:
    assert 100 * 3 + consonances(7)[3] == pytest.approx([315.641, 266.871], abs=5e-4)
    # Limma 90.225 and apotome 113.685 are the only Pythagorean semitones.
    assert sorted(set((100 + steps(3)[1]).round(3))) == [90.225, 113.685]


# Comma sizes (standard; HEJI list of Sabat and von Schweinitz 2004 for the first three).
COMMAS = {
    "81/80": 21.506,
    "64/63": 27.264,
    "33/32": 53.273,
    "531441/524288": 23.460,
    "128/125": 41.059,
    "648/625": 62.565,
    "32805/32768": 1.954,
    "225/224": 7.712,
    "36/35": 48.770,
}


@pytest.mark.parametrize(("ratio", "cents"), COMMAS.items())
def test_commas(ratio: str, cents: float) -> None:
    assert ratio_to_cents(Fraction(ratio)) == pytest.approx(cents, abs=5e-4)


# Root paths of well-known progressions, linked by common tones, and their net in cents.
PUMPS = [
    ("5/6 4/3 4/3 2/3", -21.506),  # I vi ii V I: down a minor third, then fourths up
    ("4/3 5/6 4/3 2/3", -21.506),  # I IV ii V I
    ("3/2 3/4 3/2 3/5", 21.506),  # C G D a C, Benedetti
    ("5/4 5/4 5/4 1/2", -41.059),  # three major thirds up
    ("6/5 6/5 6/5 6/5 1/2", 62.565),  # four minor thirds up
]


@pytest.mark.parametrize(("path", "net"), PUMPS)
def test_published_pumps(path: str, net: float) -> None:
    total = prod((Fraction(one) for one in path.split()), start=Fraction(1))
    cents = ratio_to_cents(total)
    assert (cents + 600) % 1200 - 600 == pytest.approx(net, abs=5e-4)


def test_quarter_comma_meantone() -> None:
    # Fifth of 696.578 cents; twelve of them fall 41.059 short of seven octaves.
    assert pytest.approx(696.578, abs=5e-4) == 700 + MEANTONE_FIFTH
    assert pytest.approx(-41.059, abs=5e-4) == 12 * MEANTONE_FIFTH
