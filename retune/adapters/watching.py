"""Files watched for saves, through watchfiles.

What the system tells of a folder only wakes this up; a file counts as saved where its identity,
size or time of change is another than before. So nothing is missed that happens while nobody
waits, on a disk that tells nothing, or where an editor puts a new file in the place of the old.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from pathlib import Path

from retune.errors import Place, UnreadableError

_QUIET_MS = 200
"""A save is over when nothing has happened for so long."""

_LONGEST_MS = 2000
"""So long at most are changes gathered, should they not end."""

_LOOK_MS = 1000
"""Files are looked at so often, whatever the system tells."""

Stamp = tuple[int, int, int] | None


def saves(files: Sequence[Path]) -> Iterator[None]:
    """Yield at once, and from then on after each save of one of these files.

    Saves in quick succession, and those while the caller is busy, are one. A file that vanishes
    or comes back was saved too. Folders of the files must exist.

    Raises
    ------
    UnreadableError
        A folder cannot be watched.
    KeyboardInterrupt
        The watching is interrupted.
    """
    import watchfiles

    names = {file.name for file in files}
    folders = list(dict.fromkeys(file.absolute().parent for file in files))
    known = [_stamp(file) for file in files]
    yield
    try:
        for _ in watchfiles.watch(
            *folders,
            watch_filter=lambda change, path: Path(path).name in names,
            debounce=_LONGEST_MS,
            step=_QUIET_MS,
            rust_timeout=_LOOK_MS,
            yield_on_timeout=True,
            recursive=False,
        ):
            stamps = [_stamp(file) for file in files]
            if stamps != known:
                known = stamps
                yield
    except OSError as error:
        raise UnreadableError(
            f"cannot be watched: {error}",
            Place(", ".join(map(str, folders))),
            "Run retune make again after each save instead",
        ) from error


def _stamp(file: Path) -> Stamp:
    """Which file this is and what it was like; None where there is none."""
    try:
        found = file.stat()
    except OSError:
        return None
    return found.st_ino, found.st_size, found.st_mtime_ns
