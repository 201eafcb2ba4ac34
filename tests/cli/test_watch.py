"""Watching a score: made again at each save, whatever editors do to the file meanwhile."""

from __future__ import annotations

import json
import re
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from queue import Empty, Queue
from threading import Thread

import pytest

from retune.adapters.disk import WriteReport
from retune.adapters.watching import saves
from retune.errors import OutputError, UnreadableError, WishError
from retune.watch import watch, watched_files
from tests.cli.conftest import FIXTURES, Run, tree

NOTE = (
    "<note><pitch><step>{}</step><octave>4</octave></pitch><duration>4</duration>"
    "<voice>1</voice><type>whole</type></note>"
)
PART = (
    "<part id='{0}'><measure number='1'><attributes><divisions>1</divisions>"
    "<time><beats>4</beats><beat-type>4</beat-type></time></attributes>{1}</measure></part>"
)


def score(upper: str) -> str:
    """Two voices and one chord: the upper note over C4."""
    names = "".join(
        f"<score-part id='{name}'><part-name>{name}</part-name></score-part>" for name in "SA"
    )
    parts = PART.format("S", NOTE.format(upper)) + PART.format("A", NOTE.format("C"))
    return (
        '<?xml version="1.0" encoding="UTF-8"?>\n<score-partwise version="4.0">'
        f"<part-list>{names}</part-list>{parts}</score-partwise>"
    )


class Watching:
    """The real process, and what it says line by line."""

    def __init__(self, *arguments: object) -> None:
        command = [sys.executable, "-m", "retune", "watch", *map(str, arguments)]
        self.process = subprocess.Popen(command, stderr=subprocess.PIPE, text=True)
        self.lines: Queue[str] = Queue()
        self.reader = Thread(target=self._read, daemon=True)
        self.reader.start()

    def __enter__(self) -> Watching:
        return self

    def __exit__(self, *exception: object) -> None:
        self.process.kill()
        self.process.wait()
        self.reader.join()

    def _read(self) -> None:
        assert self.process.stderr is not None
        for line in self.process.stderr:
            self.lines.put(line.rstrip("\n"))
        self.process.stderr.close()

    def says(self, pattern: str) -> None:
        """The next line matches."""
        try:
            line = self.lines.get(timeout=20)
        except Empty:
            pytest.fail(f"nothing was said, where {pattern} was expected")
        assert re.fullmatch(pattern, line), line

    def end(self, sign: signal.Signals) -> tuple[int, list[str]]:
        """Exit code, and the lines that nobody waited for."""
        self.process.send_signal(sign)
        code = self.process.wait(timeout=60)
        self.reader.join()
        return code, list(self.lines.queue)


DONE = r"\d\d:\d\d:\d\d  \d+ files to {} in \d+\.\d s"
WAITS = r"\d\d:\d\d:\d\d  {}: {}; waiting for the next save"


def upper_pitch(folder: Path) -> str:
    notes = json.loads((folder / "notes" / "duet.notes.json").read_text("utf-8"))["notes"]
    return next(note["pitch"] for note in notes if note["part"] == 0)


def test_again_at_each_save(tmp_path: Path) -> None:
    path, out = tmp_path / "duet.musicxml", tmp_path / "out"
    # Half saved to begin with.
    path.write_text(score("E")[:200])
    with Watching(path, "-o", out, "--audio", "none", "--set", "page.widths=no") as watching:
        done = DONE.format(re.escape(str(out)))
        watching.says(rf"Watching {re.escape(str(path))}; Ctrl-C ends it")
        watching.says(WAITS.format(r".*duet\.musicxml", ".*XML.*"))
        assert not out.exists()
        # Saved in place.
        path.write_text(score("E"))
        watching.says(done)
        assert upper_pitch(out) == "E4"
        # Replaced by another file, as many editors do.
        (tmp_path / "duet.tmp").write_text(score("G"))
        (tmp_path / "duet.tmp").replace(path)
        watching.says(done)
        assert upper_pitch(out) == "G4"
        # Gone for a while.
        path.unlink()
        watching.says(WAITS.format(r".*duet\.musicxml", "there is no such file"))
        assert upper_pitch(out) == "G4"
        path.write_text(score("A"))
        watching.says(done)
        assert upper_pitch(out) == "A4"
        # Its choices.
        (tmp_path / "duet.choices.toml").write_text("")
        watching.says(done)
        # A burst of saves is one; other files are none.
        for upper in "CDEFG":
            path.write_text(score(upper))
            (tmp_path / "other.musicxml").write_text(score(upper))
            time.sleep(0.02)
        watching.says(done)
        assert upper_pitch(out) == "G4"
        code, rest = watching.end(signal.SIGINT)
        assert (code, rest) == (0, [])
        assert not [name for name in tree(out) if "staging" in name]


