"""The one writer: all files of a run come to stand in the folder together, or none does.

Every file is staged in a hidden folder inside the target folder, flushed to the disk, read back
for its check, and only then renamed to its place. Whatever stops the run, an error, an
interrupt, a full disk, is undone: staged files, files placed already, folders made. A hidden
manifest lists what was written with its SHA-256; only a file that it lists, unchanged, is ever
replaced, or taken away where a numbered series has become shorter.
"""

from __future__ import annotations

import errno
import os
import secrets
import shutil
import stat
from collections.abc import Callable, Iterator, Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Protocol

from retune.adapters.archive import write_zip
from retune.adapters.filenames import check_names
from retune.adapters.manifest import MANIFEST_NAME, Manifest, digest_of, digest_of_file
from retune.errors import OutputError, Place

_STAGING = ".retune-staging-"
_FLUSHED_TOGETHER = 8
_MADE_TOGETHER = 4
"""Contents made at the same time at most, as each may take much memory."""
_NO_SPACE = "Free some space on the disk, or choose another folder"
_HINTS = {
    errno.ENOSPC: _NO_SPACE,
    errno.EDQUOT: _NO_SPACE,
    errno.EACCES: "Choose a folder you may write to",
    errno.EPERM: "Choose a folder you may write to",
    errno.EROFS: "Choose a folder on a disk that can be written",
    errno.ENAMETOOLONG: "Choose a folder with a shorter path",
    errno.ENOTDIR: "Choose another folder: a part of this path is a file",
    errno.EEXIST: "Choose another folder: this is a file",
}


class Writable(Protocol):
    """What the writer takes."""

    @property
    def name(self) -> str:
        """Relative to the folder, with / between folders."""

    @property
    def data(self) -> bytes:
        """The whole content."""

    @property
    def note(self) -> str:
        """One line for the user, or empty."""

    @property
    def series(self) -> str:
        """What numbered set the file belongs to, or empty."""

    @property
    def check(self) -> Callable[[bytes], str] | None:
        """Called with the bytes as read back; raises `OutputError`."""


@dataclass(frozen=True, slots=True)
class WrittenFile:
    """One file on disk: its size in bytes, its note, and what its check said."""

    name: str
    size: int
    note: str = ""
    checked: str = ""


@dataclass(frozen=True, slots=True)
class WriteReport:
    """What a run wrote, in the order given."""

    folder: Path
    written: tuple[WrittenFile, ...]


@dataclass(frozen=True, slots=True)
class Archive:
    """A zip archive of files of the same run: its name, and names in it by names of files."""

    name: str
    members: Mapping[str, str]


def write_all(
    files: Sequence[Writable],
    folder: Path,
    archives: Sequence[Archive] = (),
    progress: Callable[[str], None] | None = None,
) -> WriteReport:
    """Write all files into a folder, which is made where it does not exist.

    `progress` is called with the name of each file once its content is there. Contents are
    asked for once, from several threads, and not kept in memory.

    Raises
    ------
    OutputError
        A name that leads out of the folder or that some system refuses, two names that differ
        only in case, a file of the same name that is not the tool's own and unchanged, a folder
        that cannot be written, a full disk, or a file that fails its check. Nothing is left.
    """
    check_names([*(file.name for file in files), *(archive.name for archive in archives)])
    if not files:
        return WriteReport(folder, ())
    undo: _Undo = []
    try:
        return _write(files, folder, archives, undo, progress or (lambda _: None))
    except BaseException:
        _run_all(undo)
        raise


_Undo = list[Callable[[], object]]
"""What to do, last first, should the run fail."""


def _run_all(undo: _Undo) -> None:
    """Undo everything; an action that is interrupted runs again."""
    while undo:
        try:
            undo[-1]()
        except OSError:
            pass
        except KeyboardInterrupt:
            continue
        undo.pop()


