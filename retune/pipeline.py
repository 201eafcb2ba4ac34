"""The whole flow on one page: read -> analyse -> tune -> export -> write."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from itertools import count
from pathlib import Path
from typing import TYPE_CHECKING

from retune.choicesfile.direct import directed
from retune.choicesfile.ratios import fitting_ratios
from retune.errors import OutputError
from retune.harmony import analyse
from retune.score.read import read, read_bytes
from retune.score.transpose import moved
from retune.tracks.learning import excerpt, learning_takes
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.policy import Temperament

if TYPE_CHECKING:
    from retune.adapters.disk import WriteReport
    from retune.choicesfile.direct import Directed
    from retune.choicesfile.model import ChoicesFile
    from retune.choicesfile.update import Updated
    from retune.export.base import Output
    from retune.score.model import Score
    from retune.score.options import ReadOptions
    from retune.tracks.options import TrackOptions
    from retune.tuning.model import TunedScore
    from retune.tuning.policy import Policy

Settings = Mapping[str, str]
"""Options of one exporter as text, by name."""

Progress = Callable[[int, int], None]
"""Told how many files are done, and of how many."""

ALL_OUTPUTS = ("page", "audio", "midi", "notation", "scala", "notes")
"""What `make` writes."""

TRACK_OUTPUTS = ("audio", "midi")
"""What `tracks` writes."""


def retuned(
    source: Path | bytes,
    name: str,
    reading: ReadOptions,
    policy: Policy,
    file: ChoicesFile | None = None,
) -> TunedScore:
    """Read, analyse and tune one score as the director has it.

    Parameters
    ----------
    name : str
        Stands for the score in messages.
    file : ChoicesFile, optional
        The director's decisions. Those that no longer fit the score are left out, each with a
        finding.
    """

    scored = _reader(source, name)
    if file is not None:
        return _as_directed(directed(scored, reading, policy, file))
    score = scored(reading)
    policy = _in_key(policy, score)
    return tune(score, analyse(score, policy.tonic), policy)


def proposed_choices(
    source: Path | bytes, name: str, reading: ReadOptions, policy: Policy
) -> tuple[TunedScore, str]:
    """A score tuned without choices, and the text of the choices proposed for it."""
    from retune.choicesfile.proposals import proposed

    tuned = retuned(source, name, replace(reading, transpose=0), policy)
    return tuned, proposed(tuned)


def updated_choices(
    source: Path | bytes, name: str, reading: ReadOptions, policy: Policy, file: ChoicesFile
) -> tuple[TunedScore, Updated]:
    """A score tuned with its choices, and their text brought up to date with it."""
    from retune.choicesfile.update import updated

    scored = _reader(source, name)
    wish = directed(scored, reading, policy, file)
    plain = scored(replace(reading, transpose=0))
    return _as_directed(wish), updated(plain, wish)


def write_text(path: Path, text: str) -> None:
    """Write one text file whole; raises `OutputError`."""
    from retune.adapters.onefile import write_one

    write_one(path, text.encode())


def _reader(source: Path | bytes, name: str) -> Callable[[ReadOptions], Score]:
    """Reads one score with the given options."""
    if isinstance(source, bytes):
        return lambda options: read_bytes(source, name, options)
    return lambda options: read(source, options)


def _in_key(policy: Policy, score: Score) -> Policy:
    """The policy with its tonic, which the user names as the file has it, as the score has it."""
    if policy.tonic is None:
        return policy
    return replace(policy, tonic=moved(policy.tonic, score.transposition))


def _as_directed(wish: Directed) -> TunedScore:
    policy = _in_key(wish.policy, wish.score)
    harmony = analyse(wish.score, policy.tonic, wish.choices)
    file = wish.survey.file
    choices, told = fitting_ratios(wish.score, harmony, wish.choices, wish.ratio_lines, file)
    tuned = tune(wish.score, harmony, policy, choices)
    return replace(tuned, findings=(*told, *tuned.findings))


def cut(tuned: TunedScore, bars: str) -> TunedScore:
    """Only these bars, tuned as they are within the piece; raises `WishError`."""
    from retune.tuning.refigure import refigured

    return refigured(excerpt(tuned, bars))


def takes_of(tuned: TunedScore) -> tuple[Take, ...]:
    """The full mix alone, without lead-in."""
    return (Take(tuned),)


def learning_tracks(tuned: TunedScore, options: TrackOptions) -> tuple[Take, ...]:
    """The full mix and every part's tracks; raises `WishError` for a part or bars not there."""
    equal = None
    if options.compare:
        policy = replace(tuned.policy, temperament=Temperament.EQUAL)
        equal = tune(tuned.score, tuned.harmony, policy)
    return learning_takes(tuned, options, equal)


