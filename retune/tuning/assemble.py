"""From tuned pieces to tuned notes: segments, ratios, roots, grace notes.

Conventions
-----------
* Cents are deviations from equal temperament of each note's key; a chord's root cents are those
  of its root's key.
"""

from __future__ import annotations

from bisect import bisect_right
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from retune.harmony.model import Harmony, Role
from retune.pitch import PitchClass
from retune.score.model import Note, Score
from retune.tuning.fixed import CentsOf
from retune.tuning.ground import Ground
from retune.tuning.intervals import Flags, Floats
from retune.tuning.layout import Layout
from retune.tuning.model import Segment, TunedNote
from retune.tuning.ratios import just_intervals
from retune.tuning.targets import Targets
from retune.units import ratio_to_cents

_EQUAL = 1e-6
"""Cents; neighbouring pieces of one chord closer than this are one segment."""


def root_cents(
    layout: Layout, harmony: Harmony, targets: Targets, x: Floats, scale: CentsOf
) -> tuple[float | None, ...]:
    """Tuned cents of each chord's root; None where nothing sounds.

    The mean of the voices that sing it, else what the other chord tones say of it, else of
    another part that sounds it, else its place in the home `scale`, as far from there as the
    voices that sing alone are.
    """
    count = len(harmony.chords)
    scale_roots = np.array([scale(c.root) if c.root else 0.0 for c in harmony.chords])
    sung = targets.tone & layout.tuned
    above, alone = x - targets.just, x - targets.place + scale_roots[layout.chord]
    found = scale_roots
    # From the last resort to the best witness.
    for chosen, values in (
        (layout.tuned, alone),
        (layout.degree == 0, x),
        (sung, above),
        (sung & (layout.degree == 0), above),
    ):
        mean = _chord_means(layout, chosen, values, count)
        found = np.where(np.isnan(mean), found, mean)
    return tuple(
        None if chord.root is None else float(cents)
        for chord, cents in zip(harmony.chords, found, strict=True)
    )


def _chord_means(layout: Layout, chosen: Flags, values: Floats, count: int) -> Floats:
    """Mean of the chosen pieces' values in each chord by length; nan where there is none."""
    weight = np.where(chosen, layout.length, 0.0)
    total = np.bincount(layout.chord, weight, minlength=count)
    summed = np.bincount(layout.chord, weight * values, minlength=count)
    means: Floats = np.divide(summed, total, out=np.full(count, np.nan), where=total > 0.0)
    return means


@dataclass(frozen=True)
class Assembler:
    """Turns placed pieces into tuned notes.

    `just` says whether ratios are told: not for a temperament.
    """

    score: Score
    harmony: Harmony
    layout: Layout
    targets: Targets
    x: Floats
    roots: tuple[float | None, ...]
    ground: Ground
    just: bool

    def notes(self, scale: CentsOf, unmoving: CentsOf) -> tuple[TunedNote, ...]:
        """All notes, in the score's order.

        `scale` tunes a grace note where no chord sounds, `unmoving` those of parts that cannot
        move.
        """
        pieces: list[list[int]] = [[] for _ in self.score.notes]
        for piece, note in enumerate(self.layout.note.tolist()):
            pieces[note].append(piece)
        onsets = [chord.onset for chord in self.harmony.chords]
        return tuple(
            TunedNote(
                note, self._segments(note, own) or (self._grace(note, onsets, scale, unmoving),)
            )
            for note, own in zip(self.score.notes, pieces, strict=True)
        )

    def _segments(self, note: Note, pieces: list[int]) -> tuple[Segment, ...]:
        """One segment for each run of pieces of one chord and pitch; none for a grace note."""
        if not pieces:
            return ()
        chords, cents = self.layout.chord, self.x
        heads = [
            piece
            for before, piece in zip([-1, *pieces], pieces, strict=False)
            if before < 0
            or chords[before] != chords[piece]
            or abs(cents[before] - cents[piece]) > _EQUAL
        ]
        if len(heads) == 1:
            return (self._segment(heads[0], note.onset, note.duration),)
        slices, first = self.harmony.slices, self.layout.first
        # In played-in music a slice may begin before the note does.
        later = (max(slices[first[piece]].onset, note.onset) for piece in heads[1:])
        onsets = [note.onset, *later]
        ends = [*onsets[1:], note.end]
        # Grace notes that follow may have taken the last pieces' time.
        return tuple(
            self._segment(piece, onset, min(end, note.end) - onset)
            for piece, onset, end in zip(heads, onsets, ends, strict=True)
            if onset < min(end, note.end)
        )

    def _segment(self, piece: int, onset: Fraction, duration: Fraction) -> Segment:
        fragment = self.harmony.fragments[self.layout.fragment[piece]]
        return Segment(
            onset,
            duration,
            fragment.chord,
            fragment.role,
            self._ratio(piece),
            float(self.x[piece]),
        )

    def _ratio(self, piece: int) -> Fraction | None:
        layout, chord = self.layout, int(self.layout.chord[piece])
        template, root = self.targets.templates[chord], self.roots[chord]
        if not self.just or layout.lone[piece] or not layout.tuned[piece]:
            return None
        if self.targets.decided[piece]:
            return self.ground.ratios[piece]
        if template is None or template.ratios is None or root is None:
            return None
        if layout.degree[piece] >= 0:
            return template.ratios[int(layout.degree[piece])]
        spelled = int(layout.fifths[piece]) - self._root(chord).fifths
        return _nearest_ratio(spelled, float(self.x[piece]) - root, int(self.ground.limit[chord]))

    def _root(self, chord: int) -> PitchClass:
        root = self.harmony.chords[chord].root
        assert root is not None
        return root

    def _grace(
        self, note: Note, onsets: list[Fraction], scale: CentsOf, unmoving: CentsOf
    ) -> Segment:
        """A grace note, tuned to the chord it leads to."""
        tuned = self.score.parts[note.part].tuned
        chord = max(bisect_right(onsets, note.end) - 1, 0)
        ratio, cents = None, (scale if tuned else unmoving)(note.pitch.pitch_class)
        root = self.roots[chord] if self.roots else None
        if root is not None and self.just and tuned:
            ratio, cents = self._graced(chord, root, note.pitch.pitch_class)
        return Segment(note.onset, note.duration, chord, Role.OTHER, ratio, cents)

    def _graced(self, chord: int, root: float, pitch: PitchClass) -> tuple[Fraction | None, float]:
        spelled = pitch.fifths - self._root(chord).fifths
        template = self.targets.templates[chord]
        if template is not None and spelled in template.spelled:
            degree = template.spelled.index(spelled)
            ratio = template.ratios[degree] if template.ratios else None
            return ratio, root + template.cents[degree]
        ratio = just_intervals(spelled, int(self.ground.limit[chord]))[0]
        return ratio, root + _off_equal(ratio, spelled)


def _off_equal(ratio: Fraction, fifths: int) -> float:
    """A ratio's distance from equal temperament, given its spelling; -600 to 600."""
    return (ratio_to_cents(ratio) - 100.0 * (7 * fifths % 12) + 600.0) % 1200.0 - 600.0


def _nearest_ratio(fifths: int, cents: float, limit: int) -> Fraction:
    """The just size of a spelled interval nearest to its distance from equal temperament."""
    return min(
        just_intervals(fifths, limit), key=lambda ratio: abs(_off_equal(ratio, fifths) - cents)
    )
