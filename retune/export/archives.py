"""One archive for each section, to be sent to its singers."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from retune.adapters.disk import Archive
from retune.export.howto import NAME as HOW_TO_USE
from retune.export.names import safe_name
from retune.tracks.take import Take

_TRACKS = ("tracks/", "midi/")


def section_archives(takes: Sequence[Take], names: Sequence[str]) -> tuple[Archive, ...]:
    """An archive a section: its tracks, those that all share, and the text on how to use them.

    Sound goes in where there is any, else MIDI. `names` are those of the run's files.
    """
    return tuple(_archives(takes, names))


def _archives(takes: Sequence[Take], names: Sequence[str]) -> Iterator[Archive]:
    kind = next((kind for kind in _TRACKS if any(n.startswith(kind) for n in names)), None)
    if kind is None:
        return
    shared = [name for name in names if name.startswith(kind) and "/" not in name[len(kind) :]]
    stem = safe_name(takes[0].tuned.score.stem)
    for folder in dict.fromkeys(safe_name(take.folder) for take in takes if take.folder):
        own = [name for name in names if name.startswith(f"{kind}{folder}/")]
        inside = f"{folder} - {stem}"
        members = {name: f"{inside}/{name.rpartition('/')[2]}" for name in [*shared, *own]}
        if HOW_TO_USE in names:
            members[HOW_TO_USE] = f"{inside}/{HOW_TO_USE}"
        yield Archive(f"archives/{inside}.zip", members)
