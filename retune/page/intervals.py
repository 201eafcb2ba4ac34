"""Intervals in words."""

from __future__ import annotations

_INTERVALS = (
    "octave",
    "minor second",
    "major second",
    "minor third",
    "major third",
    "fourth",
    "tritone",
    "fifth",
    "minor sixth",
    "major sixth",
    "minor seventh",
    "major seventh",
)
_WIDE = {
    13: "minor ninth",
    14: "major ninth",
    15: "minor tenth",
    16: "major tenth",
    19: "twelfth",
}


def interval_name(semitones: int) -> str:
    """An interval in words, by its size in semitones from 1 up.

    >>> [interval_name(size) for size in (4, 12, 16, 24, 28)]
    ['major third', 'octave', 'major tenth', 'two octaves', 'major third and two octaves']
    """
    if semitones in _WIDE:
        return _WIDE[semitones]
    octaves, rest = divmod(semitones, 12)
    count = {1: "an octave", 2: "two octaves", 3: "three octaves"}.get(
        octaves, f"{octaves} octaves"
    )
    if rest == 0:
        return "octave" if octaves == 1 else count
    return f"{_INTERVALS[rest]} and {count}" if octaves else _INTERVALS[rest]
