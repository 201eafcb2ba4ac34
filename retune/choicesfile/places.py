"""Where the decisions of a file stand in the score: bars and beats as written, then as played."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction

from retune.choices import Span
from retune.choicesfile.anchor import Anchor, Fit, Found, found_again, transposition_of
from retune.choicesfile.model import ChoicesFile, Entry
from retune.errors import Finding, Weight, WishError
from retune.score.excerpt import bar_range
from retune.score.model import Bar, Score, Transposition
from retune.score.moments import Moment, moments_of

_BAR_START = Fraction(0)
"""As a beat: the first moment of a bar, whichever it is."""


@dataclass(frozen=True, slots=True)
class Spot:
    """Where one decision stands now: its first moment, and its last bar's where it has bars.

    `fit` is the worse of the two; `last` is None for decisions at a bar and beat.
    """

    entry: Entry
    fit: Fit
    first: Moment | None
    last: Moment | None = None
    fixed: range | None = None
    """Bars as played that rehearsal letters name, which need no other anchor."""


@dataclass(frozen=True)
class Survey:
    """All decisions with their places, and the interval the piece was moved by."""

    file: ChoicesFile
    spots: tuple[Spot, ...]
    moved: Transposition

    def of(self, *tables: str) -> Iterator[Spot]:
        """Those of some tables that have a place."""
        for spot in self.spots:
            if spot.entry.table in tables and spot.fit is not Fit.GONE:
                yield spot


def survey(score: Score, file: ChoicesFile) -> Survey:
    """Find the place of every decision; `score` is as the file has it, not transposed on wish."""
    moments = moments_of(score)
    firsts, lasts = [], []
    for entry in file.entries:
        first, last = _anchors(score, entry)
        firsts.append(first)
        lasts.append(last)
    anchors = [one for one in (*firsts, *lasts) if one is not None]
    moved = transposition_of(moments, anchors)
    places = iter(found_again(moments, anchors, moved))
    first_found = [next(places) if one is not None else None for one in firsts]
    last_found = [next(places) if one is not None else None for one in lasts]
    spots = tuple(
        _spot(score, entry, first, last)
        for entry, first, last in zip(file.entries, first_found, last_found, strict=True)
    )
    return Survey(file, spots, moved)


def _anchors(score: Score, entry: Entry) -> tuple[Anchor | None, Anchor | None]:
    """What an entry is found by; neither where rehearsal letters name its bars."""
    if "at" in entry.values:
        bar, beat = entry.values["at"]
        return Anchor(bar, beat, entry.get("sounds")), None
    if _by_letters(score, entry) is not None:
        return None, None
    first, dash, last = entry.values["bars"].partition("-")
    begins = Anchor(first.strip(), _BAR_START, entry.get("sounds"))
    if not dash:
        return begins, None
    return begins, Anchor(last.strip(), _BAR_START, entry.get("ends"))


def _by_letters(score: Score, entry: Entry) -> range | None:
    """Bars as played named by rehearsal letters; None where numbers name them."""
    wish = entry.values["bars"]
    marks = {bar.rehearsal.strip().casefold() for bar in score.bars} - {""}
    numbers = {bar.number.casefold() for bar in score.bars}
    words = {word.strip().casefold() for word in wish.split("-", 1)}
    if not words <= marks | numbers or not words & (marks - numbers):
        return None
    try:
        return bar_range(score, wish)
    except WishError:
        return None


def _spot(score: Score, entry: Entry, first: Found | None, last: Found | None) -> Spot:
    if first is None:
        bars = _by_letters(score, entry)
        return Spot(entry, Fit.HOLDS, None, None, bars)
    fits = [first.fit] if last is None else [first.fit, last.fit]
    worst = max(fits, key=list(Fit).index)
    ends = first.moment if last is None else last.moment
    if "bars" not in entry.values:
        ends = None
    elif worst is not Fit.GONE and first.moment and ends and ends.written < first.moment.written:
        worst = Fit.GONE
    return Spot(entry, worst, first.moment, ends)


# --- as played -----------------------------------------------------------------------------


def onsets(score: Score, spot: Spot) -> Iterator[Fraction]:
    """Every time that a decision at a bar and beat comes, or the one it names."""
    if spot.first is None:
        return
    wanted = spot.entry.get("pass")
    for bar in score.bars:
        if bar.written == spot.first.written and wanted in (None, bar.run):
            yield bar.onset + spot.first.inside


def spans(score: Score, spot: Spot) -> Iterator[Span]:
    """Every time that a decision's bars come, each run of them as one span."""
    written = _written(score, spot)
    run: list[Bar] = []
    for bar in (*score.bars, None):
        if bar is not None and bar.written in written:
            run.append(bar)
        elif run:
            yield Span(run[0].onset, run[-1].end)
            run = []


def _written(score: Score, spot: Spot) -> frozenset[int]:
    """The bars of the file that a decision speaks of."""
    if spot.fixed is not None:
        return frozenset(score.bars[index].written for index in spot.fixed)
    if spot.first is None or spot.last is None:
        return frozenset()
    return frozenset(range(spot.first.written, spot.last.written + 1))


# --- what to tell --------------------------------------------------------------------------


def fit_findings(score: Score, survey: Survey) -> Iterator[Finding]:
    """What the director should know of each decision that is not where it was."""
    for spot in survey.spots:
        told = _told(score, spot)
        if told is not None:
            yield Finding(told[0], told[1], survey.file.place(spot.entry.line))
    if survey.moved.semitones:
        steps = survey.moved.semitones
        yield Finding(
            Weight.NOTE,
            f"the piece now stands {abs(steps)} semitone{'s' * (abs(steps) != 1)} "
            f"{'higher' if steps > 0 else 'lower'}; the choices follow it",
            survey.file.place(None),
        )


def _told(score: Score, spot: Spot) -> tuple[Weight, str] | None:
    what = f"this [[{spot.entry.table}]]"
    if spot.fit is Fit.MOVED:
        return Weight.NOTE, f"{what} follows its music from {stated(spot.entry)} to {now(spot)}"
    if spot.fit is Fit.CHANGED:
        return (
            Weight.DOUBT,
            f"{what} is kept at {stated(spot.entry)}, where something else sounds now",
        )
    if spot.fit is not Fit.GONE:
        return None
    if spot.entry.get("sounds") is None:
        numbers = [bar.number for bar in score.bars]
        there = f"; there are bars {numbers[0]} to {numbers[-1]}" if numbers else ""
        return Weight.LOSS, f"{what} has no place: no note at {stated(spot.entry)}{there}"
    near = ""
    if spot.first is not None:
        sounding = " ".join(pitch.name for pitch in spot.first.here)
        near = f"; nearest is {spot.first.at} ({sounding})"
    return Weight.LOSS, f"{what} no longer fits and was left out: its music is not there{near}"


def stated(entry: Entry) -> str:
    """Where an entry says that it stands."""
    if "at" in entry.values:
        from retune.score.moments import beat_text

        bar, beat = entry.values["at"]
        return f"{bar}:{beat_text(beat)}"
    return f"bars {entry.values['bars']}"


def now(spot: Spot) -> str:
    """Where it stands now."""
    if spot.first is None:
        return stated(spot.entry)
    if spot.last is None:
        return spot.first.at
    if spot.first.bar == spot.last.bar:
        return f"bars {spot.first.bar}"
    return f"bars {spot.first.bar}-{spot.last.bar}"


def anchors_of(entries: Sequence[Entry]) -> int:
    """How many entries bear what sounded at their place."""
    return sum("sounds" in entry.values for entry in entries)
