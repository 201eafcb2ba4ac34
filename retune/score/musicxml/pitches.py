"""The sounding pitch of a note element."""

from __future__ import annotations

import math
from fractions import Fraction

from retune.adapters.xml import Element
from retune.pitch import Pitch
from retune.score.musicxml.draft import PartState, PitchReading
from retune.score.musicxml.values import decimal, whole

MOST_ALTERED = 3
LOWEST_KEY, HIGHEST_KEY = 0, 127


def read_pitch(pitch: Element, staff: int, part: PartState) -> PitchReading:
    """The sounding pitch of a <pitch> element on a staff, in the keys of MIDI."""
    step = alter = octave = None
    for child in pitch:
        if child.tag == "step":
            step = child.text
        elif child.tag == "octave":
            octave = child.text
        elif child.tag == "alter":
            alter = child.text
    wanted = (step, alter, octave, str(staff))
    reading = part.pitches.get(wanted)
    if reading is None:
        reading = part.pitches[wanted] = _reading(step, alter, octave, staff, part)
    return reading


def _reading(
    step: str | None, alter: str | None, octave: str | None, staff: int, part: PartState
) -> PitchReading:
    letter = (step or "").strip().upper()
    height = whole(octave, -1, 11)
    raised = Fraction(0) if alter is None or not alter.strip() else decimal(alter)
    if letter not in tuple("ABCDEFG") or height is None:
        return PitchReading(None, "a note has no readable pitch")
    if raised is None or abs(raised) > MOST_ALTERED:
        return PitchReading(None, "a note is altered by more than any sign can")
    nearest = _toward_zero(raised)
    transposition = part.transposition(staff)
    sounding = transposition.pitch(Pitch(letter, nearest, height))
    if not _has_key(sounding.key):
        return PitchReading(None, "a note lies outside the keys of MIDI (C-1 to G9)")
    doubling = transposition.doubling
    if not _has_key(sounding.key + 12 * doubling):
        doubling = 0
    return PitchReading(sounding, rounded=raised != nearest, doubling=doubling)


def _has_key(key: int) -> bool:
    return LOWEST_KEY <= key <= HIGHEST_KEY


def _toward_zero(raised: Fraction) -> int:
    """The nearest whole number; halves go toward the natural note."""
    size = abs(raised)
    signs = math.ceil(size - Fraction(1, 2))
    return signs if raised >= 0 else -signs
