"""Rows as CSV (RFC 4180): safe to open in a spreadsheet, exact to read by a program."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterable, Sequence
from functools import lru_cache

_RUNS = ("=", "+", "-", "@", "＝", "＋", "－", "＠", "\t", "\r", "\n")
_NUMBER = re.compile(r"[+-]?\d+(\.\d+)?")

Cell = str | int | float | None


def csv_bytes(header: Sequence[str], rows: Iterable[Sequence[Cell]], bom: bool = False) -> bytes:
    """A header and rows as UTF-8.

    Floats have six decimals, None is an empty cell. Text that a spreadsheet would run as a
    formula gets an apostrophe before it (OWASP, "CSV Injection"); numbers stay numbers.
    """
    out = io.StringIO(newline="")
    writer = csv.writer(out)
    writer.writerow(header)
    writer.writerows([_shown(cell) for cell in row] for row in rows)
    return out.getvalue().encode("utf-8-sig" if bom else "utf-8", "replace")


def _shown(cell: Cell) -> str | int | None:
    if isinstance(cell, str):
        return _safe(cell)
    return f"{cell:.6f}" if isinstance(cell, float) else cell


@lru_cache(maxsize=4096)
def _safe(text: str) -> str:
    if text.lstrip(" ").startswith(_RUNS) and not _NUMBER.fullmatch(text):
        return f"'{text}"
    return text
