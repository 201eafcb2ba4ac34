"""Compressed MusicXML (.mxl) written: a score put into an archive, new or the user's own.

Source: W3C, MusicXML 4.0, "Compressed .mxl files": the media type first and stored, then a
container file whose first rootfile is the score.
"""

from __future__ import annotations

import zipfile
from html import escape
from io import BytesIO

from retune.adapters.xml import ARCHIVE, CONTAINER, ZIP_FAULTS, score_in_archive
from retune.errors import OutputError
from retune.limits import Limits

_MEDIA_TYPE = b"application/vnd.recordare.musicxml"
_EPOCH = (1980, 1, 1, 0, 0, 0)
_PLAIN_FILE = 0o644 << 16


def is_compressed(data: bytes) -> bool:
    """Whether the bytes of a score are those of an archive."""
    return data.startswith(ARCHIVE)


def unpacked(data: bytes, limits: Limits) -> bytes:
    """The bytes of the score itself, compressed or not; raises as `read_document` does."""
    return score_in_archive(data, limits)[1] if is_compressed(data) else data


def repacked(archive: bytes, score: bytes, limits: Limits) -> bytes:
    """An archive with another score in the place of its own, all other files as they are.

    Raises `OutputError` where one of those cannot be unpacked.
    """
    name, _, _ = score_in_archive(archive, limits)
    made = BytesIO()
    with (
        zipfile.ZipFile(BytesIO(archive)) as source,
        zipfile.ZipFile(made, "w", zipfile.ZIP_DEFLATED) as target,
    ):
        _put(target, "mimetype", _MEDIA_TYPE, zipfile.ZIP_STORED)
        seen = {"mimetype"}
        room = limits.max_bytes
        for entry in source.infolist():
            if entry.filename in seen:
                continue
            seen.add(entry.filename)
            data = score if entry.filename == name else _read(source, entry, room)
            room -= len(data)
            _put(target, entry.filename, data, zipfile.ZIP_DEFLATED, entry)
        if CONTAINER not in seen:
            _put(target, CONTAINER, _container(name), zipfile.ZIP_DEFLATED)
    return made.getvalue()


def packed(name: str, score: bytes) -> bytes:
    """A new archive of one score; `name` is that of the file in it."""
    made = BytesIO()
    with zipfile.ZipFile(made, "w", zipfile.ZIP_DEFLATED) as target:
        _put(target, "mimetype", _MEDIA_TYPE, zipfile.ZIP_STORED)
        _put(target, CONTAINER, _container(name), zipfile.ZIP_DEFLATED)
        _put(target, name, score, zipfile.ZIP_DEFLATED)
    return made.getvalue()


def _read(source: zipfile.ZipFile, entry: zipfile.ZipInfo, room: int) -> bytes:
    try:
        with source.open(entry) as stream:
            data = stream.read(room + 1)
    except ZIP_FAULTS as fault:
        raise OutputError(
            f"'{entry.filename[:80]}' in the compressed score cannot be unpacked: {fault}",
            hint="Save the score uncompressed, as .musicxml",
        ) from None
    if len(data) > room:
        raise OutputError(f"the files beside the score hold more than {room} bytes")
    return data


def _put(
    target: zipfile.ZipFile,
    name: str,
    data: bytes,
    method: int,
    like: zipfile.ZipInfo | None = None,
) -> None:
    entry = zipfile.ZipInfo(name, _EPOCH if like is None else like.date_time)
    entry.external_attr = _PLAIN_FILE if like is None else like.external_attr
    entry.compress_type = method
    target.writestr(entry, data)


def _container(name: str) -> bytes:
    return (
        '<?xml version="1.0" encoding="UTF-8"?>\n<container><rootfiles><rootfile'
        f' full-path="{escape(name)}" media-type="application/vnd.recordare.musicxml+xml"/>'
        "</rootfiles></container>\n"
    ).encode()
