"""Every kind of decision changes what it asks for, and nothing else.

What "nothing else" means is read off the note list's own terms: roots, qualities, roles and
ratios. Cents move a little everywhere, since the whole piece is solved at once.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path

import pytest

from retune.tuning.model import TunedScore
from tests.choicesfile.helpers import HYMN, STREET, at, chord_rows, tuned_with

PLAIN: dict[Path, TunedScore] = {}


def plain(path: Path) -> TunedScore:
    if path not in PLAIN:
        PLAIN[path] = tuned_with(path, None)
    return PLAIN[path]


def ratios(tuned: TunedScore) -> list[tuple[str, str, str, str, str]]:
    """Part, bar, beat, role and ratio of every segment."""
    score = tuned.score
    return [
        (
            score.parts[one.note.part].name,
            score.bar_at(segment.onset).number,
            str(score.beat_at(segment.onset)),
            str(segment.role),
            str(segment.ratio),
        )
        for one in tuned.notes
        for segment in one.segments
    ]


@dataclass(frozen=True)
class Edit:
    """Choices, and the bars whose chords and whose ratios may change by them."""

    name: str
    score: Path
    text: str
    bars: tuple[str, ...]
    check: Callable[[TunedScore], None]


def _root_of_9(tuned: TunedScore) -> None:
    assert at(tuned, "9", "1") == ("Ab", "major seventh")
    chord = next(c for c in tuned.harmony.chords if tuned.score.bar_at(c.onset).number == "9")
    assert chord.decided
    assert chord.confidence == 1.0


def _quality_of_6(tuned: TunedScore) -> None:
    assert at(tuned, "6", "3") == ("F", "minor")


def _both_of_6(tuned: TunedScore) -> None:
    assert at(tuned, "6", "3") == ("Ab", "major")


def _half_of_1(tuned: TunedScore) -> None:
    assert at(tuned, "5", "1") == ("E", "diminished")
    assert at(tuned, "5", "3") == ("C", "dominant seventh")


def _natural(bar: str, beat: str) -> Callable[[TunedScore], None]:
    """The chord's seventh is 7/4, 968.826 cents (handbook, methods.md: 7/4)."""

    def check(tuned: TunedScore) -> None:
        found = [r for p, b, t, _, r in ratios(tuned) if (b, t) == (bar, beat)]
        assert "7/4" in found
        score = tuned.score
        for one in tuned.notes:
            for segment in one.segments:
                place = (score.bar_at(segment.onset).number, str(score.beat_at(segment.onset)))
                if place == (bar, beat) and segment.ratio == Fraction(7, 4):
                    root = tuned.root_cents[segment.chord]
                    assert root is not None
                    above = segment.cents - root + 1000.0
                    assert above == pytest.approx(968.826, abs=1.0)

    return check


EDITS = [
    Edit("root", HYMN, '[[chord]]\nat = "9:1"\nroot = "Ab"', ("9",), _root_of_9),
    Edit("quality", HYMN, '[[chord]]\nat = "6:3"\nquality = "minor"', ("6",), _quality_of_6),
    Edit(
        "root and quality",
        HYMN,
        '[[chord]]\nat = "6:3"\nroot = "Ab"\nquality = "major"',
        ("6",),
        _both_of_6,
    ),
    Edit(
        "part of a chord",
        STREET,
        '[[chord]]\nat = "5:1"\nbeats = 2\nroot = "E"\nquality = "diminished"',
        ("5",),
        _half_of_1,
    ),
    Edit(
        "limit of a chord", HYMN, '[[chord]]\nat = "12:3"\nlimit = 7', ("12",), _natural("12", "3")
    ),
    Edit(
        "limit of a passage",
        HYMN,
        '[[passage]]\nbars = "12"\nprime_limit = 7',
        ("12",),
        _natural("12", "3"),
    ),
]


@pytest.mark.parametrize("edit", EDITS, ids=lambda edit: edit.name)
def test_a_decision_changes_its_own_bars_alone(edit: Edit) -> None:
    before, after = plain(edit.score), tuned_with(edit.score, edit.text)
    edit.check(after)
    assert not [f for f in after.score.findings if "choices" in str(f.where)]

    def elsewhere(rows: list[tuple[str, ...]], bar: int) -> list[tuple[str, ...]]:
        return [row for row in rows if row[bar] not in edit.bars]

    assert elsewhere(chord_rows(before), 0) == elsewhere(chord_rows(after), 0)  # type: ignore[arg-type]
    assert elsewhere(ratios(before), 1) == elsewhere(ratios(after), 1)  # type: ignore[arg-type]
    assert ratios(before) != ratios(after)


