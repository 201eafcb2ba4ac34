"""Whether the ratios that a director gave to single notes can be sung there."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace

from retune.choices import Choices, RatioChoice
from retune.choicesfile.model import ChoicesFile
from retune.errors import Finding, Weight
from retune.harmony.model import Harmony
from retune.score.model import Score
from retune.units import ratio_to_cents

FURTHEST = 60.0
"""Cents from the piano's own key; beyond, another note is meant."""


def fitting_ratios(
    score: Score, harmony: Harmony, choices: Choices, lines: Sequence[int], file: ChoicesFile
) -> tuple[Choices, tuple[Finding, ...]]:
    """The choices with those ratios alone that fit, and what to tell of the others."""
    kept, told = [], []
    for ratio, line in zip(choices.ratios, lines, strict=True):
        wrong = next(_wrong(score, harmony, ratio), "")
        if wrong:
            what = f"the ratio {ratio.ratio} was left out: {wrong}"
            told.append(Finding(Weight.LOSS, what, file.place(line)))
        else:
            kept.append(ratio)
    return replace(choices, ratios=tuple(kept)), tuple(told)


def _wrong(score: Score, harmony: Harmony, choice: RatioChoice) -> Iterator[str]:
    """Why a ratio cannot be sung; nothing where it can."""
    at = choice.onset
    sounding = [n for n in score.notes if n.analysed_onset <= at < n.analysed_end and not n.grace]
    own = [note for note in sounding if note.part == choice.part]
    name = score.parts[choice.part].name
    chord = next((one for one in reversed(harmony.chords) if one.onset <= at), None)
    if not own:
        yield f"{name} sings nothing there"
    elif not score.parts[choice.part].tuned:
        yield f"the pitch of {name} cannot move"
    elif chord is None or chord.root is None:
        yield "no chord sounds there"
    elif len({note.pitch.key % 12 for note in sounding}) < 2:
        yield f"{name} sounds alone there"
    else:
        for note in own:
            steps = (note.pitch.key - chord.root.chroma) % 12
            off = (ratio_to_cents(choice.ratio) - 100.0 * steps + 600.0) % 1200.0 - 600.0
            if abs(off) > FURTHEST:
                yield (
                    f"{note.pitch} in {name} is {steps} semitones above {chord.root}, and that "
                    f"ratio lies {abs(off):.0f} cents away"
                )
