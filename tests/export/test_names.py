"""File names against the rules of the systems that will hold them."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from retune.adapters.filenames import check_names
from retune.export.names import safe_name
from retune.score.titles import numbered


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("bwv6.6", "bwv6.6"),
        ("Kyrie: I/II?", "Kyrie- I-II-"),
        ("  Abend\tlied\n", "Abend lied"),
        ("Ténor 2", "Ténor 2"),
        ("Te\u0301nor", "Ténor"),
        ("東風", "東風"),
        # Windows keeps these for devices, with any ending ("Naming Files, Paths, and
        # Namespaces", Microsoft Learn; from memory).
        ("CON", "CON_"),
        ("aux.sop", "aux_.sop"),
        ("lpt1", "lpt1_"),
        ("..", "untitled"),
        ("", "untitled"),
        ("a.", "a"),
        ("../../etc/passwd", "-..-etc-passwd"),
        ("C:\\scores\\x", "C--scores-x"),
        ("\u202egnp.exe", "gnp.exe"),
        ("bad\udcff", "bad-"),
        (".hidden", "hidden"),
    ],
)
def test_names(text: str, name: str) -> None:
    assert safe_name(text) == name


@given(st.text(max_size=400))
def test_every_text_becomes_a_name_that_the_writer_takes(text: str) -> None:
    name = safe_name(text)
    check_names([f"midi/{name} - {name}.mid"])
    assert safe_name(name) == name


def test_equal_names_are_numbered_whatever_their_case() -> None:
    assert numbered(["Alto", "ALTO", "Alto 2", "Bass"]) == ("Alto", "ALTO 2", "Alto 2 2", "Bass")
