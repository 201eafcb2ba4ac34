"""A take: one mix of a tuned score that an exporter turns into a file."""

from __future__ import annotations

from dataclasses import dataclass

from retune.tuning.model import TunedScore


@dataclass(frozen=True)
class Take:
    """One mix.

    `name` is what the file is called before NAME ("Full mix"); `folder` is where it goes below
    the exporter's own folder, "" for none.
    """

    tuned: TunedScore
    name: str = "Full mix"
    folder: str = ""
