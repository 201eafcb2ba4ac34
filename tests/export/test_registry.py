"""Plug-ins found, refused and asked for, with entry points made by hand."""

from __future__ import annotations

import sys
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from enum import StrEnum
from importlib.metadata import EntryPoint
from types import ModuleType, SimpleNamespace
from typing import Any, ClassVar

import pytest

from retune.errors import OutputError, WishError
from retune.export.base import OutputFile
from retune.export.registry import GROUP, find_exporters, parse_options
from retune.tracks.take import Take


class Shape(StrEnum):
    ROUND = "round"
    SQUARE = "square"


@dataclass(frozen=True)
class TagOptions:
    shape: Shape = field(default=Shape.ROUND, metadata={"help": "outline"})
    count: int = field(default=1, metadata={"least": 1, "most": 9})
    ratio: float = 0.5
    loud: bool = False
    label: str = ""


class TagExporter:
    name: ClassVar[str] = "tags"
    summary: ClassVar[str] = "Tags for tests"
    suffixes: ClassVar[tuple[str, ...]] = (".tag",)
    Options: ClassVar[type[TagOptions]] = TagOptions

    def export(self, takes: Sequence[Take], options: TagOptions) -> Iterator[OutputFile]:
        yield OutputFile("a.tag", b"")


def entry(name: str, made: object, distribution: str = "tagger") -> EntryPoint:
    """An entry point whose module is made on the spot."""
    module = ModuleType(f"retune_test_{name}_{distribution.replace(' ', '_')}_{id(made)}")
    module.Made = made  # type: ignore[attr-defined]  # a module made for this test
    sys.modules[module.__name__] = module
    point = EntryPoint(name, f"{module.__name__}:Made", GROUP)
    vars(point).update(dist=SimpleNamespace(name=distribution, version="1.2"))
    return point


def test_built_in_exporters_are_found_as_plug_ins_are() -> None:
    found = find_exporters()
    assert {"midi", "notes", "scala"} <= {one.exporter.name for one in found.entries}
    assert {one.distribution.split()[0] for one in found.entries} == {"retune-choir"}
    assert not found.findings


def test_a_plug_in_is_found_with_its_distribution() -> None:
    found = find_exporters([entry("tags", TagExporter)])
    assert found.get("tags").summary == "Tags for tests"
    assert found.entries[0].distribution == "tagger 1.2"


class NoExport:
    name, summary, suffixes, Options = "tags", "x", (".x",), TagOptions


class CatchAll(TagExporter):
    def export(self, *args: Any, **kwargs: Any) -> Iterator[OutputFile]:
        yield OutputFile("a.tag", b"")


class OtherName(TagExporter):
    name = "labels"


class LooseSuffix(TagExporter):
    suffixes = ("tag",)


@dataclass
class Thawed:
    count: int = 1


class ThawedOptions(TagExporter):
    Options: ClassVar[Any] = Thawed


@dataclass(frozen=True)
class Needy:
    count: int


class NeedyOptions(TagExporter):
    Options: ClassVar[Any] = Needy


@dataclass(frozen=True)
class Odd:
    values: tuple[int, ...] = ()


class OddOptions(TagExporter):
    Options: ClassVar[Any] = Odd


class Crashing(TagExporter):
    def __init__(self) -> None:
        raise RuntimeError("no licence found")


@pytest.mark.parametrize(
    ("made", "reason"),
    [
        (NoExport, "has no export"),
        (CatchAll, r"\*args"),
        (OtherName, "calls itself 'labels'"),
        (LooseSuffix, "suffixes"),
        (ThawedOptions, "not frozen"),
        (NeedyOptions, "count has no default"),
        (OddOptions, "values has a type"),
        (Crashing, "no licence found"),
        ("text", "no class"),
    ],
)
def test_a_broken_plug_in_is_a_named_warning_and_harms_no_other(made: object, reason: str) -> None:
    good = type("Good", (TagExporter,), {"name": "good"})
    found = find_exporters([entry("tags", made), entry("good", good)])
    assert [one.exporter.name for one in found.entries] == ["good"]
    (finding,) = found.findings
    assert "the output tags of tagger 1.2 cannot be used" in finding.what
    with pytest.raises(WishError, match=reason):
        found.get("tags")


def test_a_plug_in_whose_module_is_missing_is_a_warning() -> None:
    point = EntryPoint("tags", "no_such_module_at_all:Exporter", GROUP)
    (finding,) = find_exporters([point]).findings
    assert "ModuleNotFoundError" in finding.what


def test_two_plug_ins_of_one_name_are_an_error_that_names_both() -> None:
    points = [entry("tags", TagExporter, "one"), entry("tags", TagExporter, "two")]
    with pytest.raises(OutputError, match=r"called tags: one of one 1\.2, one of two 1\.2"):
        find_exporters(points)


def test_an_unknown_output_lists_what_there_is() -> None:
    words = r"'mdi'.*Did you mean midi\? Installed are audio, midi, mpe, mts, notation, notes"
    with pytest.raises(WishError, match=words):
        find_exporters().get("mdi")


def test_options_are_read_by_their_types() -> None:
    texts = {"shape": "square", "count": "3", "ratio": "0.25", "loud": "yes", "label": "a=b"}
    assert parse_options(TagExporter(), texts) == TagOptions(Shape.SQUARE, 3, 0.25, True, "a=b")
    assert parse_options(TagExporter(), {}) == TagOptions()


@pytest.mark.parametrize(
    ("name", "text", "message"),
    [
        ("shap", "round", r"no option 'shap'\. Did you mean shape\? It has shape, count"),
        ("zzz", "1", "It has shape, count, ratio, loud, label"),
        ("shape", "rond", r"Did you mean round\? It is one of"),
        ("shape", "7", "It is one of round, square"),
        ("count", "1.5", "whole number"),
        ("count", "9" * 5000, "whole number"),
        ("count", "10", "from 1 to 9"),
        ("ratio", "nan", "It is a number"),
        ("ratio", "1e999999999", "It is a number"),
        ("loud", "maybe", "true or false"),
    ],
)
def test_a_wrong_option_says_what_is_allowed(name: str, text: str, message: str) -> None:
    with pytest.raises(WishError, match=message):
        parse_options(TagExporter(), {name: text})


def test_every_built_in_option_has_help() -> None:
    for one in find_exporters().entries:
        for option in vars(one.exporter.Options)["__dataclass_fields__"].values():
            assert option.metadata["help"]
