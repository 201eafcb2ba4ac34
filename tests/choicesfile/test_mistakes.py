"""Mistakes in a choices file are told by line and column, with what is allowed."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from retune.choicesfile.positions import positions
from retune.choicesfile.read import load, loads
from retune.errors import UnreadableError

FILE = Path("psalm.choices.toml")


@pytest.mark.parametrize(
    ("text", "where", "words"),
    [
        ("titel = 'x'", "line 1, column 1", ["titel", "did you mean 'title'"]),
        ("reference = 4400", "line 1, column 1", ["4400", "220 to 880"]),
        ("[tunning]\ndrift = 'follow'", "line 1, column 1", ["did you mean 'tuning'"]),
        ("[tuning]\n\ndrfit = 'x'", "line 3, column 1", ["did you mean 'drift'", "[tuning]"]),
        ("[tuning]\n  drift = 'gentel'", "line 2, column 3", ["did you mean 'gentle'"]),
        ("[tuning]\nprime_limit = 11", "line 2, column 1", ["11 is not 3, 5 or 7"]),
        ("[tuning]\ndrift_within = 5", "line 2, column 1", ['drift = "within"']),
        ("[chord]\nat = '1:1'", "line 1, column 1", ["[[chord]]"]),
        ("[[chord]]\nroot = 'D'", "line 1, column 1", ["needs 'at'"]),
        ("[[chord]]\nat = '1:1'", "line 1, column 1", ["decides nothing", "'root'"]),
        ("[[chord]]\nat = '1'\nroot = 'D'", "line 2, column 1", ["'12:3'"]),
        ("[[chord]]\nat = '1:1'\nroot = 'H'", "line 3, column 1", ["'H' is not a pitch name"]),
        (
            "[[chord]]\nat = '1:1'\nroot = 'D'\n\n[[chord]]\nat = '2:1'\nquality = 'miner'",
            "line 7, column 1",
            ["did you mean 'minor'"],
        ),
        ("[[ratio]]\nat='1:1'\npart='A'\nratio='7'", "line 4, column 1", ["'7/4'"]),
        ("[[ratio]]\nat='1:1'\npart='A'\nratio='7/0'", "line 4, column 1", ["'7/4'"]),
        ("[tracks]\ncount_in = 1.5", "line 2, column 1", ["whole number of bars from 0 to 8"]),
        ("[tracks]\nclick = 'yes'", "line 2, column 1", ["true or false"]),
        ("[[chord]]\nat='1:1'\nroot='D'\nsounds='C4'", "line 4, column 1", ["before, here"]),
        ("parts = 3", "line 1, column 1", ["write [parts]"]),
    ],
)
def test_told_by_line_and_column(text: str, where: str, words: list[str]) -> None:
    with pytest.raises(UnreadableError) as caught:
        loads(text, FILE)
    assert where in caught.value.what
    for word in words:
        assert word in caught.value.what
    assert caught.value.where.file == str(FILE)


def test_all_mistakes_at_once_in_the_order_of_the_file() -> None:
    with pytest.raises(UnreadableError) as caught:
        loads("titel = 'x'\n[tuning]\nlimit = 5\n[[ratio]]\nat = '1:1'", FILE)
    what = caught.value.what
    assert what.index("line 1") < what.index("line 3") < what.index("line 4")


def test_no_toml() -> None:
    with pytest.raises(UnreadableError, match="line 2, column"):
        loads("title = 'x'\nroot = D\n", FILE)


@pytest.mark.parametrize("data", [b"\xff\xfe\x00", b"a = " + b"[" * 5000])
def test_damaged_files(tmp_path: Path, data: bytes) -> None:
    path = tmp_path / "x.choices.toml"
    path.write_bytes(data)
    with pytest.raises(UnreadableError):
        load(path)


def test_a_file_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(UnreadableError, match="cannot be read"):
        load(tmp_path / "none.toml")


WORDS = st.sampled_from(["a", "bb", '"c d"', "'e'", "at"])
VALUES = st.sampled_from(
    ["1", '"x # y"', "'''a\n[[b]]\nc = 1'''", '"""q"\n# no\n"""', "[1,\n 2, # [\n 3]", "{ a = 1 }"]
)


@given(
    st.lists(
        st.tuples(st.sampled_from(["", "[t{n}]", "[[u]]"]), st.lists(st.tuples(WORDS, VALUES))),
        max_size=6,
    )
)
def test_every_key_is_found_on_its_line(tables: list[tuple[str, list[tuple[str, str]]]]) -> None:
    """Against the text itself: what stands at a position is the key, also past odd strings."""
    lines: list[str] = []
    expected: dict[tuple[str | int, ...], int] = {}
    count = 0
    for number, (header, pairs) in enumerate(tables):
        path: tuple[str | int, ...]
        if header or number == 0:
            path = ("u", count) if header == "[[u]]" else (f"t{number}",) if header else ()
            count += header == "[[u]]"
            if header:
                lines.append(header.format(n=number))
                expected[path] = sum(line.count("\n") + 1 for line in lines)
        else:
            continue
        seen: set[str] = set()
        for key, value in pairs:
            plain = key.strip("\"'")
            if plain in seen or (not path and plain in ("u",)):
                continue
            seen.add(plain)
            lines.append(f"{key} = {value}  # so")
            before = sum(line.count("\n") + 1 for line in lines[:-1])
            expected[(*path, plain)] = before + 1
    text = "\n".join(lines)
    tomllib.loads(text)
    found = positions(text)
    assert {path: found[path].line for path in expected} == expected
