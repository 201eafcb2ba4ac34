"""The whole way from the bytes of a file to a `WrittenScore`."""

from __future__ import annotations

import gc
from collections.abc import Iterator
from contextlib import contextmanager

from retune.adapters.xml import Element, read_document
from retune.errors import LimitError, UnreadableError
from retune.limits import Limits
from retune.score.musicxml.identity import Identities
from retune.score.musicxml.layout import read_layout
from retune.score.musicxml.log import Log
from retune.score.musicxml.octaves import settle_octaves
from retune.score.musicxml.part import PartReading, read_part
from retune.score.musicxml.titles import (
    read_composer,
    read_lyricist,
    read_rights,
    read_title,
)
from retune.written import WrittenScore


def read_musicxml(data: bytes, limits: Limits) -> WrittenScore:
    """Read a MusicXML score, plain or compressed, as it is written.

    Parameters
    ----------
    data : bytes
        A .musicxml, .xml or .mxl file, ordered by parts or by time, in any declared encoding.
    limits : Limits
        Largest size and number of notes; the playing time is for the playing order to check.

    Raises
    ------
    UnreadableError
        Not a score, damaged, encrypted, or without parts, bars or notes.
    LimitError
        Larger than `limits`.
    """
    with _no_collection():
        document = read_document(data, limits)
        return _read_score(document.root, Log(document.findings), limits)


def _read_score(root: Element, log: Log, limits: Limits) -> WrittenScore:
    identities = Identities()
    readings: list[PartReading] = []
    count = 0
    for source in read_layout(root, log):
        reading = read_part(source, identities, log)
        readings.append(reading)
        count += sum(len(bar.notes) for bar in reading.part.bars)
        if count > limits.max_notes:
            raise LimitError(
                f"the score has more than {limits.max_notes} notes",
                hint="Raise the note limit if the file is really a score",
            )
    if count == 0:
        raise UnreadableError(
            "the score has no notes that sound",
            hint="Check that the export holds the music, not only its layout",
        )
    return WrittenScore(
        parts=settle_octaves(readings, log),
        title=read_title(root),
        composer=read_composer(root),
        lyricist=read_lyricist(root),
        copyright=read_rights(root),
        format="musicxml",
        findings=log.findings(),
    )


@contextmanager
def _no_collection() -> Iterator[None]:
    """Spare the search for cycles while hundreds of thousands of values are made; none has any."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()
