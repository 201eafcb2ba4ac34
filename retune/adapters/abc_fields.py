"""Information fields of ABC (standard 2.1): keys, metres, lengths, tempi, clefs.

Conventions
-----------
* Lengths are `Fraction` quarter notes; ABC writes them in whole notes.
* Transpositions are semitones from the written to the sounding pitch.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from fractions import Fraction

from retune.pitch import PitchClass

# Mode, by its first three letters -> fifths from the major key of its tonic, and its name.
_MODES = {
    "": (0, "major"),
    "maj": (0, "major"),
    "ion": (0, "ionian"),
    "m": (-3, "minor"),
    "min": (-3, "minor"),
    "aeo": (-3, "aeolian"),
    "mix": (-1, "mixolydian"),
    "dor": (-2, "dorian"),
    "phr": (-4, "phrygian"),
    "lyd": (1, "lydian"),
    "loc": (-5, "locrian"),
}
_SHARPS = "FCGDAEB"
ALTERS = {"": 0, "^": 1, "^^": 2, "_": -1, "__": -2, "=": 0}
_TONIC = re.compile(r"\s*([A-G])([#b]?)\s*([A-Za-z]*)")
_SIGN = re.compile(r"(\^{1,2}|_{1,2}|=)([A-Ga-g])")
_FRACTION = re.compile(r"(\d{1,4})/(\d{1,4})")
_TEMPO = re.compile(r"((?:\d{1,4}/\d{1,4}\s*)+)=\s*(\d{1,4}(?:\.\d{1,4})?)")
_NAMED_CLEFS = {"treble": "G", "bass": "F", "tenor": "C", "alto": "C"}
_CLEF = re.compile(
    r"(?P<modern>clef\s*=\s*)?\b(?P<name>treble|bass|tenor|alto)[1-5]?(?P<octave>[+-]?8)?(?![A-Za-z])"
)
_CLEF_LETTER = re.compile(r"(?P<modern>clef\s*=\s*)(?P<name>[GFC])[1-5]?(?P<octave>[+-]?8)?\b")
_QUOTED = re.compile(r'"[^"]*"')
_OCTAVES = {"8": -12, "-8": -12, "+8": 12}


@dataclass(frozen=True, slots=True)
class AbcKey:
    """A key: its signature, and the alteration of each letter that has one."""

    fifths: int = 0
    mode: str | None = None
    alters: dict[str, int] = field(default_factory=dict)


def parse_key(text: str) -> AbcKey:
    """A K: field; C major's signature where it names none."""
    tonic = _TONIC.match(text)
    if text.strip()[:2].upper() == "HP":
        fifths, mode = 2, "mixolydian"
    elif tonic is None:
        fifths, mode = 0, ""
    else:
        away, mode = _MODES.get(_mode_word(tonic[3]), _MODES[""])
        fifths = PitchClass(tonic[1], {"#": 1, "b": -1}.get(tonic[2], 0)).fifths + away
    fifths = max(-7, min(7, fifths))
    signed = _SHARPS[:fifths] if fifths > 0 else _SHARPS[fifths:] if fifths < 0 else ""
    alters = dict.fromkeys(signed, 1 if fifths > 0 else -1)
    if " exp" in text.lower():
        alters = {}
    alters |= {letter.upper(): ALTERS[sign] for sign, letter in _SIGN.findall(text)}
    return AbcKey(fifths, mode or None, alters)


def _mode_word(word: str) -> str:
    known = word.lower()[:3]
    return known if known in _MODES else ""


def parse_metre(text: str) -> tuple[int, int] | None:
    """An M: field as beats and beat unit; None for free metre."""
    plain = text.strip()
    if plain in ("C", "c"):
        return 4, 4
    if plain in ("C|", "c|"):
        return 2, 2
    match = re.fullmatch(r"\(?([\d+ ]{1,20})\)?\s*/\s*(\d{1,3})", plain)
    if match is None:
        return None
    beats = sum(int(number) for number in re.findall(r"\d{1,3}", match[1]))
    unit = int(match[2])
    return (beats, unit) if beats and unit in (1, 2, 4, 8, 16, 32, 64, 128) else None


def parse_length(text: str) -> Fraction | None:
    """An L: field in quarter notes."""
    match = _FRACTION.match(text.strip())
    if match is None:
        return Fraction(4) if text.strip() == "1" else None
    return Fraction(4 * int(match[1]), int(match[2])) if int(match[2]) and int(match[1]) else None


def default_length(metre: tuple[int, int] | None) -> Fraction:
    """The unit length of a tune without L: (a sixteenth below 3/4, else an eighth)."""
    return Fraction(1, 4) if metre and Fraction(*metre) < Fraction(3, 4) else Fraction(1, 2)


def parse_tempo(text: str, unit: Fraction) -> tuple[Fraction | None, str]:
    """A Q: field as quarter notes a minute, and its words."""
    words = " ".join(re.findall(r'"([^"]*)"', text)).strip()
    bare = re.sub(r'"[^"]*"', "", text).strip()
    match = _TEMPO.search(bare)
    if match:
        beat = sum(
            (Fraction(int(a), int(b)) for a, b in _FRACTION.findall(match[1]) if int(b)),
            Fraction(0),
        )
        qpm = 4 * beat * Fraction(match[2])
    elif re.fullmatch(r"\d{1,4}", bare):
        qpm = unit * int(bare)
    else:
        qpm = Fraction(0)
    return (qpm or None), words


@dataclass(frozen=True, slots=True)
class Staff:
    """What K: and V: say of a voice's staff.

    `shift` is the transposition; `old_bass` tells a bass clef named without "clef=", which old
    programs read two octaves down.
    """

    clef: str = ""
    shift: int = 0
    old_bass: bool = False


def parse_staff(text: str) -> Staff:
    """Clef and transposition from the text of a K: or V: field, without its name."""
    shift = sum(int(n) for n in re.findall(r"\btranspose\s*=\s*(-?\d{1,2})\b", text))
    shift += sum(12 * int(n) for n in re.findall(r"\boctave\s*=\s*(-?\d)\b", text))
    if "-8va" in text:
        return Staff("G8", shift - 12)
    bare = _QUOTED.sub("", text)
    match = _CLEF_LETTER.search(bare) or _CLEF.search(bare)
    if match is None:
        return Staff("", shift)
    sign = _NAMED_CLEFS.get(match["name"], match["name"])
    octave = _OCTAVES.get(match["octave"] or "", 0)
    clef = "G8" if sign == "G" and octave == -12 else sign
    return Staff(clef, shift + octave, match["name"] == "bass" and not match["modern"])
