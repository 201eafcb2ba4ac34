"""The figures of a run in a director's words."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator
from typing import Any

import click

from retune.tuning.model import TunedScore

_LABEL = 13


def _cents(value: float) -> str:
    return f"{abs(value):.1f} cent{'' if f'{abs(value):.1f}' == '1.0' else 's'}"


def _purity(figures: dict[str, Any]) -> str:
    return (
        f"thirds, fifths and sixths lie {_cents(figures['mean_cents'])} from just on average "
        f"({figures['equal_temperament_mean_cents']:.1f} in equal temperament); triads are "
        f"within 1 cent for {figures['triad_time_within_1_cent']:.1%} of their time "
        f"({figures['equal_temperament_triad_time_within_1_cent']:.1%})"
    )


def _held(figures: dict[str, Any]) -> str:
    if not figures["held_notes"]:
        return "no note is held over a change of chord"
    if figures["greatest_cents"] < 0.05:
        return f"{figures['held_notes']} notes are held over a change, and none moves"
    return (
        f"{figures['held_notes']} held over a change; they move {_cents(figures['mean_cents'])} "
        f"on average, {figures['greatest_cents']:.1f} at most (bar {figures['bar']})"
    )


def _melody(figures: dict[str, Any]) -> str:
    return (
        f"steps lie {_cents(figures['mean_cents'])} from just steps on average, "
        f"{figures['over_10_cents']:.1%} by more than 10; "
        f"{figures['repeated_over_5_cents']:.1%} of repeated notes return more than 5 cents off"
    )


def _direction(cents: float, none: str) -> str:
    if abs(cents) < 0.05:
        return none
    return f"{_cents(cents)} {'sharp' if cents > 0 else 'flat'}"


def _drift(figures: dict[str, Any], tonic: str) -> str:
    if not figures["tonic_chords"]:
        return f"{tonic} is never the root of a chord, so its drift cannot be measured"
    greatest = _direction(figures["greatest_cents"], "")
    if not greatest:
        return f"{tonic} stays where it began"
    final = _direction(figures["final_cents"], "where it began")
    return f"{tonic} strays at most {greatest} (bar {figures['bar']}) and ends {final}"


def figures(tuned: TunedScore, columns: int) -> Iterator[str]:
    """The figures in lines no wider than `columns`."""
    found = tuned.figures
    rows = (
        ("Purity", _purity(found["purity"])),
        ("Held notes", _held(found["held_shift"])),
        ("Melody", _melody(found["melody"])),
        ("Home note", _drift(found["drift"], tuned.harmony.tonic.root.name)),
    )
    for label, words in rows:
        lines = textwrap.wrap(words, columns - _LABEL - 1)
        yield click.style(f" {label:<{_LABEL}}", bold=True) + lines[0]
        yield from (" " * (_LABEL + 1) + line for line in lines[1:])
