"""What the page is told of a piece, against the tuned score itself."""

from __future__ import annotations

import base64
import gzip
import hashlib
import json
import re
from dataclasses import replace

import pytest

from retune.export.page import PageExporter, PageOptions
from retune.page.build import script_json
from retune.page.data import page_data
from retune.page.drift import purity_by_bar
from retune.page.intervals import interval_name
from retune.tracks.learning import excerpt
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.policy import Drift, Policy
from retune.tuning.refigure import refigured
from tests.tracks.pieces import NAMES, tuned


def html(name: str, options: PageOptions | None = None) -> str:
    file = next(iter(PageExporter().export([Take(tuned(name))], options or PageOptions())))
    return file.data.decode("utf-8")


@pytest.mark.parametrize("name", NAMES)
def test_every_note_is_there_at_its_pitch(name: str) -> None:
    piece = tuned(name)
    follow = tune(piece.score, piece.harmony, Policy(drift=Drift.FOLLOW))
    data = page_data(piece, follow, {})
    assert len(data["notes"]) == len(piece.notes)
    for row, one in zip(data["notes"], piece.notes, strict=True):
        assert row["t"] == pytest.approx(piece.seconds(one.note.onset), abs=1e-4)
        for cell, segment in zip(row["g"], one.segments, strict=True):
            assert cell[1] == pytest.approx(piece.hz(one, segment), abs=1e-3)
            equal = 440.0 * 2 ** ((one.note.pitch.key - 69) / 12)
            assert cell[2] == pytest.approx(equal, abs=1e-3)
    for part in data["parts"]:
        for _, amplitudes in part["waves"]:
            assert sum(a * a for a in amplitudes) == pytest.approx(1.0, abs=1e-3)


@pytest.mark.parametrize("name", NAMES)
def test_purity_of_each_bar_is_that_of_the_bar_alone(name: str) -> None:
    piece = tuned(name)
    for bar, found in list(zip(piece.score.bars, purity_by_bar(piece), strict=True))[:8]:
        if found is None:
            continue
        alone = refigured(
            excerpt(replace(piece, score=_numbered(piece)), str(bar.index + 1))
        ).figures["purity"]
        assert found[0] == pytest.approx(alone["mean_cents"], abs=0.011)
        assert found[1] == pytest.approx(alone["equal_temperament_mean_cents"], abs=0.011)


def _numbered(piece: object) -> object:
    """The score with its bars counted through, so that each can be named."""
    score = piece.score  # type: ignore[attr-defined]
    bars = tuple(replace(bar, number=str(bar.index + 1), rehearsal="") for bar in score.bars)
    return replace(score, bars=bars)


def test_follow_sinks_by_a_comma_each_time() -> None:
    """The hymn's I-vi-ii-V-I sinks by 21.5 cents (Benedetti's puzzle; methods.md A)."""
    piece = tuned("harbour-hymn")
    follow = tune(piece.score, piece.harmony, Policy(drift=Drift.FOLLOW))
    path = page_data(piece, follow, {})["drift"]["follow"]
    assert path[1][1] - path[0][1] == pytest.approx(-21.506, abs=0.05)


@pytest.mark.parametrize(
    ("semitones", "name"),
    [(7, "fifth"), (15, "minor tenth"), (19, "twelfth"), (31, "fifth and two octaves")],
)
def test_intervals_in_words(semitones: int, name: str) -> None:
    assert interval_name(semitones) == name


def test_the_policy_allows_this_style_and_script_and_nothing_else() -> None:
    text = html("harbour-hymn")
    policy = re.search(r'Content-Security-Policy" content="([^"]*)"', text)
    assert policy is not None
    assert policy[1].startswith("default-src 'none'")
    assert "unsafe" not in policy[1]
    for tag, rule in (("style", "style-src"), ("script", "script-src")):
        (body,) = re.findall(rf"<{tag}>(.*?)</{tag}>", text, re.DOTALL)
        digest = base64.b64encode(hashlib.sha256(body.encode()).digest()).decode()
        assert f"{rule} 'sha256-{digest}'" in policy[1]
    assert not re.search(r"\sstyle=|\son\w+=|https?://(?!www\.w3\.org/)", text.split("<script>")[0])


def test_packed_engravings_are_systems() -> None:
    text = html("harbour-hymn")
    packed = dict(re.findall(r'data-engraving="(\w+)">([^<]*)<', text))
    assert set(packed) == {"narrow", "wide", "part0", "part1", "part2", "part3"}
    for body in packed.values():
        systems = json.loads(gzip.decompress(base64.b64decode(body)))
        assert all(system.startswith("<svg") for system in systems)


def test_options_leave_things_out() -> None:
    plain = html("harbour-hymn", PageOptions(widths=False, part_lines=False))
    assert "data-engraving=" not in plain.split("<script>")[0]
    files = PageExporter().export([Take(tuned("harbour-hymn"))], PageOptions(part_pages=False))
    assert [file.name for file in files] == ["harbour-hymn.html"]


def test_equal_pages_have_equal_bytes() -> None:
    assert html("tide-motet") == html("tide-motet")


@pytest.mark.parametrize("text", ["</script>", "<!--", "\u2028", "&<>\"'"])
def test_json_in_the_page_cannot_end_its_element(text: str) -> None:
    made = script_json({"title": text})
    assert "<" not in made
    assert json.loads(made) == {"title": text}
