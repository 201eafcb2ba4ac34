"""`retune make`: everything for one piece."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from retune.cli.options import (
    bars_option,
    examples,
    folder_option,
    score_argument,
    settings_option,
    talk_options,
    tuning_options,
)
from retune.cli.track_options import track_options


@click.command(
    "make",
    short_help="Everything for one piece, in one folder.",
    epilog=examples(
        "retune make hymn.musicxml",
        "retune make hymn.musicxml -o ~/choir/hymn --drift anchored --archives",
        "retune make song.mid --audio none --prime-limit 7 --melody Lead",
    ),
)
@score_argument
@folder_option
@bars_option
@track_options
@settings_option
@tuning_options
@talk_options
def command(score: Path, **wishes: Any) -> None:
    """Write everything for one SCORE: the rehearsal page, learning tracks as sound and MIDI,
    tuning tables, the note list, and how to use them.
    """
    from retune.cli.learning import learn
    from retune.pipeline import ALL_OUTPUTS

    learn("make", ALL_OUTPUTS, score, **wishes)
