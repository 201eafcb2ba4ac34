"""A choices file brought up to date with its score: places, sounds, names and roots."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from retune.choicesfile.anchor import Fit
from retune.choicesfile.direct import Directed
from retune.choicesfile.edit import EditedToml
from retune.choicesfile.partnames import melodies
from retune.choicesfile.places import Spot, now
from retune.score.model import Score
from retune.score.transpose import moved

_PITCHES = ("root", "pitch", "tonic")


@dataclass(frozen=True, slots=True)
class Updated:
    """The file's new text, and how many decisions were written anew."""

    text: str
    changed: int


def updated(plain: Score, wish: Directed) -> Updated:
    """The file with every decision where its music is now.

    Decisions whose music is gone stay as they are, to be settled by the director.

    Parameters
    ----------
    plain : Score
        The score as its file has it.
    wish : Directed
        What the choices make of it.
    """
    file = wish.survey.file
    edited = EditedToml(file.text)
    changed = 0
    for spot in wish.survey.spots:
        if spot.fit is not Fit.GONE:
            values = dict(_values(wish, spot))
            changed += bool(values)
            edited.set_values((spot.entry.table, spot.entry.index), values)
    tonic = file.section("tuning").get("tonic")
    if tonic is not None and wish.survey.moved.semitones:
        edited.set_values(("tuning",), {"tonic": moved(tonic, wish.survey.moved).name})
    _names(edited, plain, wish)
    return Updated(edited.text, changed)


def _values(wish: Directed, spot: Spot) -> Iterator[tuple[str, Any]]:
    """What of a decision is to be written anew."""
    entry = spot.entry
    if "at" in entry.values and spot.fit is Fit.MOVED and spot.first is not None:
        yield "at", spot.first.at
    if "bars" in entry.values and spot.fit is Fit.MOVED:
        yield "bars", now(spot).removeprefix("bars ")
    for key, moment in (("sounds", spot.first), ("ends", spot.last)):
        if moment is None or (key == "ends" and "-" not in entry.values["bars"]):
            continue
        before = entry.get(key)
        sounds = " | ".join(" ".join(p.name for p in one) or "-" for one in before or ())
        if sounds != moment.sounds:
            yield key, moment.sounds
    if wish.survey.moved.semitones:
        for key in _PITCHES:
            if key in entry.values:
                yield key, moved(entry.values[key], wish.survey.moved).name
    for key in ("part", "melody"):
        name = entry.get(key)
        if name in wish.names.renamed:
            yield key, wish.names.renamed[name]
    parts = entry.get("parts") or ()
    if any(name in wish.names.renamed for name in parts):
        yield "parts", [wish.names.renamed.get(name, name) for name in parts]


def _names(edited: EditedToml, plain: Score, wish: Directed) -> None:
    """Parts under the names they have now, with their first notes."""
    file, renamed = wish.survey.file, wish.names.renamed
    section = file.section("parts")
    for key in ("order", "accompaniment", "voices", "doubled"):
        names = section.get(key, ())
        if any(name in renamed for name in names):
            values = [renamed.get(name, name) for name in names]
            edited.set_values(("parts",), {key: values})
    if section.get("melody") in renamed:
        edited.set_values(("parts",), {"melody": renamed[section["melody"]]})
    new = section.get("names", {})
    if any(old in renamed for old in new):
        edited.set_table(("parts", "names"), {renamed.get(k, k): v for k, v in new.items()})
    lines = {n: " ".join(p.name for p in line) for n, line in melodies(plain).items() if line}
    edited.set_table(("parts", "begins"), lines)