def _changed(before: TunedScore, after: TunedScore) -> set[tuple[str, str]]:
    """Parts and bars whose ratios differ."""
    changed = set(ratios(before)) ^ set(ratios(after))
    return {(part, bar) for part, bar, *_ in changed}


def test_a_ratio_changes_one_note_of_one_part() -> None:
    text = '[[ratio]]\nat = "9:3"\npart = "Alto"\nratio = "16/9"'
    before = plain(HYMN)
    rows = [row for row in ratios(before) if row[1:3] == ("9", "3")]
    assert [row for row in rows if row[4] == "9/5"], "the seventh is 9/5 without choices"
    part = next(row[0] for row in rows if row[4] == "9/5")
    after = tuned_with(HYMN, text.replace("Alto", part))
    assert _changed(before, after) == {(part, "9")}
    segment = next(
        s
        for n in after.notes
        for s in n.segments
        if after.score.parts[n.note.part].name == part
        and after.score.bar_at(s.onset).number == "9"
        and s.ratio == Fraction(16, 9)
    )
    root = after.root_cents[segment.chord]
    assert root is not None
    # 16/9 is 996.090 cents (handbook, methods.md).
    assert segment.cents - root + 1000.0 == pytest.approx(996.090, abs=0.5)


def test_a_natural_seventh_by_its_ratio_in_limit_5() -> None:
    rows = [
        row for row in ratios(plain(STREET)) if row[1:3] == ("5", "1") and row[4] in ("9/5", "16/9")
    ]
    part = rows[0][0]
    text = f'[[ratio]]\nat = "5:1"\npart = "{part}"\nratio = "7/4"'
    after = tuned_with(STREET, text)
    (segment, key) = next(
        (s, n.note.pitch.key) for n in after.notes for s in n.segments if s.ratio == Fraction(7, 4)
    )
    root = after.root_cents[segment.chord]
    chord = after.harmony.chords[segment.chord]
    assert root is not None
    assert chord.root is not None
    size = segment.cents - root + 100.0 * ((key - chord.root.chroma) % 12)
    assert size == pytest.approx(968.826, abs=1.0)
    assert {bar for _, bar in _changed(plain(STREET), after)} == {"5"}


def test_title_and_reference() -> None:
    after = tuned_with(HYMN, 'title = "For Sunday"')
    assert after.score.title == "For Sunday"
    assert ratios(after) == ratios(plain(HYMN))


def test_parts_get_names_and_an_order() -> None:
    text = '[parts]\norder = ["Bass", "Alto"]\nnames = { "Alto" = "Mezzo" }'
    after = tuned_with(HYMN, text)
    assert [part.name for part in after.score.parts] == ["Bass", "Mezzo", "Soprano", "Tenor"]
    before = plain(HYMN)

    def line(tuned: TunedScore, name: str) -> list[tuple[Fraction, int, str]]:
        index = next(p.index for p in tuned.score.parts if p.name == name)
        return [
            (n.note.onset, n.note.pitch.key, str(s.ratio))
            for n in tuned.notes
            if n.note.part == index
            for s in n.segments
        ]

    assert line(after, "Mezzo") == line(before, "Alto")
    assert line(after, "Bass") == line(before, "Bass")


def test_an_accompaniment_keeps_its_pitch() -> None:
    after = tuned_with(HYMN, '[parts]\naccompaniment = ["Bass"]')
    bass = next(part for part in after.score.parts if part.name == "Bass")
    assert not bass.tuned
    assert all(s.cents == 0.0 for n in after.notes if n.note.part == bass.index for s in n.segments)


def test_a_doubled_part_is_left_out() -> None:
    after = tuned_with(HYMN, '[parts]\ndoubled = ["Tenor"]')
    assert [part.name for part in after.score.parts] == ["Soprano", "Alto", "Bass"]
    assert "Tenor" in after.score.left_out


def test_the_melody_is_kept_smoothest() -> None:
    def unrest(tuned: TunedScore) -> float:
        return sum(
            abs(b.cents - a.cents)
            for n in tuned.notes
            if tuned.score.parts[n.note.part].name == "Soprano"
            for a, b in zip(n.segments, n.segments[1:], strict=False)
        )

    after = tuned_with(HYMN, '[parts]\nmelody = "Soprano"')
    assert after.policy.melody == "Soprano"
    assert unrest(after) < unrest(plain(HYMN))


