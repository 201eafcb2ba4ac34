"""Values set in place leave the rest of a file as it is, sign by sign."""

from __future__ import annotations

import tomllib

import pytest
from hypothesis import given
from hypothesis import strategies as st

from retune.choicesfile.edit import EditedToml

TEXT = """# mine
[[chord]]   # first
at = "1:1"  # here
root = "D"

[tuning]
drift = "gentle"

[[chord]]
at = "2:1"
root = '''
E'''
# the end"""


@pytest.mark.parametrize("line", ["\n", "\r\n"])
def test_a_value_is_replaced_and_a_line_added(line: str) -> None:
    text = TEXT.replace("\n", line)
    edited = EditedToml(text)
    edited.set_values(("chord", 0), {"at": "3:2", "sounds": "- | D3 | -"})
    wanted = TEXT.replace('at = "1:1"  # here', 'at = "3:2"  # here')
    wanted = wanted.replace('root = "D"', 'root = "D"\nsounds = "- | D3 | -"')
    assert edited.text == wanted.replace("\n", line)


def test_tables_of_one_name_stay_apart() -> None:
    edited = EditedToml(TEXT)
    edited.set_values(("chord", 1), {"root": "F", "limit": 7})
    assert edited.text == TEXT.replace("'''\nE'''", '"F"\nlimit = 7')


def test_a_table_that_is_not_there_is_put_at_the_end() -> None:
    edited = EditedToml(TEXT)
    edited.set_table(("parts", "begins"), {"Alto 1": "E4 F4"})
    assert edited.text == f'{TEXT}\n\n[parts.begins]\n"Alto 1" = "E4 F4"\n'


def test_an_inline_table_stays_inline() -> None:
    edited = EditedToml('[parts]\nnames = { "A" = "B" }  # so\n')
    edited.set_table(("parts", "names"), {"C": "B"})
    assert edited.text == '[parts]\nnames = { C = "B" }  # so\n'


def test_what_would_not_be_toml_is_not_done() -> None:
    text = 'parts.begins.Alto = "E4"\n'
    edited = EditedToml(text)
    edited.set_table(("parts", "begins"), {"Tenor": "C4"})
    assert tomllib.loads(edited.text)


TEXTS = st.text(st.characters(exclude_categories=("Cs", "Cc")), max_size=20)


@given(st.lists(st.tuples(TEXTS, TEXTS), max_size=5), TEXTS)
def test_any_text_reads_back(pairs: list[tuple[str, str]], value: str) -> None:
    edited = EditedToml(TEXT)
    wanted = dict(pairs)
    edited.set_table(("parts", "names"), wanted)
    edited.set_values(("chord", 0), {"root": value})
    read = tomllib.loads(edited.text)
    assert read.get("parts", {}).get("names", {}) == wanted
    assert read["chord"][0]["root"] == value
    assert read["chord"][1] == tomllib.loads(TEXT)["chord"][1]
