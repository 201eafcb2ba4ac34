"""Directions and playback data: words, tempo, dynamics, hairpins, rehearsal marks, jumps."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

from retune.adapters.xml import Element
from retune.errors import Weight
from retune.score.musicxml.draft import BarDraft, Jump
from retune.score.musicxml.jumps import (
    BY_SIGN,
    BY_WORDS,
    jump_in_words,
    jumps_of_sound,
)
from retune.score.musicxml.placing import Place, placed
from retune.score.musicxml.tempo import read_metronome, within_reason
from retune.score.musicxml.values import MAX_TEXT, decimal, velocity, words
from retune.written import MarkKind

# Dynamics of one moment; a velocity beside them does not hold for what follows.
_ACCENTS = frozenset(
    ("sf", "sfz", "sffz", "sfzp", "sfp", "sfpp", "fp", "pf", "fz", "rf", "rfz", "other-dynamics")
)
_HAIRPINS = {"crescendo": "crescendo", "diminuendo": "diminuendo", "stop": "stop"}
_NOTICEABLE = Fraction(3, 2)
"""Quarter notes a minute by which a printed and a played tempo may differ unremarked."""


def read_direction(element: Element, bar: BarDraft) -> None:
    """Read a <direction> element into the bar."""
    place = placed(element, bar)
    sound = element.find("sound")
    texts: list[str] = []
    for kinds in element.iterchildren("direction-type"):
        for child in kinds:
            if child.tag == "words":
                texts.append(words(child))
            elif child.tag == "dynamics":
                _dynamics(child, sound, place, bar)
            else:
                read = _READERS.get(child.tag)
                if read is not None:
                    read(child, place, bar)
    _words(texts, place, bar)
    if sound is not None:
        _sound(sound, place, bar, printed=element.find("direction-type/dynamics") is not None)


def read_sound(element: Element, bar: BarDraft) -> None:
    """Read a <sound> element that stands alone in the bar."""
    _sound(element, placed(element, bar), bar, printed=False)


def _words(texts: list[str], place: Place, bar: BarDraft) -> None:
    """All words of a direction together: "D.C." and "al Fine" may stand in two elements."""
    text = " ".join(filter(None, texts))[:MAX_TEXT]
    if not text:
        return
    bar.mark(MarkKind.WORDS, place.onset, text, place.staff, place.voice)
    jump = jump_in_words(text)
    if jump is not None:
        bar.jumps.append(Jump(jump[0], place.onset, BY_WORDS, jump[1]))


def _dynamics(element: Element, sound: Element | None, place: Place, bar: BarDraft) -> None:
    """Dynamics as printed; where the file gives their velocity, that in their place."""
    played = None if sound is None else velocity(sound.get("dynamics"))
    for sign in element:
        value: str | int = words(sign) if sign.tag == "other-dynamics" else sign.tag
        if played is not None and sign.tag not in _ACCENTS:
            value = played
        if value:
            bar.mark(MarkKind.DYNAMIC, place.onset, value, place.staff, place.voice)


def _wedge(element: Element, place: Place, bar: BarDraft) -> None:
    value = _HAIRPINS.get(element.get("type") or "")
    if value is not None:
        bar.mark(MarkKind.HAIRPIN, place.onset, value, place.staff, place.voice)


def _rehearsal(element: Element, place: Place, bar: BarDraft) -> None:
    text = words(element)
    if text:
        bar.mark(MarkKind.REHEARSAL, place.onset, text)


def _segno(element: Element, place: Place, bar: BarDraft) -> None:
    bar.jumps.append(Jump(MarkKind.SEGNO, place.onset, BY_SIGN))


def _coda(element: Element, place: Place, bar: BarDraft) -> None:
    bar.jumps.append(Jump(MarkKind.CODA, place.onset, BY_SIGN))


def _metronome(element: Element, place: Place, bar: BarDraft) -> None:
    tempo = read_metronome(element, bar.part.tempo)
    if tempo is None:
        bar.remark(Weight.LOSS, "a metronome mark cannot be read and is not used", place.onset)
    else:
        _tempo(tempo, place.onset, bar, played=False)


def _tempo(tempo: Fraction, onset: Fraction, bar: BarDraft, *, played: bool) -> None:
    bar.part.tempo = tempo
    bar.tempi.append((onset, tempo, played))


def _sound(element: Element, place: Place, bar: BarDraft, *, printed: bool) -> None:
    """Playback data: tempo, dynamics that no sign stands for, jumps."""
    if element.get("tempo") is not None:
        given = decimal(element.get("tempo"))
        tempo = within_reason(given)
        if tempo is not None:
            _tempo(tempo, place.onset, bar, played=True)
        elif given != 0:
            bar.remark(Weight.LOSS, "a playback tempo makes no sense and is not used", place.onset)
    played = velocity(element.get("dynamics"))
    if played is not None and not printed:
        bar.mark(MarkKind.DYNAMIC, place.onset, played, place.staff, place.voice)
    if element.get("forward-repeat") == "yes":
        bar.repeat_start = True
    bar.jumps.extend(jumps_of_sound(element, place))


def settle_tempi(bar: BarDraft) -> None:
    """Turn the tempi met in a bar into marks, one an onset; playback data count before print."""
    printed = {onset: tempo for onset, tempo, played in bar.tempi if not played}
    played = {onset: tempo for onset, tempo, played in bar.tempi if played}
    for onset, tempo in (printed | played).items():
        bar.mark(MarkKind.TEMPO, onset, tempo)
        if abs(printed.get(onset, tempo) - tempo) > _NOTICEABLE:
            bar.remark(
                Weight.DOUBT, "printed and played tempo differ; the played one is used", onset
            )


_READERS: dict[str, Callable[[Element, Place, BarDraft], None]] = {
    "wedge": _wedge,
    "rehearsal": _rehearsal,
    "segno": _segno,
    "coda": _coda,
    "metronome": _metronome,
}
