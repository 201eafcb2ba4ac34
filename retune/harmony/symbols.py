"""Chord symbols and chord names in words."""

from __future__ import annotations

from retune.harmony.model import Chord, Quality
from retune.pitch import PitchClass

_SUFFIXES = {
    Quality.MAJOR: "",
    Quality.MINOR: "m",
    Quality.DIMINISHED: "dim",
    Quality.AUGMENTED: "aug",
    Quality.DOMINANT_SEVENTH: "7",
    Quality.MAJOR_SEVENTH: "maj7",
    Quality.MINOR_SEVENTH: "m7",
    Quality.HALF_DIMINISHED: "m7b5",
    Quality.DIMINISHED_SEVENTH: "dim7",
    Quality.MINOR_MAJOR_SEVENTH: "m(maj7)",
}


def symbol_of(root: PitchClass, quality: Quality) -> str:
    """The symbol of a root and a quality.

    >>> symbol_of(PitchClass("F", 1), Quality.HALF_DIMINISHED)
    'F#m7b5'
    """
    return root.name + _SUFFIXES[quality]


def chord_symbol(chord: Chord) -> str:
    """A chord's symbol, such as D, Dm or D7; empty where nothing sounds."""
    if chord.root is None or chord.quality is None:
        return ""
    return symbol_of(chord.root, chord.quality)


def chord_words(root: PitchClass, quality: Quality) -> str:
    """A chord in words.

    >>> chord_words(PitchClass("B"), Quality.MINOR)
    'B minor'
    """
    return f"{root.name} {quality}"
