"""The writer: all or nothing, and never over what is not the tool's own."""

from __future__ import annotations

import errno
import json
import os
import signal
import subprocess
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from retune.adapters import disk
from retune.adapters.disk import write_all
from retune.adapters.manifest import MANIFEST_NAME
from retune.errors import OutputError


@dataclass(frozen=True)
class Output:
    name: str
    data: bytes = b"new"
    note: str = ""
    check: Callable[[bytes], str] | None = None
    series: str = ""


def contents(folder: Path) -> dict[str, bytes]:
    """Everything below a folder but the manifest."""
    return {
        str(path.relative_to(folder)): path.read_bytes()
        for path in folder.rglob("*")
        if path.is_file() and path.name != MANIFEST_NAME
    }


def everything(folder: Path) -> list[str]:
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*"))


def test_files_are_written_checked_and_reported(tmp_path: Path) -> None:
    files = [Output("a.txt", b"one", "said", lambda data: f"read {data.decode()}"), Output("b/c")]
    report = write_all(files, tmp_path / "out" / "deep")
    assert contents(tmp_path / "out" / "deep") == {"a.txt": b"one", "b/c": b"new"}
    assert [(one.name, one.note, one.checked) for one in report.written] == [
        ("a.txt", "said", "read one"),
        ("b/c", "", ""),
    ]


def test_nothing_but_the_files_and_the_manifest_stays(tmp_path: Path) -> None:
    write_all([Output("a"), Output("b/c")], tmp_path)
    assert everything(tmp_path) == [MANIFEST_NAME, "a", "b", "b/c"]


def test_own_files_are_replaced_and_others_of_the_tool_kept(tmp_path: Path) -> None:
    write_all([Output("a", b"1"), Output("b", b"1")], tmp_path)
    write_all([Output("a", b"2")], tmp_path)
    write_all([Output("a", b"3"), Output("b", b"3")], tmp_path)
    assert contents(tmp_path) == {"a": b"3", "b": b"3"}


def test_a_shorter_series_takes_the_longer_ones_rest_away(tmp_path: Path) -> None:
    write_all([Output(f"hymn {n}", series="hymn") for n in "1234"], tmp_path)
    write_all([Output("song 1", series="song"), Output("hymn 5")], tmp_path)
    (tmp_path / "hymn 4").write_bytes(b"mine now")
    write_all([Output(f"hymn {n}", b"newer", series="hymn") for n in "12"], tmp_path)
    assert contents(tmp_path) == {
        "hymn 1": b"newer",
        "hymn 2": b"newer",
        "hymn 4": b"mine now",
        "hymn 5": b"new",
        "song 1": b"new",
    }


def test_the_manifest_holds_sha256_digests(tmp_path: Path) -> None:
    write_all([Output("a", b"abc")], tmp_path)
    found = json.loads((tmp_path / MANIFEST_NAME).read_text())
    # FIPS 180-2, appendix B.1: the digest of "abc".
    digest = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    assert found["files"] == {"a": [digest]}


def test_a_foreign_file_is_refused_by_name_and_left(tmp_path: Path) -> None:
    (tmp_path / "b").write_bytes(b"mine")
    with pytest.raises(OutputError, match=r"b: exists already and was not written by retune"):
        write_all([Output("a"), Output("b")], tmp_path)
    assert everything(tmp_path) == ["b"]
    assert contents(tmp_path) == {"b": b"mine"}


def test_a_file_the_user_changed_is_refused(tmp_path: Path) -> None:
    write_all([Output("a", b"1")], tmp_path)
    (tmp_path / "a").write_bytes(b"edited")
    with pytest.raises(OutputError, match="changed since retune wrote it"):
        write_all([Output("a", b"2")], tmp_path)
    assert contents(tmp_path) == {"a": b"edited"}


def test_a_file_the_user_deleted_is_written_again(tmp_path: Path) -> None:
    write_all([Output("a", b"1")], tmp_path)
    (tmp_path / "a").unlink()
    write_all([Output("a", b"2")], tmp_path)
    assert contents(tmp_path) == {"a": b"2"}


