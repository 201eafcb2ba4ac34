"""`retune play`: a score to a MIDI port, in real time."""

from __future__ import annotations

import signal
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from fractions import Fraction
from pathlib import Path
from types import FrameType
from typing import TYPE_CHECKING

import click

from retune.cli.console import say, width, working, wrapped
from retune.cli.options import (
    bars_option,
    examples,
    grouped,
    score_argument,
    settings_option,
    source_of,
    talk_options,
    tuning_options,
)
from retune.cli.report import report_findings, summary

if TYPE_CHECKING:
    from retune.choicesfile.model import ChoicesFile
    from retune.score.model import Score
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy

INTERRUPTED = 130


@click.command(
    "play",
    short_help="To a MIDI port, in real time.",
    epilog=examples(
        "retune play hymn.musicxml --port 'Synth input'",
        "retune play hymn.musicxml --port localhost:9080 --bars 17-24 --tempo 80% --loops 4",
        "retune play song.mid --port Sampler --prime-limit 7 --set midi.channels=one",
    ),
)
@score_argument
@click.option(
    "--port",
    required=True,
    metavar="NAME",
    help="Port to play to, or a part of its name (see retune ports); or HOST:PORT over TCP.",
)
@bars_option
@click.option(
    "--loops",
    type=click.IntRange(1),
    metavar="N",
    default=1,
    show_default=True,
    help="Play it N times without a gap.",
)
@settings_option
@tuning_options
@talk_options
def command(
    score: Path,
    port: str,
    bars: str | None,
    loops: int,
    settings: tuple[tuple[str, str, str], ...],
    policy: Policy,
    reading: ReadOptions,
    choices: ChoicesFile | None,
    all_findings: bool,
    quiet: bool,
) -> None:
    """Play one SCORE, retuned, to a MIDI port.

    What is sent is what `retune export --to midi` writes. Ctrl-C stops it: all notes are
    released and all bends taken back (exit code 130).
    """
    from retune import pipeline
    from retune.adapters.ports import open_port
    from retune.play import play, programme_of

    wishes = grouped(settings)
    if unused := set(wishes) - {"midi"}:
        raise click.UsageError(f"--set speaks of {', '.join(sorted(unused))}; play sends midi")
    pipeline.check_wishes(("midi",), wishes)
    opened = open_port(port)
    try:
        source, name = source_of(score)
        with working(f"Tuning {name}", quiet):
            tuned = pipeline.retuned(source, name, reading, policy, choices)
            if bars:
                tuned = pipeline.cut(tuned, bars)
            music = programme_of(tuned, wishes.get("midi"))
        if not quiet:
            say(summary(tuned))
            report_findings(tuned, all_findings)
            times = f", {loops} times" if loops > 1 else ""
            say(wrapped(f"Playing to {opened.name}: {clock_time(music.end)}{times}; Ctrl-C stops"))
        display = Display(tuned.score, music.end, loops, not quiet and sys.stderr.isatty())
        with stopping() as stopped, display:
            ended = play(music, opened, loops=loops, stopped=stopped, told=display.show)
    finally:
        opened.close()
    if not ended:
        if not quiet:
            say(f"Stopped at {display.place}; all notes released")
        raise click.exceptions.Exit(INTERRUPTED)


@contextmanager
def stopping() -> Iterator[Callable[[], bool]]:
    """Signals that end a program only set a flag meanwhile; yields what tells of it."""
    asked: list[int] = []

    def ask(signum: int, frame: FrameType | None) -> None:
        asked.append(signum)

    names = ("SIGINT", "SIGTERM", "SIGHUP")
    found = [getattr(signal, name) for name in names if hasattr(signal, name)]
    before = {sign: signal.signal(sign, ask) for sign in found}
    try:
        yield lambda: bool(asked)
    finally:
        for sign, handler in before.items():
            signal.signal(sign, handler)


class Display:
    """Where the music is: one line of a terminal, written again and again."""

    def __init__(self, score: Score, end: float, loops: int, live: bool) -> None:
        self._score = score
        self._end = end
        self._loops = loops
        self._live = live
        self._shown = ""
        self.place = "the beginning"

    def __enter__(self) -> Display:
        return self

    def __exit__(self, *exception: object) -> None:
        self._write("")

    def show(self, seconds: float, loop: int) -> None:
        """Show these seconds from the start of the music."""
        self.place = place_at(self._score, seconds)
        again = f", {loop} of {self._loops}" if self._loops > 1 else ""
        self._write(f"{self.place}  {clock_time(seconds)} of {clock_time(self._end)}{again}")

    def _write(self, line: str) -> None:
        line = line[: width() - 1]
        if self._live and line != self._shown:
            blank = " " * (len(self._shown) - len(line))
            back = "\r" if not line else ""
            click.echo(f"\r{line}{blank}{back}", err=True, nl=False)
            self._shown = line


_GRID = 960
"""Parts of a quarter note that a place is told by, so that a bar line is not missed by a hair."""


def place_at(score: Score, seconds: float) -> str:
    """Bar and beat at a time from the start, as 'bar 12, beat 3'."""
    onset = Fraction(round(score.tempo.quarters(seconds) * _GRID), _GRID)
    return f"bar {score.bar_at(onset).number}, beat {int(score.beat_at(onset))}"


def clock_time(seconds: float) -> str:
    """Minutes and seconds.

    >>> clock_time(83.7)
    '1:23'
    """
    return f"{int(seconds) // 60}:{int(seconds) % 60:02}"
