"""One voice of an ABC tune, read into bars.

Conventions
-----------
* Lengths and onsets are `Fraction` quarter notes.
* An accidental holds for its letter in all octaves to the end of the bar (ABC 2.1, the default
  of propagate-accidentals; from memory).
"""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Callable
from dataclasses import replace
from fractions import Fraction

from retune.adapters import abc_tokens as tokens
from retune.adapters.abc_drafts import MOST_BARS, BarDraft, Event, too_many_bars
from retune.adapters.abc_fields import (
    ALTERS,
    AbcKey,
    parse_key,
    parse_length,
    parse_metre,
    parse_tempo,
)
from retune.pitch import Pitch
from retune.written import MarkKind, MarkValue, WrittenLyric

_MOST_BARS_REST = 1000
_GOES_ON = {"single": "begin", "end": "middle"}
_BAR = re.compile(r"(?P<ends>:*)(?P<line>[\[|\]]*?)(?P<starts>:*)\s*\[?(?P<ending>[1-9][\d,-]*)?")


class VoiceReader:
    """Reads the music lines of one voice, in order; `bars` gives what was written.

    Parameters
    ----------
    key, metre, unit
        In force at the start.
    shorthand : dict
        One-letter decorations.
    """

    def __init__(
        self,
        key: AbcKey,
        metre: tuple[int, int] | None,
        unit: Fraction,
        shorthand: dict[str, str],
    ) -> None:
        self._key, self._metre, self._unit = key, metre, unit
        self._shorthand = shorthand
        self.bars = [BarDraft(metre=metre, key=(key.fifths, key.mode))]
        self._alters: dict[str, int] = {}
        self._before: Event | None = None
        self._signs: set[str] = set()
        self._broken = Fraction(1)
        self._tuplet = (Fraction(1), 0)
        self._in_ending = False
        self._skipping = False
        self._inside: defaultdict[int, bool] = defaultdict(bool)
        self._line: list[tuple[int, Event]] = []
        self.lost: set[str] = set()

    # --- lines -------------------------------------------------------------------------

    def read_line(self, line: str) -> None:
        """Read one line of music."""
        self._line = []
        for match in tokens.TOKEN.finditer(line):
            kind = match.lastgroup or ""
            if kind != "bar" and self._skipping:
                continue
            handler = _HANDLERS.get(kind)
            if handler is not None:
                handler(self, match)

    def read_field(self, name: str, value: str) -> None:
        """Obey a field inside the tune: K, M, L or Q; P is a rehearsal mark."""
        if name == "K":
            self._key = parse_key(value)
            self._bar.key = (self._key.fifths, self._key.mode)
        elif name == "M":
            self._metre = parse_metre(value)
            self._bar.metre = self._metre
        elif name == "L":
            self._unit = parse_length(value) or self._unit
        elif name == "Q":
            qpm, words = parse_tempo(value, self._unit)
            if words:
                self._mark(MarkKind.WORDS, words)
            if qpm is not None:
                self._mark(MarkKind.TEMPO, qpm)
        elif name == "P" and value.strip():
            self._mark(MarkKind.REHEARSAL, value.strip())

    def read_words(self, line: str, verse: int) -> bool:
        """Put a w: line under the last line of music; False if syllables are left over."""
        if not self._line:
            return False
        place, bar = 0, self._line[0][0]
        last: list[WrittenLyric] = []
        for sign in tokens.syllables_of(line):
            if sign == "|":
                bar += 1
                while place < len(self._line) and self._line[place][0] < bar:
                    place += 1
                continue
            if place == len(self._line):
                return sign in ("-", "_", "*")
            event = self._line[place][1]
            place += 1
            if sign == "-" and last and not self._inside[verse]:  # "wa - ter": still one word
                last[-1] = replace(last[-1], syllabic=_GOES_ON[last[-1].syllabic])
                self._inside[verse] = True
            if sign in ("-", "_", "*"):
                continue
            goes_on = sign.endswith("-")
            syllabic = (("single", "begin"), ("end", "middle"))[self._inside[verse]][goes_on]
            event.lyrics.append(WrittenLyric(sign.removesuffix("-"), syllabic, str(verse)))
            self._inside[verse], last = goes_on, event.lyrics
        return True

    # --- signs -------------------------------------------------------------------------

    @property
    def _bar(self) -> BarDraft:
        return self.bars[-1]

    def _mark(self, kind: MarkKind, value: MarkValue = None) -> None:
        self._bar.marks.append((len(self._bar.events), kind, value))

    def _on_quoted(self, match: re.Match[str]) -> None:
        text = match["quoted"].strip()
        symbol = tokens.chord_symbol(text)
        if symbol is not None:
            self._mark(MarkKind.CHORD_SYMBOL, symbol)
        elif text.lstrip("^_<>@"):
            self._mark(MarkKind.WORDS, text.lstrip("^_<>@").strip())

    def _on_decoration(self, match: re.Match[str]) -> None:
        self._decorate(match[match.lastgroup or 0])

    def _on_shorthand(self, match: re.Match[str]) -> None:
        self._decorate(self._shorthand.get(match[0], ""))

    def _decorate(self, name: str) -> None:
        if name in tokens.NOTE_SIGNS:
            self._signs.add(tokens.NOTE_SIGNS[name])
        elif name in tokens.ORDER_SIGNS:
            self._mark(*tokens.ORDER_SIGNS[name])
        elif name in tokens.DYNAMICS:
            self._mark(MarkKind.DYNAMIC, name)
        elif name in tokens.HAIRPINS:
            self._mark(MarkKind.HAIRPIN, tokens.HAIRPINS[name])

    def _on_inline(self, match: re.Match[str]) -> None:
        self.read_field(match["field"], match["value"])

    def _on_tuplet(self, match: re.Match[str]) -> None:
        compound = self._metre is not None and self._metre[0] in (6, 9, 12)
        self._tuplet = tokens.tuplet_of(match["tuplet"], compound)

    def _on_broken(self, match: re.Match[str]) -> None:
        """a>b: the first gains what the second loses; more arrows dot more often."""
        if not self._bar.events:
            return
        short = Fraction(1, 2 ** len(match["broken"]))
        before, self._broken = (
            (2 - short, short) if match["broken"][0] == ">" else (short, 2 - short)
        )
        self._bar.events[-1].length *= before

    def _on_overlay(self, match: re.Match[str]) -> None:
        self._skipping = True
        self.lost.add("a second line in one voice (&)")

    # --- notes -------------------------------------------------------------------------

    def _on_note(self, match: re.Match[str]) -> None:
        event = Event(self._timed(tokens.length_of(match)))
        self._sound(event, match)
        self._add(event)

    def _on_chord(self, match: re.Match[str]) -> None:
        inner = [found for found in tokens.CHORD_NOTE.finditer(match["stack"]) if found["letter"]]
        if not inner:
            return
        length = tokens.length_of(inner[0]) * tokens.length_of(match, "chord_")
        event = Event(self._timed(length))
        for found in inner:
            self._sound(event, found)
            if found["tie"]:
                event.tied.add(len(event.pitches) - 1)
        self._add(event)

    def _on_grace(self, match: re.Match[str]) -> None:
        for found in tokens.CHORD_NOTE.finditer(match["grace"]):
            if found["letter"]:
                event = Event(Fraction(0), grace=True)
                self._sound(event, found)
                self._bar.events.append(event)

    def _on_rest(self, match: re.Match[str]) -> None:
        sign = match["silence"]
        hidden = sign in "xX"
        if sign in "zx":
            length = self._timed(tokens.length_of(match, "rest_"))
            self._bar.events.append(Event(length, hidden=hidden, signs=self._signs))
            self._signs, self._before = set(), None
            return
        beats, unit = self._metre or (4, 4)
        for number in range(min(int(match["rest_times"] or 1), _MOST_BARS_REST)):
            if number:
                self._next_bar()
            self._bar.events.append(Event(Fraction(4 * beats, unit), hidden=hidden))

    def _timed(self, units: Fraction) -> Fraction:
        """A length in quarters, under the tuplet and broken rhythm in force."""
        factor, left = self._tuplet
        length = units * self._unit * self._broken * (factor if left else 1)
        self._tuplet = (factor, max(left - 1, 0))
        self._broken = Fraction(1)
        return length

    def _sound(self, event: Event, match: re.Match[str]) -> None:
        """Add a written note's pitch: its own accidental, the bar's, a tie's or the key's."""
        letter = match["letter"].upper()
        octave = 4 + match["letter"].islower() + match["octave"].count("'")
        octave -= match["octave"].count(",")
        held = self._held(letter, octave)
        if match["sign"]:
            self._alters[letter] = ALTERS[match["sign"]]
        alter = self._alters.get(letter, self._key.alters.get(letter, 0))
        if held is not None and not match["sign"]:
            alter = held
        if held == alter:
            event.stops.add(len(event.pitches))
        event.pitches.append(Pitch(letter, alter, octave))

    def _held(self, letter: str, octave: int) -> int | None:
        """The alteration of the note before, if it is tied to this place on the staff."""
        tied = () if self._before is None else (self._before.pitches[i] for i in self._before.tied)
        return next((p.alter for p in tied if (p.step, p.octave) == (letter, octave)), None)

    def _add(self, event: Event) -> None:
        event.signs, self._signs = self._signs, set()
        self._before = event
        self._bar.events.append(event)
        self._line.append((len(self.bars), event))

    def _on_tie(self, match: re.Match[str]) -> None:
        if self._before is not None:
            self._before.tied.update(range(len(self._before.pitches)))

    # --- bars --------------------------------------------------------------------------

    def _on_bar(self, match: re.Match[str]) -> None:
        """A bar line: what it ends counts for the bar before it, what it opens for the next."""
        self._skipping = False
        found = _BAR.fullmatch(match["bar"]) or _BAR.match("|")
        assert found is not None  # the pattern matches anything
        ends, line, starts = len(found["ends"]), found["line"], len(found["starts"])
        if ends and not line and not starts:  # :: alone is :||:
            ends, starts = ends - ends // 2, ends // 2
        closes = bool(ends) or line in ("||", "|]", "[|") or bool(found["ending"])
        if self._bar.events or len(self.bars) > 1:
            done = self._bar if self._bar.events else self.bars[-2]
            if ends:
                done.repeat_end = ends + 1
            if self._in_ending and closes:
                done.ending_stop, self._in_ending = True, False
        if self._bar.events:
            self._next_bar()
        if starts:
            self._bar.repeat_start = True
        if found["ending"]:
            self._bar.ending = tokens.passes_of(found["ending"])
            self._in_ending = bool(self._bar.ending)

    def _next_bar(self) -> None:
        if len(self.bars) >= MOST_BARS:
            raise too_many_bars()
        self.bars.append(BarDraft())
        self._alters = {}


_HANDLERS: dict[str, Callable[[VoiceReader, re.Match[str]], None]] = {
    "quoted": VoiceReader._on_quoted,
    "decoration": VoiceReader._on_decoration,
    "old_decoration": VoiceReader._on_decoration,
    "grace": VoiceReader._on_grace,
    "inline": VoiceReader._on_inline,
    "bar": VoiceReader._on_bar,
    "chord": VoiceReader._on_chord,
    "tuplet": VoiceReader._on_tuplet,
    "note": VoiceReader._on_note,
    "rest": VoiceReader._on_rest,
    "broken": VoiceReader._on_broken,
    "tie": VoiceReader._on_tie,
    "overlay": VoiceReader._on_overlay,
    "shorthand": VoiceReader._on_shorthand,
}
