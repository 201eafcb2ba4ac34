"""What sounds where in a score: the moments by which decisions find their place again.

Conventions
-----------
* A moment begins wherever a note of the voices begins, in bars where none does wherever one of
  the accompaniment does, and stands in a bar as written; of a bar that is repeated the first
  time through counts. Grace notes begin none.
* `here` holds the sounding pitches from the lowest up, each once; `before` and `after` those of
  the neighbouring moments, empty at the ends and in silence.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from retune.pitch import Pitch
from retune.score.model import Bar, PartKind, Score

Sounding = tuple[Pitch, ...]


@dataclass(frozen=True, slots=True)
class Moment:
    """A place in the score as written, and what sounds about it.

    `written` is the bar's number in the file from 0, `inside` the quarter notes from its start.
    """

    index: int
    written: int
    inside: Fraction
    bar: str
    beat: Fraction
    before: Sounding
    here: Sounding
    after: Sounding

    @property
    def at(self) -> str:
        """Bar and beat as a choices file has them."""
        return f"{self.bar}:{beat_text(self.beat)}"

    @property
    def sounds(self) -> str:
        """What sounds about it as a choices file has it."""
        return " | ".join(
            " ".join(pitch.name for pitch in one) or "-"
            for one in (self.before, self.here, self.after)
        )


def beat_text(beat: Fraction) -> str:
    """A beat as people write it: 2, 2.5, or 4/3 where no short decimal is exact.

    >>> beat_text(Fraction(5, 2)), beat_text(Fraction(4, 3))
    ('2.5', '4/3')
    """
    if 1000 % beat.denominator == 0:
        return f"{float(beat):g}"
    return str(beat)


def moments_of(score: Score) -> tuple[Moment, ...]:
    """All moments of a score in the order of its bars as written."""
    voices = {part.index for part in score.parts if part.kind is PartKind.VOICE}
    sung = [n for n in score.notes if not n.grace and n.part in voices]
    own = {score.bar_at(n.onset).index for n in sung}
    spans = [(n.onset, n.analysed_end, n.pitch) for n in sung]
    for note in score.notes:
        bar = score.bar_at(note.onset)
        if not note.grace and note.part not in voices and bar.index not in own:
            spans.append((note.onset, min(note.analysed_end, bar.end), note.pitch))
    onsets = sorted({onset for onset, _, _ in spans})
    sounding = _sounding(onsets, spans)
    silent: Sounding = ()
    around = [silent, *sounding, silent]
    first: dict[int, Bar] = {}
    for bar in score.bars:
        first.setdefault(bar.written, bar)
    found: list[Moment] = []
    for place, onset in enumerate(onsets):
        bar = score.bar_at(onset)
        if first[bar.written] is not bar:
            continue
        found.append(
            Moment(
                0,
                bar.written,
                onset - bar.onset,
                bar.number,
                score.beat_at(onset),
                *around[place : place + 3],
            )
        )
    found.sort(key=lambda one: (one.written, one.inside))
    return tuple(
        Moment(index, *(getattr(one, name) for name in Moment.__slots__[1:]))
        for index, one in enumerate(found)
    )


def _sounding(
    onsets: Sequence[Fraction], spans: Sequence[tuple[Fraction, Fraction, Pitch]]
) -> list[Sounding]:
    heard: list[dict[int, Pitch]] = [{} for _ in onsets]
    for onset, end, pitch in spans:
        place = bisect_right(onsets, onset) - 1
        while place < len(onsets) and onsets[place] < end:
            heard[place][pitch.key] = pitch
            place += 1
    return [tuple(one[key] for key in sorted(one)) for one in heard]


def moment_at(moments: Sequence[Moment], bar: str, beat: Fraction) -> Moment | None:
    """The moment that lasts at a printed bar and beat; None where there is no such bar.

    Of bars with one number the first counts. A beat before the bar's first note belongs to that.
    """
    own = [one for one in moments if one.bar.casefold() == bar.strip().casefold()]
    if not own:
        return None
    own = [one for one in own if one.written == own[0].written]
    return next((one for one in reversed(own) if one.beat <= beat), own[0])
