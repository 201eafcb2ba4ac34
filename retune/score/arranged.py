"""A score as the director has it: parts named and ordered, breaths, a title, notes to singers."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from retune.score.model import Score, SingerNote
from retune.score.names import read_name
from retune.score.naming import short_name


@dataclass(frozen=True, slots=True)
class Breath:
    """A breath before an onset, of the parts with these indices."""

    onset: Fraction
    parts: tuple[int, ...]


def with_parts(
    score: Score, names: Mapping[int, str], first: Sequence[int]
) -> tuple[Score, dict[int, int]]:
    """A score with new names for some parts, and some parts moved to the top in this order.

    Parameters
    ----------
    names : mapping of int to str
        New names by index.
    first : sequence of int
        Indices of parts; those not named follow in their order.

    Returns
    -------
    The score, and the new index of each part by its old one.
    """
    order = [*dict.fromkeys(first), *(p.index for p in score.parts if p.index not in set(first))]
    place = {old: new for new, old in enumerate(order)}
    if not names and not first:
        return score, place
    parts = []
    for old in order:
        part = replace(score.parts[old], index=place[old])
        if old in names:
            labels = read_name(names[old]).labels
            voice_type = part.voice_type or (labels[0].voice_type if labels else None)
            short = short_name(names[old])
            part = replace(part, name=names[old], abbreviation=short, voice_type=voice_type)
        parts.append(part)
    notes = [replace(note, part=place[note.part]) for note in score.notes]
    notes.sort(key=lambda note: (note.onset, note.part, note.pitch.key))
    return replace(score, parts=tuple(parts), notes=tuple(notes)), place


def with_breaths(score: Score, breaths: Sequence[Breath]) -> Score:
    """A score in which notes that end where a breath stands are marked so."""
    wanted = {(breath.onset, part) for breath in breaths for part in breath.parts}
    if not wanted:
        return score
    notes = tuple(
        replace(note, marks=note.marks | {"breath"}) if (note.end, note.part) in wanted else note
        for note in score.notes
    )
    return replace(score, notes=notes)


def with_words(score: Score, title: str | None, told: Sequence[SingerNote]) -> Score:
    """A score with another title, and with notes to singers in the order of their bars."""
    in_order = tuple(sorted(told, key=lambda one: (one.onset, one.parts)))
    return replace(score, title=title or score.title, singer_notes=in_order)
