"""Chord symbols and chord names in words."""

from __future__ import annotations

from retune.harmony.model import Chord, Degree, Quality
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

_NINTHS = {
    Quality.DOMINANT_SEVENTH: "9",
    Quality.MAJOR_SEVENTH: "maj9",
    Quality.MINOR_SEVENTH: "m9",
}


def symbol_of(root: PitchClass, quality: Quality) -> str:
    """The symbol of a root and a quality.

    >>> symbol_of(PitchClass("F", 1), Quality.HALF_DIMINISHED)
    'F#m7b5'
    """
    return root.name + _SUFFIXES[quality]


def chord_symbol(chord: Chord) -> str:
    """A chord's symbol, such as D, Dm7, D9 or Dsus4; empty where nothing sounds."""
    if chord.root is None or chord.quality is None:
        return ""
    return chord.root.name + _with_added(chord.quality, chord.added)


def printed(name: str) -> str:
    """A symbol or the name of a pitch with the signs that musicians print.

    >>> printed("F#m7b5"), printed("Bb")
    ('F♯m7♭5', 'B♭')
    """
    return name.replace("#", "♯").replace("b", "♭")


def doubtable_symbol(chord: Chord) -> str:
    """The chord's symbol, with a question mark where its root is in doubt."""
    return f"{chord_symbol(chord)}?" if chord.doubtful else chord_symbol(chord)


def _with_added(quality: Quality, added: tuple[Degree, ...]) -> str:
    """A suffix that tells the added tones, as they are usually written.

    >>> [_with_added(Quality.DOMINANT_SEVENTH, (one,)) for one in (Degree.NINTH, Degree.FOURTH)]
    ['9', '7sus4']
    >>> _with_added(Quality.MINOR, (Degree.SIXTH, Degree.NINTH))
    'm6/9'
    """
    suffix = _SUFFIXES[quality]
    if Degree.FOURTH in added or Degree.SECOND in added:
        seventh = "maj7" if "maj7" in suffix else "7" if "7" in suffix else ""
        return seventh + "sus" + ("4" if Degree.FOURTH in added else "2")
    if Degree.NINTH not in added:
        return suffix + ("6" if Degree.SIXTH in added else "")
    if Degree.SIXTH in added:
        return f"{suffix}6/9"
    if quality in _NINTHS:
        return _NINTHS[quality]
    return f"{suffix}add9"


def chord_words(root: PitchClass, quality: Quality) -> str:
    """A chord in words.

    >>> chord_words(PitchClass("B"), Quality.MINOR)
    'B minor'
    """
    return f"{root.name} {quality}"
