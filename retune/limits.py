"""How large an input may be: a guard against bombs, loops and mistaken files."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Limits:
    """The largest input that is accepted; whoever goes past one raises `LimitError`.

    Parameters
    ----------
    max_bytes : int
        Bytes of a file as read, and of its contents once unzipped.
    max_notes : int
        Noteheads in the file, and notes once repeats are played out.
    max_seconds : float
        Playing time once repeats are played out.
    """

    max_bytes: int = 200 * 1024 * 1024
    max_notes: int = 1_000_000
    max_seconds: float = 4 * 3600.0
