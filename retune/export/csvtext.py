"""Rows as CSV (RFC 4180): safe to open in a spreadsheet, exact to read by a program.

Every text that comes from a score goes through `text_cell`, every float through `number_cell`.
"""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterable, Sequence
from functools import lru_cache

from retune.export.places import DECIMALS

_RUNS = ("=", "+", "-", "@", "＝", "＋", "－", "＠", "\t", "\r", "\n")
_NUMBER = re.compile(r"[+-]?\d+(\.\d+)?")

Cell = str | int | None


@lru_cache(maxsize=4096)
def text_cell(text: str) -> str:
    """Text with an apostrophe before it where a spreadsheet would run it as a formula.

    Numbers stay numbers. Source: OWASP, "CSV Injection".

    >>> text_cell("=1+1"), text_cell("-3"), text_cell("Lan-")
    ("'=1+1", '-3', 'Lan-')
    """
    if text.lstrip(" ").startswith(_RUNS) and not _NUMBER.fullmatch(text):
        return f"'{text}"
    return text


def number_cell(value: float) -> str:
    """A float with six decimals."""
    return f"{value:.{DECIMALS}f}"


def csv_bytes(header: Sequence[str], rows: Iterable[Sequence[Cell]], bom: bool = False) -> bytes:
    """A header and rows as UTF-8; None is an empty cell. `bom` puts a byte order mark first."""
    out = io.StringIO(newline="")
    writer = csv.writer(out)
    writer.writerow(header)
    writer.writerows(rows)
    return out.getvalue().encode("utf-8-sig" if bom else "utf-8", "replace")
