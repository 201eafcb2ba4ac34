"""Which line sings which note of a staff: voices and chords dealt out to its lines.

Conventions
-----------
* A staff holds one or more groups of singers (Soprano, Alto), top down; a group holds one or
  more lines (Soprano 1, Soprano 2), top down.
* Where there are fewer notes than lines, neighbours sing the same note; the top note of a
  chord goes to the first line.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache

from retune.score.staves import StaffBar, VoiceBar
from retune.written import WrittenNote

SHARE_OF_BARS = 4
"""A staff without a telling name holds as many groups as it has voices in one bar of four."""


@dataclass(frozen=True, slots=True)
class Owner:
    """Who sings from an onset on, where only one voice stands on the staff."""

    onset: Fraction
    groups: frozenset[int] | None
    """None for all."""
    solo: bool = False


@dataclass(frozen=True, slots=True)
class Deal:
    """A staff dealt out: for each line its notes bar by bar, and where doubt arose."""

    sizes: tuple[int, ...]
    """How many lines each group of singers has."""
    lines: tuple[tuple[tuple[WrittenNote, ...], ...], ...]
    shared: tuple[int, ...]
    """Bars in which one voice is sung by several groups by inference."""
    divided: tuple[tuple[int, ...], ...]
    """For each group the bars in which it is divided."""


def usual_voices(bars: Sequence[StaffBar]) -> int:
    """How many voices sound together on a staff in a good part of its bars; at least 1."""
    counts = Counter(sum(voice.sounding for voice in bar.voices) for bar in bars)
    counts.pop(0, None)
    total = sum(counts.values())
    reached = 0
    for voices, bars_with in sorted(counts.items(), reverse=True):
        reached += bars_with
        if reached * SHARE_OF_BARS >= total:
            return voices
    return 1


def deal(bars: Sequence[StaffBar], groups: int, owners: Sequence[Sequence[Owner]]) -> Deal:
    """Deal the notes of a staff out to its lines.

    Parameters
    ----------
    bars : sequence of StaffBar
    groups : int
        Groups of singers that the staff is for.
    owners : sequence of sequence of Owner
        For each bar who sings where one voice stands alone; the last entry before or at a note
        counts, empty for all.
    """
    needs = [_needs(bar, groups) for bar in bars]
    sizes = tuple(max([1, *column]) for column in zip(*needs, strict=True)) if bars else (1,)
    firsts = [sum(sizes[:group]) for group in range(groups)]
    places = tuple(
        tuple(range(first, first + size)) for first, size in zip(firsts, sizes, strict=True)
    )
    if sizes == (1,):
        return Deal(sizes, (tuple(map(_alone, bars)),), (), ((),))
    lines: list[list[tuple[WrittenNote, ...]]] = [[] for _ in range(sum(sizes))]
    shared = []
    for index, (bar, owner) in enumerate(zip(bars, owners, strict=True)):
        dealt: list[list[WrittenNote]] = [[] for _ in lines]
        for voice, its_places in _seats(bar.voices, places):
            _deal_voice(voice, its_places, owner if len(bar.voices) == 1 else (), dealt)
        for line, notes in zip(lines, dealt, strict=True):
            line.append(tuple(notes))
        if groups > 1 and (bar.borrowed or _is_shared(bar, groups, owner)):
            shared.append(index)
    divided = tuple(
        tuple(index for index, need in enumerate(needs) if need[group] > 1)
        for group in range(groups)
    )
    return Deal(sizes, tuple(map(tuple, lines)), tuple(shared), divided)


def _alone(bar: StaffBar) -> tuple[WrittenNote, ...]:
    """The notes of a bar in which there is but one line."""
    notes = [note for voice in bar.voices for note in voice.graces]
    notes.extend(chord[0] for voice in bar.voices for chord in voice.chords)
    return tuple(notes)


def _is_shared(bar: StaffBar, groups: int, owner: Sequence[Owner]) -> bool:
    if any(entry.groups is not None or entry.solo for entry in owner):
        return False
    return len(bar.voices) == 1 and any(len(chord) < groups for chord in bar.voices[0].chords)


@lru_cache(maxsize=1024)
def share(items: int, places: int) -> tuple[tuple[int, ...], ...]:
    """Deal items to places, both in order; few items are sung at several places.

    >>> share(2, 3)
    ((0,), (0,), (1,))
    >>> share(3, 2)
    ((0, 1), (2,))
    """
    if not items:
        return ((),) * places
    if items <= places:
        return tuple((place * items // places,) for place in range(places))
    return tuple(
        tuple(item for item in range(items) if item * places // items == place)
        for place in range(places)
    )


def _needs(bar: StaffBar, groups: int) -> list[int]:
    """How many lines each group needs in a bar."""
    needs = [0] * groups
    voices = _without_idle(bar.voices, groups)
    if len(voices) <= groups:
        dealt = share(len(voices), groups)
        for place, voice in enumerate(voices):
            its_groups = [group for group in range(groups) if place in dealt[group]]
            for chord in voice.chords:
                for group, notes in zip(
                    its_groups, share(len(chord), len(its_groups)), strict=True
                ):
                    needs[group] = max(needs[group], len(notes))
    else:
        for group, members in enumerate(share(len(voices), groups)):
            needs[group] = sum(voices[member].need for member in members)
    return needs


def _without_idle(voices: Sequence[VoiceBar], seats: int) -> list[VoiceBar]:
    """Voices without those that only rest, as far as there are more voices than seats."""
    spare = len(voices) - seats
    kept = []
    for voice in reversed(voices):
        if spare > 0 and not voice.sounding:
            spare -= 1
        else:
            kept.append(voice)
    return kept[::-1]


Seat = tuple[VoiceBar, tuple[tuple[int, ...], ...]]
"""A voice, and its lines group by group."""


def _seats(voices: Sequence[VoiceBar], places: Sequence[tuple[int, ...]]) -> list[Seat]:
    """The lines that each voice of a bar is sung by."""
    groups = len(places)
    seats = groups
    if groups == 1:
        # A printed rest in a divided group silences its lower lines, if it has lines to spare.
        spare = len(places[0]) - sum(max(voice.need - 1, 0) for voice in voices)
        seats = max(1, spare)
    kept = _without_idle(voices, seats)
    if len(kept) <= groups:
        dealt = share(len(kept), groups)
        return [
            (voice, tuple(places[group] for group in range(groups) if place in dealt[group]))
            for place, voice in enumerate(kept)
        ]
    return [
        seat
        for group, members in enumerate(share(len(kept), groups))
        for seat in _inside([kept[member] for member in members], places[group])
    ]


def _inside(voices: Sequence[VoiceBar], lines: tuple[int, ...]) -> list[Seat]:
    """Lines of one group dealt to its voices, by need; spare lines join the first voice."""
    wanted = [max(voice.need, 1) for voice in voices]
    wanted[0] += max(len(lines) - sum(wanted), 0)
    seats: list[Seat] = []
    first = 0
    for voice, number in zip(voices, wanted, strict=True):
        seats.append((voice, (lines[first : first + number],)))
        first += number
    return seats


def _deal_voice(
    voice: VoiceBar,
    groups: tuple[tuple[int, ...], ...],
    owners: Sequence[Owner],
    dealt: list[list[WrittenNote]],
) -> None:
    everyone = tuple(line for group in groups for line in group)
    heads: dict[Fraction, tuple[int, ...]] = {}
    if voice.graces:
        heads = {
            chord[0].onset: tuple(
                line for line, note in _singers(chord, groups, owners) if note is chord[0]
            )
            for chord in voice.chords
        }
    for grace in voice.graces:
        for line in heads.get(grace.onset, everyone):
            dealt[line].append(grace)
    for chord in voice.chords:
        for line, note in _singers(chord, groups, owners):
            dealt[line].append(note)


def _singers(
    chord: Sequence[WrittenNote], groups: tuple[tuple[int, ...], ...], owners: Sequence[Owner]
) -> Iterable[tuple[int, WrittenNote]]:
    """Each line that sings in a chord, with its note."""
    if owners:
        groups = _owned(chord[0].onset, groups, owners)
    for group, items in zip(groups, share(len(chord), len(groups)), strict=True):
        for line, places in zip(group, share(len(items), len(group)), strict=True):
            for place in places:
                yield line, chord[items[place]]


def _owned(
    onset: Fraction, groups: tuple[tuple[int, ...], ...], owners: Sequence[Owner]
) -> tuple[tuple[int, ...], ...]:
    """The lines that sing at an onset where singers are named."""
    owner = next((entry for entry in reversed(owners) if entry.onset <= onset), None)
    if owner is None:
        return groups
    chosen = groups
    if owner.groups is not None:
        chosen = tuple(lines for group, lines in enumerate(groups) if group in owner.groups)
    if owner.solo and chosen:
        chosen = (chosen[0][:1],)
    return chosen or groups
