"""One file written whole or not at all, in place of one that the user gave up to it."""

from __future__ import annotations

import contextlib
import os
import tempfile
from pathlib import Path

from retune.errors import OutputError, Place


def write_one(path: Path, data: bytes) -> None:
    """Write a file through a neighbour that takes its name when it is complete.

    A link is followed, so that what it leads to is replaced; permissions are kept.

    Raises `OutputError` where the folder or the file cannot be written; nothing is left then.
    """
    target = path.resolve()
    try:
        mode = target.stat().st_mode & 0o777 if target.exists() else None
        handle, name = tempfile.mkstemp(prefix=f".{target.name}.", dir=target.parent)
    except OSError as error:
        raise _refused(path, error) from None
    staged = Path(name)
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        staged.chmod(mode if mode is not None else 0o666 & ~_umask())
        staged.replace(target)
    except OSError as error:
        raise _refused(path, error) from None
    finally:
        with contextlib.suppress(FileNotFoundError):
            staged.unlink()


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


def _refused(path: Path, error: OSError) -> OutputError:
    what = f"cannot be written: {error.strerror}"
    return OutputError(what, Place(str(path)), "Check the folder and its permissions")
