"""`retune tracks`: learning tracks only."""

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
    "tracks",
    short_help="Learning tracks only, as sound and MIDI.",
    epilog=examples(
        "retune tracks hymn.musicxml -o tracks",
        "retune tracks hymn.musicxml --bars 17-24 --tempo 80% --loops 3 --part Alto -o alto",
        "retune tracks motet.musicxml --language latin --drone tonic --audio wav -o motet",
        "retune tracks hymn.musicxml --temperament equal --compare 1-4 -o hymn",
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
    """Write the learning tracks of one SCORE: each part predominant, alone and missing."""
    from retune.cli.learning import learn
    from retune.pipeline import TRACK_OUTPUTS

    learn("tracks", TRACK_OUTPUTS, score, **wishes)
