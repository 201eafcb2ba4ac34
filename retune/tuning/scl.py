"""Reading a .scl scale as the tuning of an accompaniment.

Format: the published description of the Scala scale file (huygens-fokker.org, scl_format.html).
"""

from __future__ import annotations

import re
from fractions import Fraction

from retune.errors import UnreadableError
from retune.tuning.policy import FixedTuning
from retune.units import ratio_to_cents

_CENTS = re.compile(r"[ \t]*(-?\d*\.\d*)(?=\D|$)")
_RATIO = re.compile(r"[ \t]*(\d{1,4000})(?:/(\d{1,4000}))?(?![\d/])")
_A_ABOVE_C = 9


def _pitch_cents(line: str) -> float:
    """Cents of one pitch line; text after the value is ignored, as the format asks."""
    if (cents := _CENTS.match(line)) and any(char.isdigit() for char in cents[1]):
        return float(cents[1])
    if (ratio := _RATIO.match(line)) and int(ratio[1]) and int(ratio[2] or 1):
        return ratio_to_cents(Fraction(int(ratio[1]), int(ratio[2] or 1)))
    raise UnreadableError(f"'{line.strip()}' is neither cents (with a period) nor a ratio")


def parse_scl(text: str) -> tuple[str, tuple[float, ...]]:
    """Description and pitches of a .scl file, in cents above the unison; the last is the period.

    Raises `UnreadableError` where the text breaks the format.

    >>> parse_scl("! two.scl\\nTwo notes\\n 2\\n 3/2\\n 2/1\\n")[1][1]
    1200.0
    """
    lines = [line for line in text.removeprefix("\ufeff").splitlines() if line[:1] != "!"]
    count = lines[1].split() if len(lines) > 1 else []
    if not count or not re.fullmatch(r"\d{1,5}", count[0]):
        raise UnreadableError("not a .scl file: its second line should count the notes")
    pitches = lines[2 : 2 + int(count[0])]
    if len(pitches) < int(count[0]):
        raise UnreadableError(f"the .scl file says {count[0]} notes and has {len(pitches)}")
    return lines[0].strip(), tuple(_pitch_cents(line) for line in pitches)


def fixed_tuning(text: str, name: str) -> FixedTuning:
    """A .scl scale of twelve notes and an octave laid on the keys from C, with A at the reference.

    Raises `UnreadableError` for a scale of another shape: an accompaniment has twelve keys.
    """
    _, pitches = parse_scl(text)
    if len(pitches) != 12 or abs(pitches[-1] - 1200.0) > 1e-6:
        raise UnreadableError(
            f"the scale has {len(pitches)} notes and a period of {pitches[-1] if pitches else 0:g}"
            " cents; an accompaniment needs twelve notes and an octave"
        )
    degrees = (0.0, *pitches[:-1])
    shift = degrees[_A_ABOVE_C] - 100.0 * _A_ABOVE_C
    return FixedTuning(name, tuple(c - 100.0 * key - shift for key, c in enumerate(degrees)))
