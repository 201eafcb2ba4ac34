"""The learning tracks of a piece: every take, with its lead-in, guide parts and levels.

All takes of a piece have the same lead-in and the same length, so that they line up. They share
their music: only the singer's own starting note differs from take to take.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from retune.errors import WishError
from retune.score.excerpt import bar_range
from retune.score.model import Part, Score
from retune.score.titles import part_titles
from retune.tracks import guides
from retune.tracks.leadin import OWN_SLOTS, LeadIn, beats_of, lead_in
from retune.tracks.mixes import Mixer
from retune.tracks.options import StartingNotes, TrackOptions
from retune.tracks.stitch import Silence, Stretch, stitched, whole
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.policy import Temperament

FULL_MIX = "Full mix"


def chosen_parts(score: Score, names: Sequence[str]) -> list[Part]:
    """The sung parts of these names, case ignored; all of them where none is named.

    Raises `WishError` for a name that no sung part has.
    """
    sung = guides.sung_parts(score)
    known = {part.name.casefold(): part for part in sung}
    for name in names:
        if name.strip().casefold() not in known:
            listed = ", ".join(part.name for part in sung)
            raise WishError(f"no sung part is called '{name}'", hint=f"There are {listed}")
    wanted = {name.strip().casefold() for name in names}
    return [part for part in sung if not wanted or part.name.casefold() in wanted]


def excerpt(tuned: TunedScore, bars: str) -> TunedScore:
    """Only these bars (see `bar_range`), tuned as they are within the piece; raises `WishError`."""
    wanted = bar_range(tuned.score, bars)
    return stitched([Stretch(tuned, wanted.start, wanted.stop)])


def learning_takes(
    tuned: TunedScore, options: TrackOptions, equal: TunedScore | None = None
) -> tuple[Take, ...]:
    """The full mix, the tracks of each chosen part in score order, and the comparison.

    Parameters
    ----------
    tuned : TunedScore
        The piece, or an excerpt of it.
    options : TrackOptions
    equal : TunedScore, optional
        The same music in equal temperament; needed for a comparison.

    Raises
    ------
    WishError
        A part or bars that the score does not have.
    """
    parts = chosen_parts(tuned.score, options.parts)
    takes = list(_takes(tuned, options, parts))
    if options.compare and equal is not None:
        takes.append(_comparison(tuned, equal, options))
    last = len(takes) - 1
    return tuple(replace(take, track=place, of=last) for place, take in enumerate(takes))


def _takes(tuned: TunedScore, options: TrackOptions, parts: Sequence[Part]) -> Iterator[Take]:
    base, suffix, names = _Base.of(tuned, options), _suffix(tuned), part_titles(tuned.score)
    played = base.with_own(None)
    yield Take(tuned, FULL_MIX + suffix, "", played, Mixer(played.score, options).full())
    for part in parts:
        name, played = names[part.index], base.with_own(part.index)
        mixer = Mixer(played.score, options)
        mixes = [
            ("predominant", mixer.predominant(part.index)),
            ("alone", mixer.alone(part.index)),
            ("missing", mixer.missing(part.index)),
        ]
        for what, strips in mixes:
            yield Take(tuned, f"{name} {what}{suffix}", name, played, strips)
        if options.sides:
            yield Take(
                tuned,
                f"{name} left, others right{suffix}",
                name,
                played,
                mixer.sides(part.index),
                sides=True,
            )


def _suffix(tuned: TunedScore) -> str:
    """What a track's name says of a temperament other than just."""
    temperament = tuned.policy.temperament
    return "" if temperament is Temperament.JUST else f" ({temperament})"


@dataclass(frozen=True)
class _Base:
    """What all takes share: the music after its lead-in, and all guides but the own note."""

    music: TunedScore
    tuned: TunedScore
    options: TrackOptions
    lead: LeadIn
    pitches: tuple[guides.Pitched, ...]

    @classmethod
    def of(cls, tuned: TunedScore, options: TrackOptions) -> _Base:
        pitches = _starting_pitches(tuned, options)
        chord = options.starting_notes is StartingNotes.CHORD
        slots = len(pitches) + (OWN_SLOTS if chord and pitches else 0)
        lead = lead_in(tuned.score, 0, slots, options.count_in)
        again = lead_in(tuned.score, 0, 0, options.count_in)
        stretches = [whole(tuned, lead.silence)]
        stretches += [whole(tuned, again.silence)] * (options.loops - 1)
        return cls(stitched(stretches), tuned, options, lead, pitches)

    def with_own(self, part: int | None) -> TunedScore:
        """All that sounds in the takes of a part; None for the full mix."""
        options, played = self.options, self.music
        if self.pitches:
            own = None
            if part is not None and options.starting_notes is StartingNotes.CHORD:
                own = guides.first_note(self.tuned, part)
            played = guides.starting_part(
                played, self.pitches, own, self.lead.slot, OWN_SLOTS, options.starting_sound
            )
        beats = list(self._beats())
        if beats:
            name = guides.CLICK if options.click else guides.COUNT_IN
            played = guides.click_part(played, name, beats, options.click_sound)
        if options.drone is not None:
            start = self.lead.counted_from
            played = guides.drone_part(played, options.drone, start, options.drone_sound)
        return played

    def _beats(self) -> Iterator[tuple[Fraction, bool]]:
        """Beats that click: in the count-ins, and through the music where that is wished."""
        for bar in self.music.score.bars:
            counted = not bar.number and bar.onset >= self.lead.counted_from
            if counted or (self.options.click and bar.number):
                for onset in beats_of(bar):
                    yield onset, onset == bar.onset and bar.begins == 0


def _starting_pitches(tuned: TunedScore, options: TrackOptions) -> tuple[guides.Pitched, ...]:
    if options.starting_notes is StartingNotes.NONE:
        return ()
    if options.starting_notes is StartingNotes.TONIC:
        return (guides.tonic_note(tuned),)
    return tuple(guides.first_chord(tuned))


def _comparison(tuned: TunedScore, equal: TunedScore, options: TrackOptions) -> Take:
    """A passage as it is tuned, a silent bar, and the same passage in equal temperament."""
    bars = bar_range(tuned.score, options.compare)
    first = tuned.score.bars[bars.start]
    pause = Silence((first.full_length,), lead_in(tuned.score, bars.start, 0, 1).silence.qpm)
    played = stitched(
        [
            Stretch(tuned, bars.start, bars.stop),
            Stretch(equal, bars.start, bars.stop, pause),
        ]
    )
    name = f"Just and equal, bars {options.compare.strip()}"
    return Take(tuned, name, "", played, Mixer(played.score, options).full())