@pytest.mark.parametrize("sign", [signal.SIGINT, signal.SIGTERM])
def test_interrupted_in_the_middle_of_a_run(tmp_path: Path, sign: signal.Signals) -> None:
    """The process is stopped while it writes: files staged, none renamed."""
    script = (
        "import sys, time, pathlib\n"
        "def slow(self, target):\n"
        "    pathlib.Path(sys.argv[2]).touch()\n"
        "    time.sleep(30)\n"
        "pathlib.Path.rename = slow\n"
        "from retune.cli import main\n"
        "main(['watch', sys.argv[1], '-o', sys.argv[3], '--audio', 'none', '--part', 'Alto'])\n"
    )
    path, ready, out = tmp_path / "duet.musicxml", tmp_path / "ready", tmp_path / "out"
    path.write_text(score("E"))
    process = subprocess.Popen(
        [sys.executable, "-c", script, str(path), str(ready), str(out)],
        stderr=subprocess.PIPE,
        text=True,
    )
    deadline = time.monotonic() + 60
    while not ready.exists() and time.monotonic() < deadline and process.poll() is None:
        time.sleep(0.02)
    process.send_signal(sign)
    _, err = process.communicate(timeout=60)
    assert process.returncode == 130, err
    assert err.splitlines()[-1] == "Error: interrupted; nothing was written"
    assert tree(tmp_path) == {"duet.musicxml", "ready"}


