"""What a command tells the user at its end."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from retune.cli.console import print_findings, say, width, wrapped

if TYPE_CHECKING:
    from retune.adapters.disk import WriteReport
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


def report_written(report: WriteReport) -> None:
    """The files written, each with its note."""
    say(f"Wrote {counted(len(report.written), 'file')} to {report.folder}")
    column = max((len(file.name) for file in report.written), default=0)
    for file in report.written:
        lines = [line for line in (file.note, file.checked) if line]
        text = f"  {file.name:<{min(column, width() // 2)}}  {'; '.join(lines)}"
        say(text.rstrip())
