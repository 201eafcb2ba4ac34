"""Lyrics of a MIDI file (RP-017): syllables put under notes, words put together.

A syllable ends a word if a space follows it; files that use no spaces mark the middle of a word
with a hyphen, and files with neither give whole words. CR and LF, alone or in the text, end a
word too. Text in braces is a tag, not sung.
"""

from __future__ import annotations

from bisect import bisect_left
from collections import defaultdict
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction

from retune.adapters.midi import Meta, MetaType, RawMidi, text_of
from retune.score.midi.parts import Line
from retune.written import WrittenLyric

NEAR = Fraction(1, 8)
"""A syllable belongs to a note that starts at most so many quarter notes away."""


@dataclass(frozen=True, slots=True)
class Syllable:
    """One syllable and where it stands, in quarter notes from the start."""

    onset: Fraction
    lyric: WrittenLyric


def syllables(events: Iterable[tuple[Fraction, bytes]]) -> list[Syllable]:
    """The syllables of one track's lyric events.

    Several events at one onset are verses 1, 2 and so on.
    """
    verses: defaultdict[int, list[tuple[Fraction, str]]] = defaultdict(list)
    at, verse = Fraction(-1), 0
    for onset, data in events:
        text = text_of(data)
        sung = bool(text.strip()) and not (text.startswith("{") and text.rstrip().endswith("}"))
        if sung:
            verse = verse + 1 if onset == at else 1
            at = onset
            verses[verse].append((onset, text))
        elif set(text) & set("\r\n") and verse and verses[verse]:
            before, last = verses[verse].pop()
            verses[verse].append((before, last + " "))
    return [syllable for number, texts in verses.items() for syllable in _words(str(number), texts)]


def _words(verse: str, texts: Sequence[tuple[Fraction, str]]) -> Iterator[Syllable]:
    continues = _continues([text for _, text in texts])
    inside = False
    for (onset, text), goes_on in zip(texts, continues, strict=True):
        syllabic = (("single", "begin"), ("end", "middle"))[inside][goes_on]
        plain = text.strip()
        bare = plain.rstrip("-") if goes_on else plain
        yield Syllable(onset, WrittenLyric(bare or plain, syllabic, verse))
        inside = goes_on


def _continues(texts: Sequence[str]) -> list[bool]:
    """Whether each syllable's word goes on in the next one."""
    hyphened = [text.rstrip().endswith("-") for text in texts]
    spaced = [text[-1].isspace() for text in texts]
    # Some programs write the space before a word.
    spaced_before = [*(text[0].isspace() for text in texts[1:]), True]
    if not any(spaced) and not any(spaced_before[:-1]):
        return [*hyphened[:-1], False]
    ends = [after or before for after, before in zip(spaced, spaced_before, strict=True)]
    goes_on = [hyphen or not end for hyphen, end in zip(hyphened, ends, strict=True)]
    return [*goes_on[:-1], False]


def note_under(onset: Fraction, onsets: Sequence[Fraction]) -> Fraction | None:
    """The onset of the note that bears a syllable: the nearest within `NEAR`, else None."""
    index = bisect_left(onsets, onset)
    near = [other for other in onsets[max(index - 1, 0) : index + 1] if abs(other - onset) <= NEAR]
    return min(near, key=lambda other: abs(other - onset), default=None)


def lyrics_of(
    raw: RawMidi, lines: Sequence[Line], ticks_per_quarter: Fraction
) -> tuple[dict[str, tuple[WrittenLyric, ...]], list[tuple[Fraction, str]]]:
    """The syllables of each note, by its `source`, and those that found none, with onsets.

    A track's lyrics belong to its own part; to the part whose notes they fit best, where the
    track has several parts or none. Of a chord, the highest note bears them.
    """
    placed: defaultdict[str, list[WrittenLyric]] = defaultdict(list)
    lost: list[tuple[Fraction, str]] = []
    for number, track in enumerate(raw.tracks):
        sung = syllables(
            (tick / ticks_per_quarter, event.data)
            for tick, event in track.events
            if isinstance(event, Meta) and event.type == MetaType.LYRIC
        )
        if not sung:
            continue
        own = [line for line in lines if line.stream.track == number] or lines
        under = max((_placed(sung, line) for line in own), key=lambda found: sum(map(bool, found)))
        for syllable, source in zip(sung, under, strict=True):
            taken = {lyric.verse for lyric in placed[source]} if source else set()
            if source and syllable.lyric.verse not in taken:
                placed[source].append(syllable.lyric)
            else:
                what = f"the syllable '{syllable.lyric.text}' belongs to no note; left out"
                lost.append((syllable.onset, what))
    return {source: tuple(found) for source, found in placed.items()}, lost


def _placed(sung: Sequence[Syllable], line: Line) -> list[str]:
    """The `source` of the note under each syllable; "" where there is none."""
    bearers: dict[Fraction, str] = {}
    for note in line.notes:
        bearers.setdefault(note.onset, note.source)
    onsets = sorted(bearers)
    found = (note_under(syllable.onset, onsets) for syllable in sung)
    return [bearers[onset] if onset is not None else "" for onset in found]
