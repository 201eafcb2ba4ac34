"""The hidden list of what the writer wrote in a folder: names with their SHA-256 digests."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass
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
    """Digests by name; a name has two while a run replaces its file, else one."""

    digests: Mapping[str, tuple[str, ...]]

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
        return cls({name: tuple(digests) for name, digests in found["files"].items()})

    def with_both(self, new: Mapping[str, str]) -> Manifest:
        """Old and new digests side by side."""
        merged = {name: (*self.digests.get(name, ()), digest) for name, digest in new.items()}
        return Manifest({**self.digests, **merged})

    def with_only(self, new: Mapping[str, str]) -> Manifest:
        """The new digests in place of the old."""
        return Manifest({**self.digests, **{name: (digest,) for name, digest in new.items()}})

    def to_bytes(self) -> bytes:
        """The file's content."""
        files = {name: list(digests) for name, digests in sorted(self.digests.items())}
        document = {"format": _FORMAT, "version": 1, "files": files}
        return json.dumps(document, indent=1, ensure_ascii=False).encode("utf-8") + b"\n"


def _is_manifest(found: Any) -> bool:
    if not isinstance(found, dict) or found.get("format") != _FORMAT:
        return False
    files = found.get("files")
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