def check_wishes(exporters: Sequence[str], settings: Mapping[str, Settings]) -> None:
    """Raise `WishError` for an unknown exporter or option, before any work is done."""
    from retune.export.registry import find_exporters, parse_options

    installed = find_exporters()
    for name in exporters:
        parse_options(installed.get(name), settings.get(name, {}))


def exported(
    takes: Sequence[Take], exporters: Sequence[str], settings: Mapping[str, Settings]
) -> list[Output]:
    """Every file that the named exporters make of the takes; nothing touches the disk.

    Raises `OutputError` that names the output and its distribution where one fails or makes
    what cannot be written.
    """
    from retune.export.guard import files_of
    from retune.export.registry import find_exporters, parse_options

    installed = find_exporters()
    chosen = [installed.entry(name) for name in exporters]
    options = [parse_options(one.exporter, settings.get(one.exporter.name, {})) for one in chosen]
    return [
        file
        for entry, wish in zip(chosen, options, strict=True)
        for file in files_of(entry, takes, wish)
    ]


def exported_where_possible(
    takes: Sequence[Take],
    exporters: Sequence[str],
    settings: Mapping[str, Settings],
    failed: list[OutputError] | None,
) -> list[Output]:
    """As `exported`; an output that fails goes into `failed`, if that is given and others do not.

    Raises the error where none is left, or without `failed`.
    """
    if failed is None:
        return exported(takes, exporters, settings)
    files: list[Output] = []
    for name in exporters:
        try:
            files += exported(takes, [name], settings)
        except OutputError as error:
            failed.append(error)
    if failed and not files:
        raise failed.pop()
    return files


def write(
    tuned: TunedScore,
    exporters: Sequence[str],
    folder: str | Path,
    settings: Mapping[str, Settings] | None = None,
    failed: list[OutputError] | None = None,
) -> WriteReport:
    """Export a tuned score into a folder: all files or, on any failure, none.

    Parameters
    ----------
    exporters : sequence of str
        Names such as "midi", "scala", "notes".
    settings : mapping, optional
        Exporter name -> option name -> value as text, as in ``{"midi": {"channels": "one"}}``.
    failed : list, optional
        Where errors of single outputs go, so that the others are still written.

    Raises
    ------
    OutputError
        The folder cannot be written, or a file of the same name is not the tool's own.
    WishError
        No such exporter or option.
    """
    from retune.adapters.disk import write_all

    files = exported_where_possible(takes_of(tuned), exporters, settings or {}, failed)
    return write_all(files, Path(folder))


def write_learning(
    takes: Sequence[Take],
    folder: str | Path,
    exporters: Sequence[str] = ALL_OUTPUTS,
    settings: Mapping[str, Settings] | None = None,
    archives: bool = False,
    progress: Progress | None = None,
    failed: list[OutputError] | None = None,
) -> WriteReport:
    """Write a piece's takes and a text on how to use them: all files or none.

    Parameters
    ----------
    exporters, settings, failed
        As for `write`.
    archives : bool
        Also one zip archive for each section, of its tracks and the full mix.
    progress : callable, optional
        Called with the number of files done and of all files, from 0 on.

    Raises as `write` does.
    """
    from retune.adapters.disk import write_all
    from retune.export.archives import section_archives
    from retune.export.howto import how_to_use

    files = exported_where_possible(takes, exporters, settings or {}, failed)
    files.append(how_to_use(takes, files))
    done = count(1)
    if progress is not None:
        progress(0, len(files))
    return write_all(
        files,
        Path(folder),
        section_archives(takes, [file.name for file in files]) if archives else (),
        lambda _: progress(next(done), len(files)) if progress is not None else None,
    )
