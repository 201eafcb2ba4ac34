"""A strict parser of .scl and .kbm for the tests alone, written from the published formats
(huygens-fokker.org, scl_format.html and the keyboard mappings of help.htm)."""

from __future__ import annotations

import re
from dataclasses import dataclass
from fractions import Fraction
from math import log2


@dataclass
class Scl:
    description: str
    pitches: list[Fraction | float]
    """Ratios as fractions, cents as floats."""

    @property
    def cents(self) -> list[float]:
        return [p if isinstance(p, float) else 1200 * log2(p) for p in self.pitches]


@dataclass
class Kbm:
    size: int
    first: int
    last: int
    middle: int
    reference: int
    hz: float
    octave: int
    degrees: list[int]


def _lines(data: bytes) -> list[str]:
    text = data.decode("latin-1")
    assert "\r" not in text
    assert text.endswith("\n")
    return [line for line in text.split("\n")[:-1] if not line.startswith("!")]


def parse_scl(data: bytes) -> Scl:
    description, count, *rest = _lines(data)
    assert re.fullmatch(r" *\d+ *", count)
    assert len(rest) == int(count), "lines after the last pitch, or too few"
    pitches: list[Fraction | float] = []
    for line in rest:
        value = line.strip(" \t")
        # Nothing may follow the value: some readers take it for a part of it.
        if "." in value:
            assert re.fullmatch(r"-?\d+\.\d+", value), value
            pitches.append(float(value))
        else:
            assert re.fullmatch(r"\d+(/\d+)?", value), value
            pitches.append(Fraction(value))
            assert pitches[-1] > 0
    return Scl(description, pitches)


def parse_kbm(data: bytes) -> Kbm:
    lines = _lines(data)
    numbers = [int(line) for line in lines[:5]]
    assert re.fullmatch(r"\d+\.\d+", lines[5])
    degrees = [int(line) for line in lines[7:]]
    assert len(degrees) == numbers[0]
    return Kbm(*numbers, float(lines[5]), int(lines[6]), degrees)


def hz(scl: Scl, kbm: Kbm, key: int) -> float:
    """Frequency of a key, by the rules of the mapping's help text."""

    def cents(number: int) -> float:
        octaves, place = divmod(number - kbm.middle, kbm.size)
        degree = kbm.degrees[place] + octaves * kbm.octave
        periods, step = divmod(degree, len(scl.pitches))
        return periods * scl.cents[-1] + ([0.0, *scl.cents])[step]

    return kbm.hz * 2 ** ((cents(key) - cents(kbm.reference)) / 1200)
