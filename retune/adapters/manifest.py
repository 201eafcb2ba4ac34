"""The hidden list of what the writer wrote in a folder: names with their SHA-256 digests."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Collection, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from retune.errors import OutputError, Place

MANIFEST_NAME = ".retune-manifest.json"
_FORMAT = "retune-manifest"
_BLOCK = 1 << 20


def digest_of(data: bytes) -> str:
    """SHA-256 of bytes, in hexadecimal."""
    return hashlib.sha256(data).hexdigest()


def digest_of_file(path: Path) -> str:
    """SHA-256 of a file, in hexadecimal; raises `OSError`."""
    digest = hashlib.sha256()
    with path.open("rb") as file:
        while block := file.read(_BLOCK):
            digest.update(block)
    return digest.hexdigest()


@dataclass(frozen=True, slots=True)
class Manifest:
    """Digests by name; a name has two while a run replaces its file, else one.

    `series` names the series of each file that belongs to one, such as the numbered tables of
    a piece: of those, a later run may write fewer.
    """

    digests: Mapping[str, tuple[str, ...]]
    series: Mapping[str, str] = field(default_factory=dict)

    @classmethod
    def load(cls, path: Path) -> Manifest:
        """Read a manifest; none is an empty one.

        Raises
        ------
        OutputError
            The file is there and is no manifest.
        OSError
            It cannot be read.
        """
        if path.is_symlink():
            raise _not_ours(path)
        try:
            found = json.loads(path.read_bytes())
        except FileNotFoundError:
            return cls({})
        except (ValueError, RecursionError):
            raise _not_ours(path) from None
        if not _is_manifest(found):
            raise _not_ours(path)
        digests = {name: tuple(digests) for name, digests in found["files"].items()}
        return cls(digests, found.get("series", {}))

    def with_both(self, new: Mapping[str, str], series: Mapping[str, str]) -> Manifest:
        """Old and new digests side by side."""
        merged = {name: (*self.digests.get(name, ()), digest) for name, digest in new.items()}
        return Manifest({**self.digests, **merged}, {**self.series, **series})

    def with_only(
        self, new: Mapping[str, str], series: Mapping[str, str], gone: Collection[str]
    ) -> Manifest:
        """The new digests in place of the old, without the files that are gone."""
        digests = {**self.digests, **{name: (digest,) for name, digest in new.items()}}
        kept = {name: digests[name] for name in digests if name not in gone}
        every = {**{name: self.series[name] for name in self.series if name not in new}, **series}
        return Manifest(kept, {name: every[name] for name in every if name in kept})

    def superseded(self, new: Collection[str], series: Collection[str]) -> list[str]:
        """Files of these series that an earlier run wrote and this one does not."""
        return [name for name, one in self.series.items() if one in series and name not in new]

    def to_bytes(self) -> bytes:
        """The file's content."""
        files = {name: list(digests) for name, digests in sorted(self.digests.items())}
        series = dict(sorted(self.series.items()))
        document = {"format": _FORMAT, "version": 1, "files": files, "series": series}
        return json.dumps(document, indent=1, ensure_ascii=False).encode("utf-8") + b"\n"


def _is_manifest(found: Any) -> bool:
    if not isinstance(found, dict) or found.get("format") != _FORMAT:
        return False
    files, series = found.get("files"), found.get("series", {})
    if not isinstance(series, dict) or not all(isinstance(one, str) for one in series.values()):
        return False
    return isinstance(files, dict) and all(
        isinstance(digests, list) and all(isinstance(digest, str) for digest in digests)
        for digests in files.values()
    )


def _not_ours(path: Path) -> OutputError:
    return OutputError(
        "this list of the files written earlier cannot be understood",
        Place(str(path)),
        "Choose another folder, or delete it and the files written earlier",
    )
