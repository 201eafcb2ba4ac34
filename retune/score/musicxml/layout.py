"""The shape of a MusicXML document: its parts, each with its bars in order."""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass
from typing import TypeAlias

from retune.adapters.xml import Element
from retune.errors import LimitError, Place, UnreadableError, Weight
from retune.score.musicxml.identity import Identities
from retune.score.musicxml.log import Log
from retune.score.musicxml.partlist import Heading, identity_of, read_part_list

MAX_BARS = 500_000
"""Bars over all parts; each costs memory even where it is empty."""

_EXPORT = "Export the score as MusicXML from the notation program"


@dataclass(frozen=True, slots=True)
class BarSource:
    """One bar of one part: `frame` bears number and kind of the bar, `body` its contents.

    They are one element in a score ordered by parts, two in a score ordered by time.
    """

    frame: Element
    body: Element


@dataclass(frozen=True, slots=True)
class PartSource:
    """One part of the file: its entry in the part list, if any, and its bars."""

    heading: Heading
    bars: tuple[BarSource, ...]


def read_layout(root: Element, log: Log) -> tuple[PartSource, ...]:
    """The parts of a score in the order of its part list.

    Raises `UnreadableError` for a document that is no score, has no part or no bar.
    """
    if root.tag == "score-partwise":
        music = _by_part(root)
    elif root.tag == "score-timewise":
        music = _by_time(root)
    else:
        raise _not_a_score(str(root.tag))
    if not music:
        raise UnreadableError("the score has no parts", hint=_EXPORT)
    _check_bars(sum(len(bars) for _, bars in music))
    if not any(bars for _, bars in music):
        raise UnreadableError("the score has no bars", hint=_EXPORT)
    return _headed(music, read_part_list(root.find("part-list")), log)


def noteheads(root: Element) -> tuple[tuple[str, Element], ...]:
    """Every note element of a score with the name that its `WrittenNote.source` bears."""
    identities = Identities()
    return tuple(
        (identities.name(note, part.heading.id, bar_index, index), note)
        for part in read_layout(root, Log())
        for bar_index, bar in enumerate(part.bars)
        for index, note in enumerate(bar.body.iterchildren("note"))
    )


def _not_a_score(tag: str) -> UnreadableError:
    if tag == "opus":
        return UnreadableError(
            "the file is a collection of scores (opus), not one score",
            hint="Give one of the scores it lists",
        )
    return UnreadableError(
        f"the file is XML but no MusicXML score: it starts with <{tag[:40]}>,"
        " not <score-partwise> or <score-timewise>",
        hint=_EXPORT,
    )


_Music: TypeAlias = list[tuple[str, tuple[BarSource, ...]]]


def _by_part(root: Element) -> _Music:
    return [
        (
            identity_of(part),
            tuple(BarSource(bar, bar) for bar in part.iterchildren("measure")),
        )
        for part in root.iterchildren("part")
    ]


def _by_time(root: Element) -> _Music:
    """Bars sorted into parts; the nth nameless part of a bar is one part throughout.

    A part that a bar leaves out has an empty bar there: the frame, which holds no music itself.
    """
    frames = [
        (
            frame,
            {
                identity_of(body) or f"#{index + 1}": body
                for index, body in enumerate(frame.iterchildren("part"))
            },
        )
        for frame in root.iterchildren("measure")
    ]
    names = dict.fromkeys(name for _, bodies in frames for name in bodies)
    _check_bars(len(names) * len(frames))
    return [
        (name, tuple(BarSource(frame, bodies.get(name, frame)) for frame, bodies in frames))
        for name in names
    ]


def _check_bars(count: int) -> None:
    if count > MAX_BARS:
        raise LimitError(
            f"the score has more than {MAX_BARS} bars, counted over all its parts",
            hint="Split it into movements",
        )


def _headed(music: _Music, headings: list[Heading], log: Log) -> tuple[PartSource, ...]:
    """Join music and part list by id, nameless music to unclaimed entries in order."""
    listed = {heading.id: heading for heading in reversed(headings)}
    present = {name for name, _ in music}
    unclaimed = deque(heading for heading in headings if heading.id not in present)
    order = {heading.id: index for index, heading in enumerate(headings)}
    found: list[tuple[int, PartSource]] = []
    taken: set[str] = set()
    for index, (name, bars) in enumerate(music):
        if name in listed:
            heading = listed[name]
        elif (not name or name.startswith("#")) and unclaimed:
            heading = unclaimed.popleft()
        else:
            heading = Heading(name or f"#{index + 1}", f"Part {index + 1}")
            log.add(Weight.DOUBT, "the part is not in the part list", Place(part=heading.name))
        place = order.get(heading.id, len(headings))
        if heading.id in taken:
            log.add(Weight.DOUBT, "two parts have one id in the file", Place(part=heading.name))
        while heading.id in taken:
            heading = heading.again(index + 1)
        taken.add(heading.id)
        found.append((place, PartSource(heading, bars)))
    for heading in unclaimed:
        log.add(Weight.LOSS, "the part is listed but has no music", Place(part=heading.name))
    found.sort(key=lambda entry: entry[0])
    return tuple(part for _, part in found)
