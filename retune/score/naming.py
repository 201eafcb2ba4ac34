"""Final names and voice types of the lines of a score, by what they are called and where they
lie: in the usual ranges with a few semitones of stretch.
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Sequence
from dataclasses import replace

from retune.errors import Weight
from retune.score.ledger import Ledger
from retune.score.lines import Line
from retune.score.model import PartKind, VoiceType
from retune.score.names import Label, Role, read_name
from retune.score.ranges import RANGES
from retune.score.voicewords import STANDARD_NAMES

STRETCH = 4
FOUR_VOICES = (VoiceType.SOPRANO, VoiceType.ALTO, VoiceType.TENOR, VoiceType.BASS)


def short_name(name: str) -> str:
    """First letter, and the number of a divided part.

    >>> short_name("Soprano"), short_name("Tenor 2")
    ('S', 'T2')
    """
    first, _, last = name.partition(" ")
    return first[:1] + (last if last[:1].isdigit() else "")


def named(lines: Sequence[Line], ledger: Ledger) -> list[Line]:
    """The lines with steady, different names, and with voice types for those that sing."""
    labelled = _as_four_voices(lines, ledger)
    final = _different([_typed(line) for line in labelled])
    for before, line in zip(labelled, final, strict=True):
        if before.label.voice_type is not None:
            _check_octave(line, ledger)
    return final


def _as_four_voices(lines: Sequence[Line], ledger: Ledger) -> list[Line]:
    """Four nameless lines become Soprano, Alto, Tenor and Bass, where their ranges fit."""
    voices = [line for line in lines if line.kind is PartKind.VOICE and line.singers]
    if len(voices) != 4 or not all(_nameless(line, voices) for line in voices):
        return list(lines)
    means = [line.mean_key for line in voices]
    fits = all(map(_in_range, voices, FOUR_VOICES))
    if not fits or sorted(means, reverse=True) != means:
        return list(lines)
    ledger.add(Weight.NOTE, "parts without names were taken for Soprano, Alto, Tenor and Bass")
    types = {id(line): voice_type for line, voice_type in zip(voices, FOUR_VOICES, strict=True)}
    return [
        replace(line, label=Label(STANDARD_NAMES[types[id(line)]], types[id(line)]))
        if id(line) in types
        else line
        for line in lines
    ]


def _nameless(line: Line, voices: Sequence[Line]) -> bool:
    """Whether a line's name says nothing about it alone: none, "Part 1", "Piano", "Choir"."""
    name = line.label.name
    if line.label.voice_type is not None:
        return False
    reading = read_name(name)
    if not name or reading.generic or reading.role is Role.KEYBOARD:
        return True
    return sum(other.label.name == name for other in voices) > 1


def _in_range(line: Line, voice_type: VoiceType) -> bool:
    low, high = RANGES[voice_type]
    keys = [note.pitch.key for bar in line.bars for note in bar]
    return low - STRETCH <= min(keys) and max(keys) <= high + STRETCH


def _typed(line: Line) -> Line:
    if line.label.voice_type is not None or not line.singers:
        return line
    mean = line.mean_key
    nearest = min(FOUR_VOICES, key=lambda kind: abs(mean - sum(RANGES[kind]) / 2))
    return replace(line, label=replace(line.label, voice_type=nearest))


def _check_octave(line: Line, ledger: Ledger) -> None:
    """Doubt a voice that would lie well an octave higher or lower."""
    if line.label.voice_type is None:
        return
    low, high = RANGES[line.label.voice_type]
    mean = line.mean_key
    if low <= mean <= high:
        return
    octave = 12 if mean < low else -12
    if low <= mean + octave <= high:
        where = "low" if octave > 0 else "high"
        what = f"lies an octave too {where} for its voice ({line.label.voice_type}); check its clef"
        ledger.add(Weight.DOUBT, what, line.label.name)


def _different(lines: Sequence[Line]) -> list[Line]:
    """Lines of one name are numbered, or lettered where the name ends in a number."""
    bases = [line.label.name or "Part" for line in lines]
    count = Counter(base.casefold() for base in bases)
    reached: defaultdict[str, int] = defaultdict(int)
    taken = {base.casefold() for base in bases if count[base.casefold()] == 1 and base != "Part"}
    result = []
    for line, base in zip(lines, bases, strict=True):
        name = base
        if count[base.casefold()] > 1 or not line.label.name:
            name = _next_name(line.label, base, reached, taken)
        taken.add(name.casefold())
        result.append(replace(line, label=replace(line.label, name=name)))
    return result


def _next_name(label: Label, base: str, reached: defaultdict[str, int], taken: set[str]) -> str:
    while True:
        reached[base.casefold()] += 1
        number = reached[base.casefold()]
        lettered = label.ordinal is not None and number <= 26
        name = f"{base}{chr(96 + number)}" if lettered else f"{base} {number}"
        if name.casefold() not in taken:
            return name
