"""Rehearsal notes as lines of text for a given width: by part, each in order of its bars."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence

import click

from retune.cli.chordtable import beat_text
from retune.page.rehearsal import MOST_NOTES, RehearsalNote, concerning, hard_places, hardest
from retune.tracks.learning import chosen_parts
from retune.tuning.model import TunedScore

_PLACE = 10
_MOST_BARS = 6


def rehearsal_lines(
    tuned: TunedScore, columns: int, wanted: range | None = None, part: str | None = None
) -> Iterator[str]:
    """The places hardest to tune, in lines no wider than `columns`.

    Parameters
    ----------
    wanted : range, optional
        Only places in these bars, counted as played from 0.
    part : str, optional
        Only what this part must know; raises `WishError` where there is no such part.
    """
    places = [
        place
        for place in hard_places(tuned)
        if wanted is None or tuned.score.bar_at(place.onset).index in wanted
    ]
    if part is not None:
        places = list(concerning(places, chosen_parts(tuned.score, [part])[0].index))
    chosen = sorted(hardest(places, MOST_NOTES), key=lambda note: (note.parts, note.onset))
    yield from textwrap.wrap(_heading(len(chosen), len(places)), columns - 1)
    for parts in dict.fromkeys(note.parts for note in chosen):
        yield ""
        names = [tuned.score.parts[index].name or f"Part {index + 1}" for index in parts]
        yield click.style(f" {', '.join(names) or 'Everybody'}", bold=True)
        yield from _of_one(columns, [note for note in chosen if note.parts == parts])


def _heading(shown: int, of: int) -> str:
    if not shown:
        return "No place stands out as hard to tune."
    if shown == of:
        return "What is hard to tune, and what to listen for"
    return f"The {shown} places hardest to tune, of {of}, and what to listen for"


def _of_one(columns: int, notes: Sequence[RehearsalNote]) -> Iterator[str]:
    for note in notes:
        place = f"{note.bars[0]}:{beat_text(note.beat)}"
        for index, words in enumerate((note.text + also(note.bars), note.listen)):
            lines = textwrap.wrap(words, columns - _PLACE - 2)
            left = f"{place:>{_PLACE}}" if index == 0 else " " * _PLACE
            yield f"{left} {lines[0]}" if lines else left
            yield from (" " * (_PLACE + 1) + line for line in lines[1:])


def also(bars: Sequence[str]) -> str:
    """The other bars where the same is to be said.

    >>> also(("4",)), also(("4", "12")), also(("4", "12", "20"))
    ('', ' Also in bar 12.', ' Also in bars 12 and 20.')
    """
    others = list(bars[1:])
    if not others:
        return ""
    if len(others) > _MOST_BARS:
        others = [*others[:_MOST_BARS], f"{len(others) - _MOST_BARS} more"]
    named = ", ".join(others[:-1]) + " and " + others[-1] if len(others) > 1 else others[0]
    return f" Also in bar{'s' * (len(others) > 1)} {named}."