@pytest.mark.parametrize("text", ["{", "[]", '{"format": "other"}', "[" * 100_000])
def test_a_manifest_of_someone_else_is_not_overwritten(tmp_path: Path, text: str) -> None:
    (tmp_path / MANIFEST_NAME).write_text(text)
    with pytest.raises(OutputError, match="cannot be understood"):
        write_all([Output("a")], tmp_path)
    assert (tmp_path / MANIFEST_NAME).read_text() == text
    assert everything(tmp_path) == [MANIFEST_NAME]


@pytest.mark.parametrize(
    "name",
    [
        "../a",
        "/etc/a",
        "a/../../b",
        "a//b",
        "",
        ".",
        "a/",
        "C:a",
        "a\\b",
        "nul.txt",
        "dir/COM1",
        "a.",
        "a ",
        "a\nb",
        "a\0b",
        "a*b",
        ".retune-manifest.json",
        "x" * 300,
        "bad\udcff",
    ],
)
def test_unsafe_names_are_refused(tmp_path: Path, name: str) -> None:
    with pytest.raises(OutputError, match="the output name"):
        write_all([Output("good"), Output(name)], tmp_path)
    assert everything(tmp_path) == []


@pytest.mark.parametrize(
    "names",
    [("a", "a"), ("a", "A"), ("d/a", "D/A"), ("\u00e9", "e\u0301"), ("a", "a/b"), ("A/b", "a")],
)
def test_names_that_collide_on_some_system_are_refused(
    tmp_path: Path, names: tuple[str, str]
) -> None:
    with pytest.raises(OutputError, match="would be"):
        write_all([Output(name) for name in names], tmp_path)
    assert everything(tmp_path) == []


def test_no_path_leads_out_through_a_link(tmp_path: Path) -> None:
    outside, folder = tmp_path / "outside", tmp_path / "out"
    outside.mkdir()
    folder.mkdir()
    (folder / "midi").symlink_to(outside)
    with pytest.raises(OutputError, match="in the way"):
        write_all([Output("midi/a.mid")], folder)
    assert everything(outside) == []


def test_a_link_is_not_written_through(tmp_path: Path) -> None:
    outside, folder = tmp_path / "precious", tmp_path / "out"
    outside.write_bytes(b"mine")
    folder.mkdir()
    (folder / "a").symlink_to(outside)
    with pytest.raises(OutputError, match="no plain file"):
        write_all([Output("a")], folder)
    assert outside.read_bytes() == b"mine"


def test_a_folder_reached_by_a_link_of_the_user_is_fine(tmp_path: Path) -> None:
    (tmp_path / "real").mkdir()
    (tmp_path / "link").symlink_to(tmp_path / "real")
    write_all([Output("a")], tmp_path / "link")
    assert contents(tmp_path / "real") == {"a": b"new"}


def test_the_target_is_a_file(tmp_path: Path) -> None:
    (tmp_path / "out").write_bytes(b"mine")
    for folder in (tmp_path / "out", tmp_path / "out" / "below"):
        with pytest.raises(OutputError, match="Choose another folder"):
            write_all([Output("a")], folder)
    assert (tmp_path / "out").read_bytes() == b"mine"


def test_a_file_where_a_folder_should_be(tmp_path: Path) -> None:
    (tmp_path / "midi").write_bytes(b"mine")
    with pytest.raises(OutputError, match="is no folder"):
        write_all([Output("midi/a.mid")], tmp_path)
    assert contents(tmp_path) == {"midi": b"mine"}


def test_a_failed_check_leaves_nothing(tmp_path: Path) -> None:
    def fails(data: bytes) -> str:
        raise OutputError("reads back wrong")

    with pytest.raises(OutputError, match="reads back wrong"):
        write_all([Output("a"), Output("b/c", check=fails)], tmp_path / "x" / "y")
    assert everything(tmp_path) == []


@pytest.mark.skipif(os.geteuid() == 0, reason="root may write everywhere")
def test_an_unwritable_folder_by_its_rights(tmp_path: Path) -> None:
    tmp_path.chmod(0o500)
    with pytest.raises(OutputError, match="may write to"):
        write_all([Output("a")], tmp_path / "out")


