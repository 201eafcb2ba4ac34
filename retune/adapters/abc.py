"""ABC files (standard 2.1) as written scores.

Some files hold the parts of one piece as tunes of one voice each, one after another under one
title. They are joined where second titles name the parts, or where they are equally long and
differ in clef. Variants of a tune, which share title and length too, stay apart.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import groupby, pairwise

from retune.adapters.abc_drafts import in_bars, written_bars
from retune.adapters.abc_tunes import Tune, TuneReader, Voice
from retune.errors import Finding, Weight
from retune.written import MarkKind, WrittenBar, WrittenPart, WrittenScore

_TUNE = re.compile(r"^X:", re.MULTILINE)
# What a part's own title begins with; "contra" takes in contratenor, "quint" the quinta pars.
_PART_NAME = re.compile(
    r"\s*(soprano|superius|supremus|cantus|discantus|treble|mezzo|alt|contra|tenor|bariton|bass|"
    r"basis|quint|sext|sept|oct|vagans|tiple|triplum|motetus|voice|vox|part)",
    re.IGNORECASE,
)
_SHARED_FIELD = re.compile(r"[MLQUC]:")


@dataclass(frozen=True)
class Piece:
    """One piece: a tune, or the tunes that are its parts."""

    tunes: tuple[Tune, ...]

    @property
    def title(self) -> str:
        """The title of its first tune."""
        return self.tunes[0].title

    def read(self) -> WrittenScore:
        """The piece with a part for each voice."""
        voices = [(tune, voice) for tune in self.tunes for voice in tune.voices]
        joined = len(self.tunes) > 1
        findings = [finding for tune in self.tunes for finding in tune.findings]
        if joined:
            what = f"{len(self.tunes)} tunes of one title were read as the parts of one piece"
            findings.insert(0, Finding(Weight.DOUBT, what))
        return WrittenScore(
            parts=tuple(
                _part(tune, voice, number, joined=joined)
                for number, (tune, voice) in enumerate(voices, start=1)
            ),
            title=self.title,
            composer=next((tune.composer for tune in self.tunes if tune.composer), ""),
            format="abc",
            findings=tuple(findings),
        )


def _part(tune: Tune, voice: Voice, number: int, *, joined: bool) -> WrittenPart:
    """One voice; letters over the staff of a part by itself are no chord symbols."""
    bars = written_bars(in_bars(voice.reader.bars), tune.shift(voice), number)
    part_title = tune.titles[1] if joined and len(tune.titles) > 1 else ""
    return WrittenPart(
        id=f"{number}",
        name=voice.name or part_title,
        abbreviation=voice.short,
        clefs=(voice.staff.clef,) if voice.staff.clef else (),
        bars=tuple(map(_without_symbols, bars)) if joined else bars,
    )


def _without_symbols(bar: WrittenBar) -> WrittenBar:
    marks = tuple(mark for mark in bar.marks if mark.kind is not MarkKind.CHORD_SYMBOL)
    return replace(bar, marks=marks)


def read_pieces(text: str) -> list[Piece]:
    """The pieces of an ABC file, in order; none where there is no tune with music."""
    starts = [match.start() for match in _TUNE.finditer(text)]
    if not starts:
        return []
    shared = [line for line in text[: starts[0]].splitlines() if _SHARED_FIELD.match(line)]
    tunes = [
        TuneReader().read([*shared, *text[start:end].splitlines()])
        for start, end in pairwise([*starts, len(text)])
    ]
    return list(_pieces([tune for tune in tunes if tune.voices]))


def _pieces(tunes: Sequence[Tune]) -> Iterator[Piece]:
    for _, run in groupby(tunes, key=lambda tune: (tune.title.casefold(), len(tune.voices) == 1)):
        together = tuple(run)
        if _are_parts(together):
            yield Piece(together)
        else:
            yield from (Piece((tune,)) for tune in together)


def _are_parts(tunes: Sequence[Tune]) -> bool:
    """Whether tunes of one title are the parts of one piece."""
    if len(tunes) < 2 or not tunes[0].title or any(len(tune.voices) > 1 for tune in tunes):
        return False
    named = all(any(map(_PART_NAME.match, tune.titles[1:])) for tune in tunes[1:])
    lengths = {tune.voices[0].length for tune in tunes}
    clefs = {tune.voices[0].staff.clef for tune in tunes}
    return named or (len(lengths) == 1 and len(clefs) > 1)
