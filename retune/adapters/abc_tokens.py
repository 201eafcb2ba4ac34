"""The signs of ABC music (standard 2.1), one at a time."""

from __future__ import annotations

import re
from collections.abc import Iterator
from fractions import Fraction

from retune.pitch import PitchClass
from retune.written import MarkKind, WrittenChordSymbol

# Decorations that say something about singing, by their names in ABC 2.1 section 4.14.
NOTE_SIGNS = {
    "fermata": "fermata",
    "invertedfermata": "fermata",
    "accent": "accent",
    ">": "accent",
    "emphasis": "accent",
    "tenuto": "tenuto",
    "breath": "breath",
    "staccato": "staccato",
    "wedge": "staccatissimo",
    "marcato": "marcato",
    "^": "marcato",
}
# Decorations that say something about the order of the bars, and how a jump ends.
ORDER_SIGNS: dict[str, tuple[MarkKind, str | None]] = {
    "segno": (MarkKind.SEGNO, None),
    "coda": (MarkKind.CODA, None),
    "fine": (MarkKind.FINE, None),
    "D.C.": (MarkKind.DA_CAPO, ""),
    "dacapo": (MarkKind.DA_CAPO, ""),
    "D.C.alfine": (MarkKind.DA_CAPO, "fine"),
    "D.C.alcoda": (MarkKind.DA_CAPO, "coda"),
    "D.S.": (MarkKind.DAL_SEGNO, ""),
    "dalsegno": (MarkKind.DAL_SEGNO, ""),
    "D.S.alfine": (MarkKind.DAL_SEGNO, "fine"),
    "D.S.alcoda": (MarkKind.DAL_SEGNO, "coda"),
    "dacoda": (MarkKind.TO_CODA, None),
}
DYNAMICS = frozenset(("pppp", "ppp", "pp", "p", "mp", "mf", "f", "ff", "fff", "ffff", "sfz"))
HAIRPINS = {
    "crescendo(": "crescendo",
    "<(": "crescendo",
    "diminuendo(": "diminuendo",
    ">(": "diminuendo",
    "crescendo)": "stop",
    "<)": "stop",
    "diminuendo)": "stop",
    ">)": "stop",
}
# One-letter decorations of section 4.16; U: fields change them.
SHORTHAND = {"H": "fermata", "L": "accent", ".": "staccato", "S": "segno", "O": "coda"}

_NOTE = r"(?P<{0}sign>\^{{1,2}}|_{{1,2}}|=)?(?P<{0}letter>[A-Ga-g])(?P<{0}octave>[,']*)"
_LENGTH = r"(?P<{0}times>\d{{0,5}})(?P<{0}slashes>/{{0,6}})(?P<{0}over>\d{{0,5}})"
TOKEN = re.compile(
    rf"""
    "(?P<quoted>[^"]*)"
  | !(?P<decoration>[^!\s|]*)!
  | \+(?P<old_decoration>[a-zA-Z.()<>]+)\+
  | \{{/?(?P<grace>[^}}]*)\}}
  | (?P<inline>\[(?P<field>[A-Za-z]):(?P<value>[^\]]*)\])
  | (?P<bar>:*\[?\|+[\]:|]*\s*(?:\[?[1-9][\d,-]*)?|:{{2,}}|\[[1-9][\d,-]*)
  | (?P<chord>\[(?P<stack>(?:"[^"]*"|![^!]*!|[^\]"!])*)\]{_LENGTH.format("chord_")})
  | \((?P<tuplet>[2-9](?::\d*){{0,2}})
  | (?P<note>{_NOTE.format("")}{_LENGTH.format("")})
  | (?P<rest>(?P<silence>[zxZX]){_LENGTH.format("rest_")})
  | (?P<broken>>{{1,3}}|<{{1,3}})
  | (?P<tie>-)
  | (?P<overlay>&)
  | (?P<shorthand>[H-Wh-w.~])
  | (?P<other>.)
    """,
    re.VERBOSE | re.DOTALL,
)
CHORD_NOTE = re.compile(rf"{_NOTE.format('')}{_LENGTH.format('')}(?P<tie>-?)|\"[^\"]*\"|![^!]*!|.")


def length_of(match: re.Match[str], prefix: str = "") -> Fraction:
    """A written length, in unit lengths: 3/2, /, //, 2."""
    times = int(match[f"{prefix}times"] or 1)
    slashes, over = match[f"{prefix}slashes"], match[f"{prefix}over"]
    if not slashes:
        return Fraction(times)
    divisor = int(over) if over and len(slashes) == 1 else 2 ** len(slashes)
    return Fraction(times, divisor or 1)


def tuplet_of(text: str, compound: bool) -> tuple[Fraction, int]:
    """What a tuplet multiplies lengths by, and how many notes it holds (section 4.13)."""
    numbers = [int(number) if number else 0 for number in text.split(":")]
    notes = numbers[0]
    usual = {2: 3, 3: 2, 4: 3, 6: 2, 8: 3}.get(notes, 3 if compound else 2)
    time = numbers[1] if len(numbers) > 1 and numbers[1] else usual
    count = numbers[2] if len(numbers) > 2 and numbers[2] else notes
    return Fraction(time, notes), count


def passes_of(text: str) -> tuple[int, ...]:
    """The passes of an ending such as 1, 1,3 or 1-3; none for anything else."""
    passes: list[int] = []
    for piece in filter(None, text.split(",")):
        first, _, last = piece.partition("-")
        if not first.isdecimal() or len(first) > 2 or len(last) > 2:
            return ()
        passes.extend(range(int(first), int(last or first) + 1))
    return tuple(passes)


# Chord kinds by their usual suffixes -> MusicXML kind values.
_KINDS = {
    "": "major",
    "m": "minor",
    "min": "minor",
    "7": "dominant",
    "maj7": "major-seventh",
    "M7": "major-seventh",
    "m7": "minor-seventh",
    "min7": "minor-seventh",
    "dim": "diminished",
    "o": "diminished",
    "dim7": "diminished-seventh",
    "o7": "diminished-seventh",
    "m7b5": "half-diminished",
    "aug": "augmented",
    "+": "augmented",
    "6": "major-sixth",
    "m6": "minor-sixth",
    "9": "dominant-ninth",
    "sus": "suspended-fourth",
    "sus4": "suspended-fourth",
    "sus2": "suspended-second",
}
_CHORD = re.compile(r"([A-G])([#b]?)([^/]*)(?:/([A-G])([#b]?))?")


def chord_symbol(text: str) -> WrittenChordSymbol | None:
    """A chord symbol such as Am7 or G/B; None where the text is none that is known."""
    match = _CHORD.fullmatch(text.strip())
    if match is None or match[3] not in _KINDS:
        return None
    alter = {"": 0, "#": 1, "b": -1}
    bass = PitchClass(match[4], alter[match[5]]) if match[4] else None
    return WrittenChordSymbol(PitchClass(match[1], alter[match[2]]), _KINDS[match[3]], bass)


def syllables_of(line: str) -> Iterator[str]:
    """The signs of a w: line: syllables (with their hyphen), and - _ * | for what follows none.

    >>> list(syllables_of("A- ve, Ma-ri - a_ ~ | so~on"))
    ['A-', 've,', 'Ma-', 'ri', '-', 'a', '_', ' ', '|', 'so on']
    """
    for match in re.finditer(r"(?:\\-|[^\s\-_*|])+-?|[-_*|]", line):
        yield match[0].replace("\\-", "\u2011").replace("~", " ")