def _write(
    files: Sequence[Writable],
    folder: Path,
    archives: Sequence[Archive],
    undo: _Undo,
    progress: Callable[[str], None],
) -> WriteReport:
    with _explained(folder):
        _make_folder(folder, undo)
        manifest = Manifest.load(folder / MANIFEST_NAME)
    names = [*(file.name for file in files), *(archive.name for archive in archives)]
    for name in names:
        _require_replaceable(folder, name, manifest)
    with _explained(folder):
        staging = folder / f"{_STAGING}{secrets.token_hex(8)}"
        undo.append(lambda: shutil.rmtree(staging, ignore_errors=True))
        staging.mkdir()
    staged = {name: staging / str(number) for number, name in enumerate(names)}
    digests = _stage_all(files, staged, folder, progress)
    for archive in archives:
        with _explained(folder / archive.name):
            members = {inner: staged[name] for name, inner in archive.members.items()}
            write_zip(staged[archive.name], members)
            digests[archive.name] = digest_of_file(staged[archive.name])
    _flush_all(staged, folder)
    written = [_read_back(file, staged[file.name], folder, digests[file.name]) for file in files]
    written += [
        WrittenFile(archive.name, staged[archive.name].stat().st_size) for archive in archives
    ]
    series = {file.name: file.series for file in files if file.series}
    stale = manifest.superseded(digests, set(series.values()))
    # Old and new digests both stand while files are renamed, so that even after a power cut
    # the next run knows every file as the tool's own.
    _save(manifest.with_both(digests, series), folder, staging, undo)
    for name, path in staged.items():
        with _explained(folder / name):
            _make_folder((folder / name).parent, undo)
            _place(path, folder / name, undo)
    gone = [name for name in stale if _take_away(name, folder, staging, manifest, undo)]
    _save(manifest.with_only(digests, series, gone), folder, staging, undo)
    # Undo is over: from here on the files stand, and an interrupt comes too late.
    undo.clear()
    shutil.rmtree(staging, ignore_errors=True)
    for place in {folder, *((folder / name).parent for name in staged)}:
        _flush_folder(place)
    return WriteReport(folder, tuple(written))


@contextmanager
def _explained(path: Path) -> Iterator[None]:
    """Turn what the system says into an `OutputError` about this path."""
    try:
        yield
    except OSError as error:
        reason = error.strerror or type(error).__name__
        hint = _HINTS.get(error.errno or 0, "Choose another folder")
        raise OutputError(f"cannot be written: {reason}", Place(str(path)), hint) from error


def _make_folder(folder: Path, undo: _Undo) -> None:
    """Make a folder and those above it; what exists already stays on failure."""
    missing = []
    place = folder
    while not place.exists() and place != place.parent:
        missing.append(place)
        place = place.parent
    for place in reversed(missing):
        undo.append(place.rmdir)
        try:
            place.mkdir()
        except OSError:
            undo.pop()
            raise
    if not folder.is_dir():
        raise NotADirectoryError(errno.ENOTDIR, os.strerror(errno.ENOTDIR))


def _require_replaceable(folder: Path, name: str, manifest: Manifest) -> None:
    """Nothing of that name, or a file of the tool's own that nobody has changed since."""
    with _explained(folder / name):
        for parent in [
            folder.joinpath(*name.split("/")[:n]) for n in range(1, name.count("/") + 1)
        ]:
            mode = _mode(parent)
            if mode is not None and not stat.S_ISDIR(mode):
                raise _refused(parent, "is in the way and is no folder")
        path = folder / name
        mode = _mode(path)
        if mode is None:
            return
        if not stat.S_ISREG(mode):
            raise _refused(path, "is in the way and is no plain file")
        known = manifest.digests.get(name, ())
        if not known:
            raise _refused(path, "exists already and was not written by retune")
        if digest_of_file(path) not in known:
            raise _refused(path, "was changed since retune wrote it")


def _mode(path: Path) -> int | None:
    """Type bits of what stands at a path, links not followed; None for nothing."""
    try:
        return path.lstat().st_mode
    except FileNotFoundError:
        return None


