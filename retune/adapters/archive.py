"""Zip archives of files that lie on the disk already."""

from __future__ import annotations

import shutil
import zipfile
from collections.abc import Mapping
from pathlib import Path

_EPOCH = (1980, 1, 1, 0, 0, 0)
"""The earliest time a zip archive can state: equal contents make equal archives."""

_PLAIN_FILE = 0o644 << 16


def write_zip(target: Path, members: Mapping[str, Path]) -> None:
    """Write an archive of files by their names in it; names are UTF-8, with / between folders.

    Raises `OSError` where a file cannot be read or the archive not written.
    """
    with zipfile.ZipFile(target, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, path in members.items():
            entry = zipfile.ZipInfo(name, _EPOCH)
            entry.external_attr = _PLAIN_FILE
            entry.compress_type = zipfile.ZIP_DEFLATED
            with path.open("rb") as source, archive.open(entry, "w", force_zip64=False) as place:
                shutil.copyfileobj(source, place)
