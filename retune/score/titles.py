"""Names of parts that differ from each other, for tracks and files."""

from __future__ import annotations

from collections.abc import Iterable

from retune.score.model import Score


def part_titles(score: Score) -> tuple[str, ...]:
    """Every part's name, in score order; nameless parts are numbered."""
    return numbered(part.name or f"Part {part.index + 1}" for part in score.parts)


def numbered(names: Iterable[str]) -> tuple[str, ...]:
    """Names made different: the second "Alto" becomes "Alto 2".

    Names that differ only in case count as equal, as some systems take them so.

    >>> numbered(["Alto", "alto", "Bass"])
    ('Alto', 'alto 2', 'Bass')
    """
    found: list[str] = []
    taken: set[str] = set()
    for name in names:
        candidate, count = name, 1
        while candidate.casefold() in taken:
            count += 1
            candidate = f"{name} {count}"
        taken.add(candidate.casefold())
        found.append(candidate)
    return tuple(found)