@pytest.mark.parametrize(
    ("code", "hint"),
    [(errno.EACCES, "may write to"), (errno.EROFS, "can be written"), (errno.ENOSPC, "space")],
)
def test_a_folder_that_cannot_be_made(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, code: int, hint: str
) -> None:
    def refuse(self: Path, mode: int = 0o777, *, parents: bool = False, exist_ok: bool = False):
        raise OSError(code, os.strerror(code))

    with monkeypatch.context() as patch:
        patch.setattr(Path, "mkdir", refuse)
        with pytest.raises(OutputError, match=hint):
            write_all([Output("a")], tmp_path / "out")
    assert everything(tmp_path) == []


def fail_at(call: int, real: Callable[..., object], error: BaseException) -> Callable[..., object]:
    """A function that raises at its n-th call, and works as usual before and after."""
    calls = 0

    def acting(*args: object, **kwargs: object) -> object:
        nonlocal calls
        calls += 1
        if calls == call:
            raise error
        return real(*args, **kwargs)

    return acting


STEPS = [
    *((Path, "write_bytes", call) for call in (1, 2)),
    *((disk.os, "fsync", call) for call in (1, 2, 3, 4)),
    *((Path, "read_bytes", call) for call in (1, 2, 3)),
    *((Path, "rename", call) for call in range(1, 9)),
    *((Path, "mkdir", call) for call in (1, 2)),
]


@pytest.mark.parametrize(
    "error", [OSError(errno.ENOSPC, "No space left on device"), KeyboardInterrupt()], ids=type
)
@pytest.mark.parametrize(("owner", "method", "call"), STEPS)
def test_whatever_step_fails_all_is_as_it_was(
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    owner: object,
    method: str,
    call: int,
    error: BaseException,
) -> None:
    write_all([Output("a", b"old", series="s"), Output("c", b"old", series="s")], tmp_path)
    before, manifest = everything(tmp_path), (tmp_path / MANIFEST_NAME).read_bytes()
    expected = KeyboardInterrupt if isinstance(error, KeyboardInterrupt) else OutputError
    with monkeypatch.context() as patch:
        patch.setattr(owner, method, fail_at(call, getattr(owner, method), error))
        with pytest.raises(expected):
            write_all([Output("a", b"new", series="s"), Output("new/b", b"new")], tmp_path)
    assert everything(tmp_path) == before
    assert contents(tmp_path) == {"a": b"old", "c": b"old"}
    assert (tmp_path / MANIFEST_NAME).read_bytes() == manifest
    write_all([Output("a", b"again")], tmp_path)


def test_a_full_disk_is_told_with_the_file_and_a_way_out(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    full = OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
    monkeypatch.setattr(Path, "write_bytes", fail_at(1, Path.write_bytes, full))
    with pytest.raises(OutputError, match=r"a\.mid: cannot be written: No space.*Free some space"):
        write_all([Output("a.mid")], tmp_path / "out")
    assert everything(tmp_path) == []


def test_data_that_a_failing_disk_mangles_are_noticed(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    real = Path.write_bytes
    monkeypatch.setattr(Path, "write_bytes", lambda self, data: real(self, data[:-1]))
    with pytest.raises(OutputError, match="reads back otherwise"):
        write_all([Output("a")], tmp_path / "out")
    assert everything(tmp_path) == []


SLOW_WRITER = """
import signal, sys, time
from pathlib import Path
sys.path.insert(0, {here!r})
from tests.adapters.test_disk import Output
from retune.adapters.disk import write_all

def interrupt(number, frame):
    raise KeyboardInterrupt

def check(data):
    print("checking", flush=True)
    time.sleep(30)
    return ""

signal.signal(signal.SIGTERM, interrupt)
write_all([Output("a"), Output("b/c", check=check)], Path(sys.argv[1]))
"""


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_a_signal_leaves_nothing(tmp_path: Path, number: signal.Signals) -> None:
    script = SLOW_WRITER.format(here=str(Path(__file__).parents[2]))
    process = subprocess.Popen(
        [sys.executable, "-c", script, str(tmp_path / "out")],
        stdout=subprocess.PIPE,
        stderr=subprocess.DEVNULL,
    )
    assert process.stdout is not None
    with process.stdout:
        assert process.stdout.readline() == b"checking\n"
        process.send_signal(number)
        process.wait(20)
    assert everything(tmp_path) == []


def test_no_files_touch_nothing(tmp_path: Path) -> None:
    assert write_all([], tmp_path / "out").written == ()
    assert everything(tmp_path) == []
