"""What every kind of MIDI file says alike: levels and places of parts, programs, remarks, names."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from retune.export.midi_conductor import slowest_tempo_lost
from retune.export.midi_tracks import CENTRE, pan, volume
from retune.export.names import safe_name
from retune.export.ticks import Ticks
from retune.score.model import Part, Score
from retune.tracks.take import Strip, Take

VOICE_OOHS = 53
"""General MIDI program of sung parts, counting from 0. Its neighbour 52, choir aahs, is up to
42 cents out of tune in a common sound font, which no just third outlives."""

_PAN_WIDTH = 16
"""Voices stand this far to either side at most: enough to tell them apart."""


def strips_of(take: Take) -> dict[int, Strip]:
    """How each part that sounds stands in the mix, by part."""
    found = {part.index: take.strip(part.index) for part in take.played.score.parts}
    return {index: strip for index, strip in found.items() if strip is not None}


def mix_of(score: Score, strips: Mapping[int, Strip]) -> dict[int, tuple[int, int]]:
    """Volume and pan of each part as MIDI has them."""
    plain = all(strip == Strip() for strip in strips.values())
    pans = dict(enumerate(_pans(score))) if plain else {}
    return {
        index: (volume(strip.gain_db), pans.get(index, pan(strip.pan)))
        for index, strip in strips.items()
    }


def program_of(part: Part, voices: int) -> int:
    """The file's own program for instruments; singers get one that is in tune."""
    return voices if part.tuned or part.program is None else part.program


def remarks(score: Score, ticks: Ticks) -> Iterator[str]:
    """What the file states less exactly than the score does."""
    if ticks.error:
        microseconds = 1e6 * float(ticks.error) * 60.0 / float(score.tempo.changes[0].qpm)
        yield f"onsets within {microseconds:.0f} microseconds, as no MIDI division holds them all"
    if slowest_tempo_lost(score):
        yield "a tempo under 3.6 quarter notes a minute is written as 3.6, the slowest there is"


def file_name(folder: str, take: Take) -> str:
    """Where a take goes: an exporter's folder, the take's own, its name and that of the piece."""
    folders = [folder, *([safe_name(take.folder)] if take.folder else [])]
    stem = safe_name(take.tuned.score.stem)
    return "/".join([*folders, f"{safe_name(take.name)} - {stem}.mid"])


def _pans(score: Score) -> list[int]:
    """Voices from left to right in score order, accompaniment in the middle."""
    voices = [part.index for part in score.parts if part.tuned]
    pans = [CENTRE] * len(score.parts)
    if len(voices) > 1:
        for place, index in enumerate(voices):
            pans[index] = CENTRE - _PAN_WIDTH + 2 * _PAN_WIDTH * place // (len(voices) - 1)
    return pans
