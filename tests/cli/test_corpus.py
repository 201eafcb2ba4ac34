"""The main job, through the command line, on varied scores of music21's corpus."""

from __future__ import annotations

from pathlib import Path

import music21
import pytest

from tests.cli.conftest import Run, tree

CORPUS = Path(music21.__file__).parent / "corpus"

FEW = (
    "bach/bwv269.mxl",
    "palestrina/Kyrie_02.krn",
    "monteverdi/madrigal.3.1.mxl",
    "trecento/Fava_Dicant_nunc_iudei.xml",
    "josquin/laDeplorationDeLaMorteDeJohannesOckeghem.abc",
)
MORE = (
    "bach/bwv66.6.mxl",
    "bach/bwv277.mxl",
    "bach/bwv227.1.mxl",
    "bach/bwv1.6.mxl",
    "bach/bwv846.mxl",
    "monteverdi/madrigal.4.20.mxl",
    "monteverdi/madrigal.5.8.mxl",
    "palestrina/Gloria_87.krn",
    "palestrina/Agnus_02.krn",
    "palestrina/Sanctus_31_c.krn",
    "lusitano/allor_che_ignuda.mxl",
    "johnson_j_r/lift_every_voice.mxl",
    "liliuokalani/aloha_oe.mxl",
    "beach/prayer_of_a_tired_child.musicxml",
    "luca/gloria.xml",
    "ciconia/quod_jactatur.xml",
    "beethoven/opus133.mxl",
    "beethoven/opus18no1/movement1.mxl",
    "corelli/opus3no1/1grave.xml",
    "haydn/opus74no1/movement3.mxl",
    "trecento/PMFC_12_1-Kyrie Rondello.xml",
    "mozart/k155/movement2.mxl",
    "schumann_clara/polonaise_op1n1.mxl",
    "schubert/Lindenbaum.xml",
    "trecento/PMFC_04-Cara mi donna.xml",
)


def scores() -> list[object]:
    """The few in every run, the others among the slow tests."""
    slow = (pytest.param(name, marks=pytest.mark.slow) for name in MORE)
    return [*FEW, *slow]


@pytest.mark.parametrize("name", scores())
def test_main_job_is_done(run: Run, name: str, tmp_path: Path) -> None:
    outputs = ("--to", "midi", "--to", "scala", "--to", "notes")
    done = run("export", CORPUS / name, *outputs, "-o", tmp_path)
    assert done.code == 0, done.err
    assert {Path(file).suffix for file in tree(tmp_path)} >= {".mid", ".scl", ".kbm", ".csv"}
