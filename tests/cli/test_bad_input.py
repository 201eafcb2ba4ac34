"""Wrong usage is 2, bad input is 1, and neither leaves a trace on disk or a traceback."""

from __future__ import annotations

import errno
import io
import os
import signal
import subprocess
import sys
import time
import zipfile
from pathlib import Path

import pytest

from tests.cli.conftest import Run, tree

HEAD = '<?xml version="1.0" encoding="UTF-8"?>\n'
SCORE = HEAD + "<score-partwise version='4.0'>{}</score-partwise>"
PART_LIST = "<part-list><score-part id='P1'><part-name>S</part-name></score-part></part-list>"
LAUGHS = HEAD + (
    "<!DOCTYPE score-partwise [<!ENTITY a 'ha'>"
    + "".join(
        f"<!ENTITY {b} '{f'&{a};' * 10}'>" for a, b in zip("abcdefgh", "bcdefghi", strict=True)
    )
    + "]><score-partwise><work><work-title>&i;</work-title></work></score-partwise>"
)
EXTERNAL = HEAD + (
    "<!DOCTYPE score-partwise [<!ENTITY x SYSTEM 'file:///etc/passwd'>]>"
    "<score-partwise><work><work-title>&x;</work-title></work></score-partwise>"
)


def bar(*elements: str) -> str:
    return SCORE.format(
        PART_LIST + f"<part id='P1'><measure number='1'>{''.join(elements)}</measure></part>"
    )


NOTE = (
    "<note><pitch><step>C</step><octave>4</octave></pitch>"
    "<duration>{}</duration><voice>1</voice></note>"
)
ATTRIBUTES = "<attributes><divisions>{}</divisions></attributes>"


def zipped(name: str, data: bytes) -> bytes:
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr(
            "META-INF/container.xml",
            f"<container><rootfiles><rootfile full-path='{name}'/></rootfiles></container>",
        )
        archive.writestr(name, data)
    return buffer.getvalue()


BAD = {
    "empty.musicxml": b"",
    "spaces.musicxml": b"   \n",
    "words.musicxml": b"this is no score",
    "truncated.musicxml": bar(ATTRIBUTES.format(1), NOTE.format(4)).encode()[:150],
    "no-parts.musicxml": SCORE.format("").encode(),
    "no-bars.musicxml": SCORE.format(PART_LIST + "<part id='P1'/>").encode(),
    "no-notes.musicxml": bar(ATTRIBUTES.format(1)).encode(),
    "wrong-encoding.musicxml": HEAD.encode() + b"<score-partwise>\xff\xfe</score-partwise>",
    "laughs.musicxml": LAUGHS.encode(),
    "external.musicxml": EXTERNAL.encode(),
    "huge-number.musicxml": bar(ATTRIBUTES.format("1e999999999"), NOTE.format(4)).encode(),
    "long-number.musicxml": bar(ATTRIBUTES.format("9" * 5000), NOTE.format(4)).encode(),
    "zero-divisions.musicxml": bar(ATTRIBUTES.format(0), NOTE.format(4)).encode(),
    "not-a-zip.mxl": b"PK\x03\x04 broken",
    "bomb.mxl": zipped("a.musicxml", b" " * 300_000_000),
    "escape.mxl": zipped("../a.musicxml", b"<score-partwise/>"),
    "empty.mid": b"",
    "short.mid": b"MThd\x00\x00\x00\x06\x00\x01",
    "no-notes.mid": bytes.fromhex("4d54686400000006000000010060 4d54726b00000004 00ff2f00"),
    "unknown.xyz": b"\x00\x01\x02",
    "image.png": b"\x89PNG\r\n\x1a\n0000",
}  # fmt: skip


@pytest.mark.parametrize("name", BAD)
def test_bad_scores_end_in_one_clear_line(run: Run, name: str, tmp_path: Path) -> None:
    (tmp_path / name).write_bytes(BAD[name])
    done = run("make", tmp_path / name, "-o", tmp_path / "out", "--audio", "none")
    usable = name in ("huge-number.musicxml", "long-number.musicxml", "zero-divisions.musicxml")
    assert done.code == 1 or (usable and done.code == 0), done.err
    if done.code:
        assert done.err.startswith("Error: ")
        assert name in done.err
        assert not (tmp_path / "out").exists()
    assert "Traceback" not in done.err
    assert "inside retune" not in done.err


