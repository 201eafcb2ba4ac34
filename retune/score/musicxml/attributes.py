"""What stands at the head of a bar: divisions, metre, key, clef, transposition, staves."""

from __future__ import annotations

import re
from collections.abc import Callable
from fractions import Fraction

from retune.adapters.xml import Element
from retune.errors import Weight
from retune.score.musicxml.draft import BarDraft
from retune.score.musicxml.transposition import interval
from retune.score.musicxml.values import MAX_STAVES, decimal, whole, words

_MOST_BEATS = 1024
_MOST_FIFTHS = 14
_MOST_CHROMATIC = 48
_BEATS = re.compile(r"[0-9]{1,4}(?:\s*\+\s*[0-9]{1,4}){0,15}")


def read_attributes(element: Element, bar: BarDraft) -> None:
    """Read an <attributes> element into the bar and the part."""
    known_keys = len(bar.keys)
    for child in element:
        read = _READERS.get(child.tag)
        if read is not None:
            read(child, bar)
    # Keys are written too; the transposition that makes them sound may stand behind them.
    shift = bar.part.transposition(1).fifths
    bar.keys[known_keys:] = [
        (onset, (fifths + shift, mode)) for onset, (fifths, mode) in bar.keys[known_keys:]
    ]
    _watch_octaves(bar)


def _watch_octaves(bar: BarDraft) -> None:
    """Remember staves that both a clef for low voices and a transposition put an octave down."""
    for staff, clef in bar.part.clefs.items():
        if clef == "G8" and bar.part.transposition(staff).semitones == -12:
            bar.part.doubly_lowered.add(staff)


def _divisions(element: Element, bar: BarDraft) -> None:
    divisions = decimal(element.text)
    if divisions is None or divisions <= 0:
        bar.remark(Weight.DOUBT, "the divisions are not a number above 0; the former ones hold")
    elif divisions != bar.part.divisions:
        bar.part.divisions = divisions
        bar.part.lengths.clear()
        bar.part.fitting.clear()


def _staves(element: Element, bar: BarDraft) -> None:
    bar.part.staves = max(bar.part.staves, whole(element.text, 1, MAX_STAVES) or 1)


def _key(element: Element, bar: BarDraft) -> None:
    fifths = whole(element.findtext("fifths"), -_MOST_FIFTHS, _MOST_FIFTHS)
    if (element.get("number") or "1") != "1":
        if fifths != bar.part.key_fifths:
            bar.remark(Weight.NOTE, "staves have keys of their own; that of the first is used")
        return
    if fifths is None:
        bar.remark(Weight.LOSS, "a key signature that is no circle-of-fifths key is not used")
        return
    mode = words(element.find("mode")).lower()
    bar.part.key_fifths = fifths
    bar.part.pitches.clear()
    bar.keys.append((bar.now, (fifths, mode if mode and mode != "none" else None)))


def _time(element: Element, bar: BarDraft) -> None:
    if (element.get("number") or "1") != "1":
        return
    if element.find("senza-misura") is not None:
        bar.remark(Weight.NOTE, "no metre from here; bars are as long as their notes")
        return
    metre = _metre(element)
    if metre is None:
        bar.remark(Weight.LOSS, "a time signature cannot be read and is not used")
        return
    bar.part.metre = metre
    bar.metres.append((bar.now, metre))


def _metre(time: Element) -> tuple[int, int] | None:
    """Beats and beat unit, with composite signatures added up: 3/8 + 2/4 is (7, 8)."""
    pairs: list[tuple[int, int]] = []
    beats = None
    for child in time:
        if child.tag == "beats":
            beats = _sum(words(child))
        elif child.tag == "beat-type":
            unit = whole(child.text, 1, _MOST_BEATS)
            if beats is None or unit is None:
                return None
            pairs.append((beats, unit))
            beats = None
    if not pairs or beats is not None:
        return None
    finest = max(unit for _, unit in pairs)
    total = sum(Fraction(count * finest, unit) for count, unit in pairs)
    if total.denominator != 1 or not 1 <= total <= _MOST_BEATS:
        return None
    return total.numerator, finest


def _sum(text: str) -> int | None:
    if _BEATS.fullmatch(text) is None:
        return None
    return sum(int(part) for part in text.split("+"))


def _clef(element: Element, bar: BarDraft) -> None:
    staff = whole(element.get("number") or "1", 1, MAX_STAVES) or 1
    sign = words(element.find("sign"))
    octaves = whole(element.findtext("clef-octave-change"), -3, 3) or 0
    name = _clef_name(sign, octaves)
    bar.part.clefs[staff] = name
    bar.part.first_clefs.setdefault(staff, name)


def _clef_name(sign: str, octaves: int) -> str:
    """G8 sounds an octave below G, G15 two; ^8 above."""
    if octaves == 0:
        return sign
    return f"{sign}{'^' if octaves > 0 else ''}{1 + 7 * abs(octaves)}"


def _transpose(element: Element, bar: BarDraft) -> None:
    staff = whole(element.get("number"), 1, MAX_STAVES) or 0
    given = decimal(element.findtext("chromatic")) or Fraction(0)
    if abs(given) > _MOST_CHROMATIC:
        bar.remark(Weight.LOSS, "a transposition by more than four octaves is not used")
        return
    chromatic = round(given)
    if chromatic != given:
        bar.remark(Weight.LOSS, "a transposition by less than a semitone is rounded")
    diatonic = whole(element.findtext("diatonic"), -_MOST_CHROMATIC, _MOST_CHROMATIC)
    octaves = whole(element.findtext("octave-change"), -4, 4) or 0
    transposition, agrees = interval(chromatic, diatonic, octaves, _doubling(element))
    if not agrees:
        bar.remark(Weight.DOUBT, "steps and semitones of a transposition disagree; semitones hold")
    if abs(chromatic) >= 12 and chromatic * octaves > 0:
        bar.remark(Weight.DOUBT, "a transposition names its octave twice; both are added")
    if transposition.doubling:
        bar.remark(Weight.NOTE, "the part is doubled at the octave; both octaves sound")
    if staff == 0:
        bar.part.transpositions.clear()
    bar.part.transpositions[staff] = transposition
    bar.part.pitches.clear()


def _doubling(transpose: Element) -> int:
    double = transpose.find("double")
    if double is None:
        return 0
    return 1 if double.get("above") == "yes" else -1


def _measure_style(element: Element, bar: BarDraft) -> None:
    repeat = element.find("measure-repeat")
    if repeat is not None:
        bar.part.in_measure_repeat = repeat.get("type") != "stop"


_READERS: dict[str, Callable[[Element, BarDraft], None]] = {
    "divisions": _divisions,
    "staves": _staves,
    "key": _key,
    "time": _time,
    "clef": _clef,
    "transpose": _transpose,
    "measure-style": _measure_style,
}
