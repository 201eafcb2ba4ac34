"""What the user should know of a tuning: exceptions, tempered chords, held notes at their bound."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from retune.errors import Finding, Weight
from retune.harmony.model import Chord, Degree, Harmony
from retune.score.model import Score
from retune.tuning.alternatives import Options, is_exception
from retune.tuning.intervals import Floats
from retune.tuning.layout import Layout
from retune.tuning.ratios import DEGREES, Template

_BARS_NAMED = 12
_SEVENTH = DEGREES.index(Degree.SEVENTH)
_AT_BOUND = 0.005
"""Cents within which a held shift counts as being at its bound."""


def findings(
    score: Score,
    harmony: Harmony,
    layout: Layout,
    options: Options,
    chosen: Sequence[Template | None],
    x: Floats,
    caps: Floats,
) -> tuple[Finding, ...]:
    """All findings of a just tuning, in the order of the kinds above."""
    return (
        *_exceptions(score, harmony, layout, options, chosen),
        *_tempered(score, harmony, chosen),
        *_bound(score, harmony, layout, x, caps),
    )


def _exceptions(
    score: Score,
    harmony: Harmony,
    layout: Layout,
    options: Options,
    chosen: Sequence[Template | None],
) -> Iterator[Finding]:
    """Dominant sevenths and augmented sixths that are not 4:5:6:7 though limit 7 is in force."""
    for chord, choices, template in zip(harmony.chords, options, chosen, strict=True):
        if template is None or template.ratios is None or not is_exception(template, choices[0]):
            continue
        held = _held_note(layout, chord.index)
        why = ""
        if held is not None:
            note = score.notes[held]
            why = f", because {note.pitch} is held in {score.parts[note.part].name}"
        yield Finding(
            Weight.NOTE,
            f"the seventh of the {chord.quality} on {chord.root} is {template.ratios[_SEVENTH]}, "
            f"not 7/4{why}",
            score.place(chord.onset),
        )


def _held_note(layout: Layout, chord: int) -> int | None:
    """A note held into or out of a chord, best its seventh."""
    left, right = layout.held.T
    crossing = layout.chord[left] != layout.chord[right]
    inside = np.concatenate(
        (
            right[crossing & (layout.chord[right] == chord)],
            left[crossing & (layout.chord[left] == chord)],
        )
    )
    inside = inside[layout.tuned[inside]]
    sevenths = inside[layout.degree[inside] == _SEVENTH]
    best = sevenths if len(sevenths) else inside
    return int(layout.note[best[0]]) if len(best) else None


def _tempered(
    score: Score, harmony: Harmony, chosen: Sequence[Template | None]
) -> Iterator[Finding]:
    """One finding for each quality of chord that was tempered."""
    tempered: dict[str, list[Chord]] = {}
    for chord, template in zip(harmony.chords, chosen, strict=True):
        if template is not None and template.ratios is None and chord.quality is not None:
            tempered.setdefault(chord.quality.value, []).append(chord)
    for quality, chords in tempered.items():
        yield Finding(
            Weight.NOTE,
            f"tempered, without exact ratios: {len(chords)} {quality} "
            f"{'chord' if len(chords) == 1 else 'chords'} ({_bars(score, chords)})",
            score.place(chords[0].onset),
        )


def _bound(
    score: Score, harmony: Harmony, layout: Layout, x: Floats, caps: Floats
) -> Iterator[Finding]:
    """Held notes that move as far as they may; `caps` holds a value for each held link."""
    may = layout.tuned[layout.held[:, 0]] & (caps > 0.0)
    links, caps = layout.held[may], caps[may]
    moved = np.abs(x[links[:, 1]] - x[links[:, 0]])
    at = moved >= caps - _AT_BOUND
    for cap in np.unique(caps[at]).tolist():
        full = links[at & (caps == cap)]
        chords = [harmony.chords[int(layout.chord[piece])] for piece in full[:, 1]]
        chords.sort(key=lambda chord: chord.index)
        yield Finding(
            Weight.NOTE,
            f"{len(full)} held {'note moves' if len(full) == 1 else 'notes move'} by the full "
            f"{cap:g} cents ({_bars(score, chords)})",
            score.place(chords[0].onset),
        )


def _bars(score: Score, chords: Sequence[Chord]) -> str:
    numbers = list(dict.fromkeys(score.bar_at(chord.onset).number for chord in chords))
    named = ", ".join(numbers[:_BARS_NAMED])
    more = len(numbers) - _BARS_NAMED
    word = "bar" if len(numbers) == 1 else "bars"
    return f"{word} {named}" + (f" and {more} more" if more > 0 else "")