EXPORT = ("export", "{hymn}", "-o", "{out}", "--to", "midi", "--set")


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["show"], "Missing argument"),
        (["show", "{hymn}", "--drift", "sideways"], "sideways"),
        (["show", "{hymn}", "--drift-within", "10"], "--drift within"),
        (["show", "{hymn}", "--held-shift", "much"], "much"),
        (["show", "{hymn}", "--held-shift", "nan"], "nan"),
        (["show", "{hymn}", "--tonic", "H#"], "H#"),
        (["show", "{hymn}", "--reference", "4"], "--reference"),
        (["show", "{hymn}", "--bars", "900"], "900"),
        (["show", "{hymn}", "--tempo", "5"], "10 to 400"),
        (["show", "{hymn}", "--tempo", "allegro"], "80%"),
        (["show", "{hymn}", "--transpose", "99"], "24"),
        (["show", "{hymn}", "--accompaniment", "Banjo"], "Soprano"),
        (["show", "{hymn}", "--melody", "Sopran"], "Soprano"),
        (["export", "{hymn}", "--to", "mdi", "-o", "{out}"], "midi"),
        ([*EXPORT, "midi.chanels=one"], "channels"),
        ([*EXPORT, "midi.channels=blue"], "blue"),
        ([*EXPORT, "channels"], "channels"),
        ([*EXPORT, "scala.tables=2"], "scala"),
        (["export", "{hymn}", "--to", "notes", "-o", "-"], "one file"),
        (["make", "-"], "-o"),
        (["tracks", "-"], "-o"),
        (["tracks", "{hymn}", "-o", "{out}", "--part", "Sopran"], "Soprano"),
        (["tracks", "{hymn}", "-o", "{out}", "--drone", "H"], "tonic, root"),
        (["tracks", "{hymn}", "-o", "{out}", "--bars", "900"], "900"),
        (["tracks", "{hymn}", "-o", "{out}", "--compare", "Q"], "no bar"),
        (["tracks", "{hymn}", "-o", "{out}", "--vowel", "ah"], "neutral"),
        (["tracks", "{hymn}", "-o", "{out}", "--language", "germn"], "german"),
        (["tracks", "{hymn}", "-o", "{out}", "--audio", "aac"], "mp3"),
        (["tracks", "{hymn}", "-o", "{out}", "--audio", "none", "--vowel", "a"], "--vowel"),
        (["tracks", "{hymn}", "-o", "{out}", "--others", "3"], "--others"),
        (["tracks", "{hymn}", "-o", "{out}", "--count-in", "99"], "--count-in"),
        (["tracks", "{hymn}", "-o", "{out}", "--accompaniment-level", "loud"], "loud"),
        (["tracks", "{hymn}", "-o", "{out}", "--set", "audio.singers=99"], "singers"),
        (["tracks", "{hymn}", "-o", "{out}", "--set", "scala.tables=2"], "scala"),
        (["sing"], "sing"),
    ],
)  # fmt: skip
def test_wrong_usage_is_two(
    run: Run, hymn: Path, tmp_path: Path, arguments: list[str], words: str
) -> None:
    out = tmp_path / "out"
    done = run(*(a.format(hymn=hymn, out=out) for a in arguments))
    assert done.code == 2, done.err
    assert words in done.err
    assert "Traceback" not in done.err
    assert not out.exists()


def test_missing_file_names_it(run: Run, tmp_path: Path) -> None:
    done = run("show", tmp_path / "nothing.musicxml")
    assert done.code == 1
    assert "nothing.musicxml" in done.err


def test_folder_instead_of_score(run: Run, tmp_path: Path) -> None:
    assert run("show", tmp_path).code == 1


def test_limits_are_options(run: Run, hymn: Path, tmp_path: Path) -> None:
    for option in (["--max-notes", "10"], ["--max-minutes", "0.05"], ["--max-megabytes", "0.001"]):
        done = run("make", hymn, "-o", tmp_path / "out", *option)
        assert done.code == 1, option
        assert "limit" in done.err.lower() or "at most" in done.err.lower()
    assert not (tmp_path / "out").exists()


def test_file_in_the_way_of_the_folder(run: Run, hymn: Path, tmp_path: Path) -> None:
    (tmp_path / "out").write_text("a file")
    done = run("make", hymn, "-o", tmp_path / "out")
    assert done.code == 1
    assert (tmp_path / "out").read_text() == "a file"


def test_full_disk_leaves_nothing(
    run: Run, hymn: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(descriptor: int) -> None:
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    done = run("make", hymn, "-o", tmp_path / "out", "--audio", "none")
    assert done.code == 1
    assert "space" in done.err.lower()
    assert tree(tmp_path) == set()


@pytest.mark.parametrize("sign", [signal.SIGINT, signal.SIGTERM])
def test_interrupt_cleans_up(hymn: Path, tmp_path: Path, sign: signal.Signals) -> None:
    """The process is stopped in the middle of writing: files staged, none renamed."""
    script = (
        "import sys, time, pathlib\n"
        "def slow(self, target):\n"
        "    pathlib.Path(sys.argv[2]).touch()\n"
        "    time.sleep(30)\n"
        "pathlib.Path.rename = slow\n"
        "from retune.cli import main\n"
        "main(['make', sys.argv[1], '-o', sys.argv[3], '--audio', 'none'])\n"
    )
    ready, out = tmp_path / "ready", tmp_path / "out"
    process = subprocess.Popen(
        [sys.executable, "-c", script, str(hymn), str(ready), str(out)],
        stderr=subprocess.PIPE, text=True,
    )  # fmt: skip
    deadline = time.monotonic() + 60
    while not ready.exists() and time.monotonic() < deadline and process.poll() is None:
        time.sleep(0.05)
    process.send_signal(sign)
    _, err = process.communicate(timeout=60)
    assert process.returncode == 130, err
    assert "interrupted" in err
    assert tree(tmp_path) == {"ready"}


def test_closed_pipe_ends_quietly(hymn: Path) -> None:
    """As in `retune show hymn | head -1`."""
    process = subprocess.Popen(
        [sys.executable, "-m", "retune", "show", str(hymn)],
        stdout=subprocess.PIPE, stderr=subprocess.PIPE,
    )  # fmt: skip
    assert process.stdout is not None
    assert process.stderr is not None
    process.stdout.close()
    err = process.stderr.read().decode()
    process.wait(timeout=60)
    process.stderr.close()
    assert "Traceback" not in err
    assert "BrokenPipe" not in err
