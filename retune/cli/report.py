"""What a command tells the user at its end."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from retune.cli.console import print_error, print_findings, wrapped

if TYPE_CHECKING:
    from collections.abc import Sequence

    from retune.adapters.disk import WriteReport, WrittenFile
    from retune.errors import OutputError
    from retune.tuning.model import TunedScore
    from retune.tuning.policy import Policy


def policy_line(policy: Policy) -> str:
    """The policy in a line: limit, drift, held shift, reference pitch."""
    if policy.temperament != "just":
        words = [f"{policy.temperament} temperament"]
    else:
        held = {0.0: "held notes never move", float("inf"): "held notes move freely"}.get(
            policy.held_shift, f"held notes move at most {policy.held_shift:g} cents"
        )
        words = [f"just, {policy.prime_limit}-limit", f"drift {policy.drift}", held]
    return ", ".join([*words, f"A4 = {policy.reference_hz:g} Hz"])


def tonic_name(tuned: TunedScore) -> str:
    """The home tonic in words, as 'D major'."""
    tonic = tuned.harmony.tonic
    return f"{tonic.root.name} {'minor' if tonic.minor else 'major'}"


def counted(number: int, noun: str) -> str:
    """A number with its noun, in the plural where it is not one."""
    return f"{number:,} {noun}{'' if number == 1 else 's'}"


def summary(tuned: TunedScore) -> str:
    """A few lines on what was read and how it was tuned."""
    score = tuned.score
    sizes = ", ".join(
        [
            counted(len(score.parts), "part"),
            counted(len(score.bars), "bar"),
            counted(len(score.notes), "note"),
            f"home tonic {tonic_name(tuned)}",
        ]
    )
    title = click.style(wrapped(score.title or score.stem), bold=True)
    return f"{title}\n{sizes}\n{wrapped(policy_line(tuned.policy))}"


def report_findings(tuned: TunedScore, everything: bool) -> None:
    """Doubts, losses and inferences of reading and tuning."""
    print_findings((*tuned.score.findings, *tuned.findings), everything)


_NAMED = 3
"""Files of one folder that are spoken of one by one; of more, the first stands for all."""


def _group_of(name: str) -> str:
    """Files of a folder belong together; of those beside the folders, those of one kind."""
    folder, slash, _ = name.partition("/")
    return folder + slash if slash else name.rpartition(".")[2]


def _about(file: WrittenFile, named: bool) -> str:
    """A file's notes, with its name unless it is the only one of its folder."""
    words = "; ".join(line for line in (file.note, file.checked) if line)
    return f"{file.name.rpartition('/')[2]}: {words}" if named else words


def written_lines(report: WriteReport) -> list[str]:
    """The files written, folder by folder, and what is to be said of them."""
    lines = [f"Wrote {counted(len(report.written), 'file')} to {report.folder}"]
    groups: dict[str, list[WrittenFile]] = {}
    for file in report.written:
        groups.setdefault(_group_of(file.name), []).append(file)
    for group, files in groups.items():
        alone = len(files) == 1
        if group.endswith("/"):
            what = files[0].name.removeprefix(group) if alone else counted(len(files), "file")
            lines.append(f"  {group:<9} {what}")
        else:
            lines.append(f"  {files[0].name}" + ("" if alone else f" (and {len(files) - 1} more)"))
        noted = [file for file in files if file.note or file.checked]
        told = noted if len(noted) <= _NAMED else noted[:1]
        more = len(noted) - len(told)
        for file in told:
            words = _about(file, not alone) + (f" (and {more} more like it)" if more else "")
            lines.append(wrapped(f"            {words}", " " * 12))
    return lines


def raise_last(failed: Sequence[OutputError]) -> None:
    """Tell of all outputs that failed while others were done, the last one as the error."""
    for error in failed[:-1]:
        print_error(error.what, error.where, error.hint)
    if failed:
        raise failed[-1]
