"""`retune chord`: one chord, its ratios, beats, shared partials and what else it could be."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click
from click.core import ParameterSource

from retune.cli.console import say, width, working, wrapped
from retune.cli.options import examples, source_of, talk_options, tuning_options
from retune.cli.policy_options import Tonic
from retune.cli.report import report_findings, written_lines
from retune.errors import WishError
from retune.score.model import VoiceType
from retune.voice.options import VOWELS

if TYPE_CHECKING:
    from retune.chordcard.found import FoundChord
    from retune.choicesfile.model import ChoicesFile
    from retune.pitch import Pitch, PitchClass
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy

_WITHOUT_SCORE = {"pitches", "root", "voices", "audio", "picture", "vowel", "as_json", "quiet"} | {
    "prime_limit",
    "reference",
    "tonic",
}
"""What can be wished of pitches alone."""
_WITH_SCORE_ONLY = {"place", "run", "all_findings"}

VOICE_CAUTION = (
    "Start with the volume low. If you sing with it: do not force pitch, vowel or volume, and "
    "stop if it hurts or turns hoarse."
)
