"""A score made again at every save."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from retune.adapters.disk import WriteReport
from retune.adapters.watching import saves
from retune.errors import LimitError, OutputError, UnreadableError
from retune.score.read import stem_of


@dataclass(frozen=True, slots=True)
class Run:
    """One making: what was written, or why nothing was, and how long it took in seconds."""

    report: WriteReport | None
    error: Exception | None
    seconds: float


def watched_files(score: Path, others: Sequence[Path] = ()) -> tuple[Path, ...]:
    """The score, its choices beside it, whether they are there or not, and other files."""
    return (score, score.with_name(f"{stem_of(score.name)}.choices.toml"), *others)


def watch(files: Sequence[Path], make: Callable[[], WriteReport]) -> Iterator[Run]:
    """Make at once and after each save of one of the files; yields what came of each.

    A run that fails is told of with its error, as where a score is saved by halves or gone for
    a while. Of the first run, a wish that does not fit the score and a fault are raised here.

    Raises `KeyboardInterrupt` where it is interrupted, with nothing half written.
    """
    for number, _ in enumerate(saves(files)):
        begin = time.monotonic()
        report, failed = None, None
        try:
            report = make()
        # Whatever a damaged score brings about, the next save may be well again.
        except Exception as error:
            if number == 0 and not isinstance(error, UnreadableError | LimitError | OutputError):
                raise
            failed = error
        yield Run(report, failed, time.monotonic() - begin)