def test_a_save_while_nobody_waits_is_not_missed(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    watched = saves([path])
    next(watched)
    path.write_text("made while the first run goes on")
    next(watched)
    path.write_text("and again, while the second does")
    next(watched)
    path.unlink()
    next(watched)
    watched.close()


def test_a_folder_that_cannot_be_watched_is_an_error(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(*folders: object, **wishes: object) -> Iterator[set[object]]:
        raise OSError("OS file watch limit reached")

    monkeypatch.setattr("watchfiles.watch", full)
    watched = saves([tmp_path / "a.txt"])
    next(watched)
    with pytest.raises(UnreadableError, match="cannot be watched: OS file watch limit"):
        next(watched)


Script = list[Callable[[], object]]


@pytest.fixture
def scripted(monkeypatch: pytest.MonkeyPatch) -> Callable[[Script], list[Path]]:
    """Saves that happen as a test says; returns the list of what is watched."""

    def script(steps: Script) -> list[Path]:
        watched: list[Path] = []

        def told(files: Sequence[Path]) -> Iterator[None]:
            watched.extend(files)
            yield
            for step in steps:
                step()
                yield
            raise KeyboardInterrupt

        monkeypatch.setattr("retune.watch.saves", told)
        return watched

    return script


def test_a_table_given_by_option_is_read_again(
    run: Run, scripted: Callable[[Script], list[Path]], tmp_path: Path
) -> None:
    table, out = tmp_path / "organ.scl", tmp_path / "out"
    # Equal but for the D, the second degree.
    degrees = [f"{100 * degree}." for degree in range(1, 13)]
    table.write_text("\n".join(["organ", "12", *degrees]))
    seen: list[float] = []

    def look() -> None:
        path = out / "notes" / "lamp-night.notes.json"
        rows = json.loads(path.read_text("utf-8"))
        pianos = {p["index"] for p in rows["parts"] if not p["tuned"]}
        segments = [s for n in rows["notes"] if n["part"] in pianos for s in n["segments"]]
        seen.append(max(abs(segment["cents"]) for segment in segments))

    def retuned() -> None:
        look()
        table.write_text("\n".join(["organ", "12", "100.", "231.", *degrees[2:]]))

    watched = scripted([retuned, look])
    done = run(
        "watch", FIXTURES / "lamp-night.musicxml", "-o", out, "--audio", "none",
        "--accompaniment-tuning", table, "--set", "page.part_pages=no", "--set", "scala.tables=1",
        "--set", "page.widths=no", "--set", "page.part_lines=no", "--part", "Alto",
    )  # fmt: skip
    assert done.code == 0, done.err
    assert table in watched
    assert seen[0] == pytest.approx(0.0, abs=1e-6)
    assert seen[1] > 20.0


def test_what_ends_the_first_run_is_only_told_later(
    scripted: Callable[[Script], list[Path]], tmp_path: Path
) -> None:
    scripted([])
    for wrong in (WishError("no such part"), KeyError("a")):
        with pytest.raises(type(wrong)):
            next(watch([], _raising(wrong)))
    assert isinstance(next(watch([], _raising(OutputError("in the way")))).error, OutputError)
    errors: list[Exception] = [UnreadableError("half"), WishError("no bar 9"), KeyError("a")]
    expected = list(errors)
    scripted([lambda: None] * 3)
    report = WriteReport(tmp_path, ())

    def make() -> WriteReport:
        if errors:
            raise errors.pop(0)
        return report

    watching = watch([], make)
    runs = [next(watching) for _ in range(4)]
    assert [run.error for run in runs] == [*expected, None]
    assert [run.report for run in runs] == [None, None, None, report]


def _raising(error: Exception) -> Callable[[], WriteReport]:
    def make() -> WriteReport:
        raise error

    return make


def test_a_fault_inside_is_told_and_does_not_end_it(
    run: Run,
    hymn: Path,
    scripted: Callable[[Script], list[Path]],
    monkeypatch: pytest.MonkeyPatch,
    tmp_path: Path,
) -> None:
    calls: list[int] = []

    def learn(*arguments: object, **wishes: object) -> WriteReport:
        calls.append(1)
        if len(calls) == 2:
            raise KeyError("chord")
        return WriteReport(tmp_path, ())

    monkeypatch.setattr("retune.cli.learning.learn", learn)
    scripted([lambda: None, lambda: None])
    done = run("watch", hymn)
    assert done.code == 0
    lines = done.err.splitlines()
    assert len(lines) == 4
    assert "a fault inside retune (KeyError: 'chord'), see retune make --debug; waiting" in lines[2]
    scripted([lambda: None, lambda: None])
    calls.clear()
    assert len(run("watch", hymn, "-q").err.splitlines()) == 1


def test_choices_lie_beside_the_score() -> None:
    files = watched_files(Path("scores/bwv6.6.mxl"), [Path("organ.scl")])
    assert files == (
        Path("scores/bwv6.6.mxl"),
        Path("scores/bwv6.6.choices.toml"),
        Path("organ.scl"),
    )


def test_wrong_usage_and_a_missing_score_end_it_at_once(
    run: Run, hymn: Path, tmp_path: Path
) -> None:
    out = tmp_path / "out"
    for code, words, arguments in (
        (2, "not standard input", ["-"]),
        (1, "no such file", [tmp_path / "nothing.musicxml"]),
        (2, "Soprano", [hymn, "--part", "Sopran"]),
        (2, "speaks of mdi", [hymn, "--set", "mdi.channels=one"]),
        (2, "900", [hymn, "--bars", "900"]),
    ):
        done = run("watch", *arguments, "-o", out)
        assert done.code == code, done.err
        assert words in done.err
    assert not out.exists()