def test_a_passage_holds_its_notes_still() -> None:
    after = tuned_with(HYMN, '[[passage]]\nbars = "1-26"\nheld_shift = "none"')
    assert after.figures["held_shift"]["greatest_cents"] == pytest.approx(0.0, abs=1e-3)
    assert plain(HYMN).figures["held_shift"]["greatest_cents"] > 0.01


def test_everything_is_tuned_to_a_pedal() -> None:
    """Whatever sounds the pedal's pitch class stands still, where the pedal was put."""
    text = '[[pedal]]\nbars = "17-20"\npitch = "Eb"\ncents = 7.0'
    after = tuned_with(HYMN, text)
    score = after.score
    own = [
        s.cents
        for n in after.notes
        for s in n.segments
        if 17 <= int(score.bar_at(s.onset).number or 0) <= 20 and n.note.pitch.key % 12 == 3
    ]
    assert own
    assert all(cents == pytest.approx(7.0, abs=0.5) for cents in own)


def test_the_pitch_centre_is_set_anew() -> None:
    """Pure steps carry the pitch away; from the bar named on the tonic is at home again."""
    from retune.tuning.policy import Drift, Policy

    policy = Policy(drift=Drift.FOLLOW)
    far = tuned_with(HYMN, None, policy)
    near = tuned_with(HYMN, '[[centre]]\nat = "17:1"\ncents = 3.0', policy)

    def root(tuned: TunedScore, bar: str) -> float:
        chord = next(c for c in tuned.harmony.chords if tuned.score.bar_at(c.onset).number == bar)
        cents = tuned.root_cents[chord.index]
        assert cents is not None
        return cents

    assert abs(root(far, "17")) > 10.0
    # Bar 17 begins on the tonic.
    assert root(near, "17") == pytest.approx(3.0, abs=0.6)
    assert root(near, "1") == pytest.approx(root(far, "1"), abs=0.01)


def test_a_tempo_from_a_place_on() -> None:
    after = tuned_with(HYMN, '[[tempo]]\nat = "5:1"\nbeats = 30')
    score, bar = after.score, next(b for b in after.score.bars if b.number == "5")
    beat = bar.counted_beat
    length = after.seconds(bar.onset + beat) - after.seconds(bar.onset)
    assert length == pytest.approx(2.0)
    before = plain(HYMN)
    first = score.bars[0]
    assert after.seconds(first.end) == pytest.approx(before.seconds(first.end))


def test_a_fermata_of_its_own_and_one_taken_away() -> None:
    before = plain(HYMN)
    bar = next(b for b in before.score.bars if b.number == "2")
    held = tuned_with(HYMN, '[[fermata]]\nat = "2:1"\nhold = 3.0')
    spans = [t.seconds(bar.onset + 1) - t.seconds(bar.onset) for t in (before, held)]
    assert spans[1] == pytest.approx(3.0 * spans[0])
    # The hymn's own fermatas stand on its last bar.
    last = before.score.bars[-1]
    free = tuned_with(HYMN, f'[[fermata]]\nat = "{last.number}:1"\nhold = 1')
    lengths = [t.seconds(last.end) - t.seconds(last.onset) for t in (before, free)]
    assert lengths[1] < lengths[0]


def test_a_breath_before_a_place() -> None:
    after = tuned_with(HYMN, '[[breath]]\nat = "3:1"\nparts = ["Alto"]')
    bar = next(b for b in after.score.bars if b.number == "3")
    marked = [n for n in after.score.notes if "breath" in n.marks]
    fresh = [n for n in marked if n not in plain(HYMN).score.notes]
    assert {after.score.parts[n.part].name for n in fresh} == {"Alto"}
    assert all(n.end == bar.onset for n in fresh)


def test_notes_to_singers_stand_at_their_bars() -> None:
    text = '[[note_to_singers]]\nbars = "5-6"\nparts = ["Tenor"]\ntext = "Listen to the bass."'
    after = tuned_with(HYMN, text)
    (told,) = after.score.singer_notes
    bars = {b.number: b for b in after.score.bars}
    assert (told.onset, told.end) == (bars["5"].onset, bars["6"].end)
    assert told.parts == (2,)
    assert told.text == "Listen to the bass."


def test_a_ratio_that_cannot_be_sung_is_told_by_its_line() -> None:
    after = tuned_with(HYMN, '# so\n[[ratio]]\nat = "1:1"\npart = "Bass"\nratio = "7/4"')
    (told,) = [f for f in after.findings if f.weight == "loss"]
    assert "line 2" in str(told.where)
    assert "7/4" in told.what
