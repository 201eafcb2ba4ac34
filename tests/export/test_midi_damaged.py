"""MIDI files of the corpus, damaged: given back retuned or refused in one line, never a fault."""

from __future__ import annotations

import random
from functools import cache
from pathlib import Path

import music21
import pytest

from retune.errors import RetuneError
from retune.limits import Limits
from retune.pipeline import exported, retuned, takes_of
from retune.score.options import ReadOptions
from retune.tuning.policy import Policy

CORPUS = Path(music21.__file__).parent / "corpus"
READING = ReadOptions(limits=Limits(max_bytes=4_000_000, max_notes=20_000, max_seconds=3600))


@cache
def midi_of(name: str) -> bytes:
    """A chorale of the corpus as the MIDI file that is written of it."""
    path = CORPUS / "bach" / f"{name}.mxl"
    tuned = retuned(path, str(path), ReadOptions(), Policy())
    return exported(takes_of(tuned), ["midi"], {})[0].data


def damaged(data: bytes, chance: random.Random) -> bytes:
    """Some bytes changed, cut out, put in, doubled, or the end cut off."""
    made = bytearray(data)
    for _ in range(chance.randint(1, 3)):
        place = chance.randrange(14, len(made))
        kind = chance.choice((0, 0, 0, 0, 1, 2, 3, 4))
        if kind == 0:
            made[place] = chance.randrange(256)
        elif kind == 1:
            del made[place : place + chance.randint(1, 40)]
        elif kind == 2:
            made[place:place] = chance.randbytes(chance.randint(1, 20))
        elif kind == 3:
            made[place:place] = made[place : place + chance.randint(1, 200)]
        else:
            del made[max(place, len(made) // 2) :]
        if len(made) < 40:
            break
    return bytes(made)


def outcome(data: bytes) -> str:
    refusal = None
    try:
        tuned = retuned(data, "damaged.mid", READING, Policy())
        for file in exported(takes_of(tuned), ["midi"], {}):
            if file.check is not None:
                file.check(file.data)
    except RetuneError as error:
        refusal = error
    if refusal is None:
        return "done"
    assert "\n" not in refusal.what
    assert "fault of retune" not in (refusal.hint or ""), refusal.what
    return "refused"


@pytest.mark.parametrize("seed", range(20))
def test_damaged_files(seed: int) -> None:
    assert outcome(damaged(midi_of("bwv66.6"), random.Random(seed))) in ("done", "refused")


@pytest.mark.slow
def test_three_hundred_files_damaged_in_a_thousand_ways() -> None:
    names = sorted(path.stem for path in (CORPUS / "bach").glob("bwv*.mxl"))[:300]
    chance = random.Random(1)
    outcomes = [outcome(damaged(midi_of(chance.choice(names)), chance)) for _ in range(1000)]
    assert outcomes.count("done") > 50
    assert outcomes.count("refused") > 50
