"""Choosing bars by printed number or rehearsal letter."""

from __future__ import annotations

from retune.errors import WishError
from retune.score.model import Score


def _find(score: Score, label: str, after: int) -> int | None:
    """Index, as played, of the first bar from `after` on with a number or rehearsal mark."""
    wanted = label.strip().casefold()
    for bar in score.bars[after:]:
        if wanted in (bar.number.casefold(), bar.rehearsal.strip().casefold()):
            return bar.index
    return None


def _section_end(score: Score, start: int) -> int:
    """Index after the last bar before the next rehearsal mark."""
    return next((b.index for b in score.bars[start + 1 :] if b.rehearsal), len(score.bars))


def _unknown(score: Score, label: str) -> WishError:
    numbers = [bar.number for bar in score.bars]
    letters = ", ".join(dict.fromkeys(bar.rehearsal for bar in score.bars if bar.rehearsal))
    marks = f", rehearsal marks {letters}" if letters else ""
    return WishError(
        f"no bar or rehearsal mark '{label.strip()}'",
        hint=f"The score has bars {numbers[0]} to {numbers[-1]}{marks}",
    )


def bar_range(score: Score, wish: str) -> range:
    """Bars as played, from a wish like 17-24, 17, A-C or B; raises `WishError`.

    The first time through is meant where a bar is repeated. A letter alone is its section, up
    to the next letter; a range to a letter stops before that letter's bar.
    """
    first, dash, last = wish.partition("-")
    start = _find(score, first, 0)
    if start is None:
        raise _unknown(score, first)
    by_letter = score.bars[start].number.casefold() != first.strip().casefold()
    if not dash:
        return range(start, _section_end(score, start) if by_letter else start + 1)
    stop = _find(score, last, start)
    if stop is None:
        raise _unknown(score, last)
    to_letter = score.bars[stop].number.casefold() != last.strip().casefold()
    return range(start, stop if to_letter and stop > start else stop + 1)