def _refused(path: Path, why: str) -> OutputError:
    return OutputError(
        f"{why}; it was left as it is", Place(str(path)), "Move it away, or choose another folder"
    )


def _stage_all(
    files: Sequence[Writable],
    staged: Mapping[str, Path],
    folder: Path,
    progress: Callable[[str], None],
) -> dict[str, str]:
    """Write every file where nobody looks; returns what each should hold, as digests."""

    def stage(file: Writable) -> str:
        data = file.data
        with _explained(folder / file.name):
            staged[file.name].write_bytes(data)
        return digest_of(data)

    digests: dict[str, str] = {}
    pool = ThreadPoolExecutor(min(os.cpu_count() or 1, _MADE_TOGETHER))
    try:
        for file, digest in zip(files, pool.map(stage, files), strict=True):
            digests[file.name] = digest
            progress(file.name)
    finally:
        # After a failure or an interrupt, what nobody waits for is not begun.
        pool.shutdown(wait=True, cancel_futures=True)
    return digests


def _flush_all(staged: Mapping[str, Path], folder: Path) -> None:
    """Flush all staged files to the disk."""

    def flush(name: str) -> None:
        with _explained(folder / name), staged[name].open("rb+") as stream:
            os.fsync(stream.fileno())

    # A disk flushes many small files together, if it is asked for them together.
    with ThreadPoolExecutor(_FLUSHED_TOGETHER) as pool:
        for _ in pool.map(flush, staged):
            pass


def _read_back(file: Writable, path: Path, folder: Path, digest: str) -> WrittenFile:
    """Compare a staged file with what it should hold, and let its check read it."""
    with _explained(folder / file.name):
        found = path.read_bytes()
    if digest_of(found) != digest:
        raise OutputError(
            "reads back otherwise than it was written",
            Place(str(folder / file.name)),
            "The disk may be failing; choose another one",
        )
    checked = file.check(found) if file.check is not None else ""
    return WrittenFile(file.name, len(found), file.note, checked)


def _place(staged: Path, target: Path, undo: _Undo) -> None:
    """Rename a staged file to its place; what it replaces comes back on failure."""
    if _mode(target) is None:
        undo.append(lambda: _remove(target, staged))
    else:
        kept = staged.with_name(f"{staged.name}.replaced")
        undo.append(lambda: _bring_back(kept, target))
        target.rename(kept)
    staged.rename(target)


def _remove(target: Path, staged: Path) -> None:
    """Take away a file placed by this run, which is so if it is staged no more."""
    if not staged.exists():
        target.unlink(missing_ok=True)


def _take_away(name: str, folder: Path, staging: Path, manifest: Manifest, undo: _Undo) -> bool:
    """Remove a file of an earlier run, unless somebody has changed it since; whether it is gone."""
    try:
        _require_replaceable(folder, name, manifest)
    except OutputError:
        return False
    path, kept = folder / name, staging / f"{digest_of(name.encode())}.gone"
    with _explained(path):
        if _mode(path) is not None:
            undo.append(lambda: _bring_back(kept, path))
            path.rename(kept)
    return True


def _bring_back(kept: Path, target: Path) -> None:
    if kept.exists():
        kept.replace(target)


def _save(manifest: Manifest, folder: Path, staging: Path, undo: _Undo) -> None:
    """Put the manifest in its place."""
    path = folder / MANIFEST_NAME
    with _explained(path):
        staged = staging / f"manifest-{len(undo)}"
        with staged.open("xb") as stream:
            stream.write(manifest.to_bytes())
            stream.flush()
            os.fsync(stream.fileno())
        _place(staged, path, undo)


def _flush_folder(folder: Path) -> None:
    """Make renames last through a power cut, where the system lets a folder be flushed."""
    try:
        handle = os.open(folder, os.O_RDONLY)
    except OSError:
        return
    try:
        os.fsync(handle)
    except OSError:
        pass
    finally:
        os.close(handle)
