"""Tunes of an ABC file: header and body, line by line, each voice to its reader."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from fractions import Fraction

from retune.adapters.abc_fields import (
    Staff,
    default_length,
    parse_key,
    parse_length,
    parse_metre,
    parse_staff,
)
from retune.adapters.abc_tokens import SHORTHAND
from retune.adapters.abc_voice import VoiceReader
from retune.errors import Finding, Weight

_FIELD = re.compile(r"([A-Za-z]):(?!\|)(.*)")
_INLINE_VOICE = re.compile(r"\[V:\s*([^\]]*)\]")
_VALUE = r"""\s*=\s*(?:"([^"]*)"|(\S+))"""
_NAME = re.compile(r"\b(?:name|nm)" + _VALUE)
_SHORT = re.compile(r"\b(?:subname|sname|snm)" + _VALUE)
_MIDI_TRANSPOSE = re.compile(r"%%MIDI\s+transpose\s+(-?\d{1,2})\b")
_USER_SIGN = re.compile(r"\s*([H-Wh-w~])\s*=\s*[!+]?([^!+\s]+)")
_BODY_FIELDS = frozenset("KLMQP")
_OLD_BASS_SHIFT = -24
_MIDDLE_C = 60


@dataclass
class Voice:
    """One voice of a tune; `verse` counts the lines of words under its last line of music."""

    reader: VoiceReader
    staff: Staff
    name: str = ""
    short: str = ""
    verse: int = 0

    @property
    def length(self) -> Fraction:
        """Quarter notes in all."""
        return sum((bar.length for bar in self.reader.bars), Fraction(0))


@dataclass
class Tune:
    """One tune as read: everything from its X: to the next."""

    titles: list[str] = field(default_factory=list)
    composer: str = ""
    voices: list[Voice] = field(default_factory=list)
    midi_shift: int = 0
    findings: list[Finding] = field(default_factory=list)

    @property
    def title(self) -> str:
        """The first title."""
        return self.titles[0] if self.titles else ""

    def shift(self, voice: Voice) -> int:
        """Semitones from written to sounding pitch.

        Files from before "clef=" existed write the bass two octaves up; such a bass lies above
        middle C on paper.
        """
        if voice.staff.shift:
            return voice.staff.shift
        if self.midi_shift % 12 == 0 and self.midi_shift and len(self.voices) == 1:
            return self.midi_shift
        keys = [p.key for bar in voice.reader.bars for event in bar.events for p in event.pitches]
        high = bool(keys) and sum(keys) >= _MIDDLE_C * len(keys)
        return _OLD_BASS_SHIFT if voice.staff.old_bass and high else 0


class TuneReader:
    """Reads the lines of one tune."""

    def __init__(self) -> None:
        self.tune = Tune()
        self._header: dict[str, str] = {}
        self._voices: dict[str, Voice] = {}
        self._named: dict[str, str] = {}
        self._current = ""
        self._shorthand = dict(SHORTHAND)
        self._in_body = False
        self._over = False

    def read(self, lines: list[str]) -> Tune:
        """The tune in these lines; an empty line ends it."""
        for line in lines:
            directive = _MIDI_TRANSPOSE.match(line)
            if directive:
                self.tune.midi_shift = int(directive[1])
            text = re.split(r"(?<!\\)%", line, maxsplit=1)[0].rstrip()
            if not line.strip():
                self._over = self._in_body
            elif text.strip() and not self._over:
                self._line(text)
        self.tune.voices = [voice for voice in self._voices.values() if voice.length]
        lost = {what for voice in self.tune.voices for what in voice.reader.lost}
        self.tune.findings += [Finding(Weight.LOSS, f"left out: {what}") for what in sorted(lost)]
        return self.tune

    def _line(self, text: str) -> None:
        found = _FIELD.match(text)
        if found is None:
            if self._in_body:
                self._music(text)
        elif found[1] == "w":
            self._words(found[2])
        else:
            self._field(found[1], found[2].strip())

    def _field(self, name: str, value: str) -> None:
        if name == "T" and value:
            self.tune.titles.append(value)
        elif name == "C":
            self.tune.composer = self.tune.composer or value
        elif name == "U":
            sign = _USER_SIGN.match(value)
            if sign:
                self._shorthand[sign[1]] = sign[2]
        elif name == "V":
            self._choose(value)
        elif name in _BODY_FIELDS and self._in_body:
            self._voice().reader.read_field(name, value)
        else:
            self._header[name] = value
            self._in_body = self._in_body or name == "K"

    def _choose(self, value: str) -> None:
        """A V: field: which voice follows, and what it is called."""
        identity, _, rest = value.strip().partition(" ")
        self._current = identity
        if rest.strip():
            self._named[identity] = rest

    def _voice(self) -> Voice:
        if self._current not in self._voices:
            self._voices[self._current] = self._new_voice(self._named.get(self._current, ""))
        return self._voices[self._current]

    def _new_voice(self, about: str) -> Voice:
        metre = parse_metre(self._header.get("M", ""))
        unit = parse_length(self._header.get("L", "")) or default_length(metre)
        key = self._header.get("K", "")
        reader = VoiceReader(parse_key(key), metre, unit, self._shorthand)
        if not self._voices and "Q" in self._header:
            reader.read_field("Q", self._header["Q"])
        own = parse_staff(about) if about else Staff()
        staff = own if own != Staff() else parse_staff(key)
        name, short = _NAME.search(about), _SHORT.search(about)
        return Voice(
            reader,
            staff,
            (name[1] or name[2] or "") if name else "",
            (short[1] or short[2] or "") if short else "",
        )

    def _music(self, text: str) -> None:
        """A line of music, which may change its voice."""
        pieces = _INLINE_VOICE.split(text)
        for place, piece in enumerate(pieces):
            if place % 2:
                self._choose(piece)
            elif piece.strip():
                voice = self._voice()
                voice.reader.read_line(piece.rstrip("\\"))
                voice.verse = 0

    def _words(self, text: str) -> None:
        voice = self._voice()
        voice.verse += 1
        if not voice.reader.read_words(text, voice.verse):
            what = f"more syllables than notes in a line of words: {text.strip()[:40]}"
            self.tune.findings.append(Finding(Weight.LOSS, what))
