"""Real scores through the whole of reading, analysis, tuning and export."""

from __future__ import annotations

from pathlib import Path

import music21
import pytest

from retune.export.scala import ScalaExporter, ScalaOptions
from retune.harmony import analyse
from retune.score.read import read
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.policy import Drift, Policy
from tests.export.smf import parse, receive, seconds
from tests.export.test_midi import check_pitches, written
from tests.export.test_scala import check_tables

CORPUS = Path(music21.__file__).parent / "corpus"


@pytest.mark.parametrize("name", ["bach/bwv66.6.mxl", "monteverdi/madrigal.3.1.mxl"])
@pytest.mark.parametrize(
    "policy", [Policy(), Policy(prime_limit=7, drift=Drift.FOLLOW, reference_hz=442.0)]
)
def test_a_real_score_sounds_as_tuned_and_its_tables_fit(name: str, policy: Policy) -> None:
    score = read(CORPUS / name)
    tuned = tune(score, analyse(score), policy)
    smf = parse(written(tuned))
    tones, bends = receive(smf)
    check_pitches(tuned, smf, tones)
    for tone in tones:
        assert tone.off is not None
        later = [b.tick for b in bends if b.channel == tone.channel and b.tick >= tone.off][:1]
        assert all(seconds(smf, tick) - seconds(smf, tone.off) >= 0.25 for tick in later)
    files = list(ScalaExporter().export([Take(tuned)], ScalaOptions()))
    check_tables(tuned, {file.name: file.data for file in files})
