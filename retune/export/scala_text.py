"""The text of .scl and .kbm files.

Formats: the published descriptions of the Scala scale file and of its keyboard mappings
(huygens-fokker.org: scl_format.html; help.htm, mappings). Latin-1, line feeds, nothing after a
pitch value; cents always have a period, ratios never.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from fractions import Fraction

SCL, KBM = ".scl", ".kbm"


def scl_bytes(
    name: str, description: str, pitches: Sequence[Fraction | float], labels: Sequence[str]
) -> bytes:
    """A scale.

    Parameters
    ----------
    name : str
        The file's name with its ending, for the first comment.
    description : str
        One line.
    pitches : sequence of Fraction or float
        Exact ratios, or cents, above the unspoken 1/1; the last is the period.
    labels : sequence of str
        A name for each pitch, on a comment line above it.
    """
    lines = [f"! {name}", "!", _plain_line(description), f" {len(pitches)}", "!"]
    for pitch, label in zip(pitches, labels, strict=True):
        lines += [f"! {label}", f" {_pitch(pitch)}"]
    return _latin("\n".join(lines) + "\n")


def kbm_bytes(name: str, first_key: int, hz: float, size: int) -> bytes:
    """A mapping of all keys, `size` to the octave, with 1/1 on `first_key` at `hz`."""
    entries: list[tuple[str, str]] = [
        ("Size of the map", str(size)),
        ("First key to retune", "0"),
        ("Last key to retune", "127"),
        ("Key of the first entry, 1/1", str(first_key)),
        ("Reference key", str(first_key)),
        ("Its frequency in Hz", f"{hz:.6f}"),
        ("Scale degree of the octave", str(size)),
    ]
    lines = [f"! {name}"]
    for comment, value in entries:
        lines += [f"! {comment}", value]
    lines += ["! Scale degree of each key", *map(str, range(size))]
    return _latin("\n".join(lines) + "\n")


def _pitch(pitch: Fraction | float) -> str:
    if isinstance(pitch, Fraction):
        return f"{pitch.numerator}/{pitch.denominator}"
    return f"{pitch:.6f}"


def _plain_line(text: str) -> str:
    """One line that is no comment."""
    line = " ".join(text.split())
    return line.lstrip("! ") if line.startswith("!") else line


def _latin(text: str) -> bytes:
    """Latin-1; letters it lacks lose their accents, others become question marks."""
    return "".join(_in_latin(char) for char in text).encode("latin-1", "replace")


def _in_latin(char: str) -> str:
    return char if ord(char) < 256 else unicodedata.normalize("NFKD", char)[0]
