"""Choices made for a score hold after it was changed and exported anew.

The changed scores are made here by editing the fixture's XML, apart from the tool.
"""

from __future__ import annotations

import copy
from pathlib import Path

import pytest
from lxml import etree

from retune.choicesfile.anchor import Fit
from retune.choicesfile.direct import directed
from retune.choicesfile.proposals import proposed
from retune.choicesfile.read import loads
from retune.choicesfile.update import updated
from retune.errors import Finding
from retune.score.options import ReadOptions
from retune.score.read import read_bytes
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.choicesfile.helpers import HYMN, STREET, at, chord_rows, tuned_with

CHOICES = """
title = "Kept"  # and its comment too

[tuning]
tonic = "Eb"

[parts.begins]
"Alto" = "Eb4 Eb4 F4 F4 G4 G4 Ab4 F4"

[[chord]]
at = "9:1"
root = "Ab"      # heard so
quality = "major seventh"

[[ratio]]
at = "12:3"
part = "Bass"
ratio = "7/4"

[[passage]]
bars = "13-16"
prime_limit = 7

[[note_to_singers]]
bars = "20"
parts = ["Alto"]
text = "Hold it still."
"""


def _fifths_up(pitch: etree._Element, fifths: int, semitones: int) -> None:
    """Move a pitch along the line of fifths."""
    step, alter = pitch.findtext("step"), int(pitch.findtext("alter") or 0)
    octave = int(pitch.findtext("octave") or 0)
    place = "FCGDAEB".index(step or "C") + 7 * alter + fifths
    semis = {"C": 0, "D": 2, "E": 4, "F": 5, "G": 7, "A": 9, "B": 11}
    key = 12 * (octave + 1) + semis[step or "C"] + alter + semitones
    new_alter, index = divmod(place, 7)
    new_step = "FCGDAEB"[index]
    new_octave = (key - new_alter - semis[new_step]) // 12 - 1
    for child in list(pitch):
        pitch.remove(child)
    etree.SubElement(pitch, "step").text = new_step
    if new_alter:
        etree.SubElement(pitch, "alter").text = str(new_alter)
    etree.SubElement(pitch, "octave").text = str(new_octave)


def tone_higher(root: etree._Element) -> None:
    for pitch in root.iter("pitch"):
        _fifths_up(pitch, 2, 2)


def with_bars(root: etree._Element) -> None:
    """Bars 3 and 4 once more after bar 4, and all numbered anew."""
    for part in root.findall("part"):
        bars = part.findall("measure")
        for bar in reversed(bars[2:4]):
            bars[3].addnext(copy.deepcopy(bar))
        for number, bar in enumerate(part.findall("measure"), 1):
            bar.set("number", str(number))


def without_bars(root: etree._Element) -> None:
    """Bars 8 to 10 cut."""
    for part in root.findall("part"):
        for bar in part.findall("measure")[7:10]:
            part.remove(bar)
        for number, bar in enumerate(part.findall("measure"), 1):
            bar.set("number", str(number))


def changed(*edits) -> bytes:  # type: ignore[no-untyped-def]  # functions on XML
    root = etree.fromstring(HYMN.read_bytes())
    for edit in edits:
        edit(root)
    found: bytes = etree.tostring(root)
    return found


def anchored() -> str:
    """The choices with their anchors written, as `retune choices --update` does."""
    return brought_up(HYMN.read_bytes(), CHOICES)[0]


def brought_up(score: bytes, text: str) -> tuple[str, object]:
    file = loads(text, Path("x.choices.toml"))

    def read(options: ReadOptions):  # type: ignore[no-untyped-def]
        return read_bytes(score, "x.musicxml", options)

    wish = directed(read, ReadOptions(), Policy(), file)
    return updated(read(ReadOptions()), wish).text, wish


def lost(tuned: TunedScore) -> list[Finding]:
    """Decisions that were left out."""
    found = (*tuned.score.findings, *tuned.findings)
    return [f for f in found if f.weight == "loss" and "choices.toml" in str(f.where)]


def test_anchors_are_written_and_the_rest_is_left() -> None:
    text = anchored()
    assert text.count("sounds = ") == 4
    assert text.count("ends = ") == 1
    assert "# and its comment too" in text
    assert "# heard so" in text
    # Without the anchors and first notes, line by line what it was.
    kept = [line for line in text.splitlines() if not line.startswith(("sounds", "ends"))]
    start = text.splitlines().index("[parts.begins]")
    assert kept[:start] == CHOICES.splitlines()[:start]
    assert anchored() == brought_up(HYMN.read_bytes(), text)[0]


def test_a_file_up_to_date_changes_nothing_more() -> None:
    text = anchored()
    one, other = tuned_with(HYMN, CHOICES), tuned_with(HYMN, text)
    assert [s.cents for n in one.notes for s in n.segments] == [
        s.cents for n in other.notes for s in n.segments
    ]


@pytest.mark.parametrize(
    ("edits", "bar", "root", "seventh_bar", "told", "title"),
    [
        ((with_bars,), "11", "Ab", "14", "22", "Kept"),
        ((tone_higher,), "9", "Bb", "12", "20", "Kept"),
        ((with_bars, tone_higher), "11", "Bb", "14", "22", "Kept"),
    ],
    ids=["bars inserted", "transposed", "both"],
)
def test_decisions_follow_their_music(
    edits: tuple[object, ...], bar: str, root: str, seventh_bar: str, told: str, title: str
) -> None:
    score = changed(*edits)
    tuned = tuned_with(score, anchored())
    assert tuned.score.title == title
    assert at(tuned, bar, "1") == (root, "major seventh")
    decided = [c for c in tuned.harmony.chords if c.decided]
    assert {tuned.score.bar_at(c.onset).number for c in decided} == {bar}
    bass = next(p.index for p in tuned.score.parts if p.name == "Bass")
    natural = {
        tuned.score.bar_at(s.onset).number
        for n in tuned.notes
        if n.note.part == bass
        for s in n.segments
        if str(s.ratio) == "7/4"
    }
    assert seventh_bar in natural
    (note,) = tuned.score.singer_notes
    assert tuned.score.bar_at(note.onset).number == told
    assert [tuned.score.parts[p].name for p in note.parts] == ["Alto"]
    assert not lost(tuned)
    # Brought up to date, the file says itself what it was led to.
    text, _ = brought_up(score, anchored())
    assert f'at = "{bar}:1"' in text
    again = tuned_with(score, text)
    assert chord_rows(again) == chord_rows(tuned)
    assert not [f for f in again.score.findings if "choices" in str(f.where)]


def test_the_tonic_of_the_file_follows_a_transposed_piece() -> None:
    assert tuned_with(changed(tone_higher), anchored()).policy.tonic.name == "F"  # type: ignore[union-attr]


def test_choices_are_spelled_as_the_file_when_transposed_on_wish() -> None:
    tuned = tuned_with(HYMN, anchored(), transpose=2)
    assert at(tuned, "9", "1") == ("Bb", "major seventh")
    assert tuned.policy.tonic is not None
    assert tuned.policy.tonic.name == "F"


def test_a_decision_whose_music_is_gone_is_told_by_line_with_the_nearest_place() -> None:
    text = anchored()
    tuned = tuned_with(changed(without_bars), text)
    losses = lost(tuned)
    line = text.splitlines().index("[[chord]]") + 1
    (told,) = [f for f in losses if f"line {line}" in str(f.where)]
    assert "no longer fits" in told.what
    assert "nearest is" in told.what
    assert not [c for c in tuned.harmony.chords if c.decided]
    # What is still there holds, three bars earlier.
    (note,) = tuned.score.singer_notes
    assert tuned.score.bar_at(note.onset).number == "17"
    # And the update leaves the lost one as it was.
    after, wish = brought_up(changed(without_bars), text)
    assert 'at = "9:1"' in after
    fits = {s.entry.table: s.fit for s in wish.survey.spots}  # type: ignore[attr-defined]
    assert fits["chord"] is Fit.GONE
    assert fits["note_to_singers"] is Fit.MOVED


def test_a_place_that_is_not_there_is_told() -> None:
    tuned = tuned_with(HYMN, '[[chord]]\nat = "99:1"\nroot = "D"')
    (told,) = lost(tuned)
    assert "99:1" in told.what
    assert "bars 1 to 26" in told.what


def test_bars_in_which_the_organ_plays_alone_have_their_places() -> None:
    path = HYMN.with_name("lamp-night.musicxml")
    text = '[[tempo]]\nat = "2:1"\nbeats = 30\n[[note_to_singers]]\nbars = "1-2"\ntext = "Wait."'
    tuned = tuned_with(path, text)
    assert not lost(tuned)
    bar = next(b for b in tuned.score.bars if b.number == "2")
    voices = {p.index for p in tuned.score.parts if p.tuned}
    assert not [n for n in tuned.score.notes if n.part in voices and n.onset < bar.end]
    beat = tuned.seconds(bar.onset + bar.counted_beat) - tuned.seconds(bar.onset)
    assert beat == pytest.approx(2.0)
    assert [note.text for note in tuned.score.singer_notes] == ["Wait."]


def test_a_part_that_is_not_there_is_told_with_a_guess() -> None:
    tuned = tuned_with(HYMN, '[parts]\naccompaniment = ["Tenro"]')
    (told,) = lost(tuned)
    assert "Tenro" in told.what
    assert "did you mean 'Tenor'" in told.what
    assert "line 2" in str(told.where)


@pytest.mark.parametrize("path", sorted(HYMN.parent.glob("*.m*x*l")), ids=lambda p: p.name)
def test_proposals_change_nothing_asleep_and_are_valid_awake(path: Path) -> None:
    before = tuned_with(path, None)
    text = proposed(before)
    after = tuned_with(path, text)
    assert [s.cents for n in before.notes for s in n.segments] == [
        s.cents for n in after.notes for s in n.segments
    ]
    assert chord_rows(before) == chord_rows(after)
    # Each block by itself, its # taken away, is read and heeded.
    blocks = [
        b
        for b in text.split("\n\n")
        if b.lstrip("#0123456789").count("\n# [[") or "\n# [[" in f"\n{b}"
    ]
    assert len(blocks) >= 9
    for block in blocks:
        lines = block.splitlines()
        start = next(i for i, line in enumerate(lines) if line.startswith("# [["))
        awake = "\n".join(line.removeprefix("# ") for line in lines[start:])
        file = loads(awake, Path("x.toml"))
        assert len(file.entries) == 1


def test_waking_a_doubtful_chord_takes_the_next_reading() -> None:
    from tests.choicesfile.helpers import MOTET

    text = proposed(tuned_with(MOTET, None))
    block = next(b for b in text.split("\n\n") if "# [[chord]]" in b)
    awake = "\n".join(
        line.removeprefix("# ") if i else line for i, line in enumerate(block.splitlines())
    )
    tuned = tuned_with(MOTET, text.replace(block, awake))
    assert at(tuned, "9", "2") == ("C", "major")


def test_a_renamed_part_is_known_by_its_first_notes() -> None:
    """Lead becomes Melodist, in a piece that was moved up a tone besides."""
    text = """
[parts]
melody = "Lead"
order = ["Lead"]

[[ratio]]
at = "5:1"
part = "Baritone"
ratio = "7/4"

[[breath]]
at = "9:1"
parts = ["Lead", "Bass"]
"""
    anchored, _ = brought_up(STREET.read_bytes(), text)
    assert '\nLead = "A3 ' in anchored
    root = etree.fromstring(STREET.read_bytes())
    for name in root.iter("part-name"):
        name.text = {"Lead": "Melodist", "Baritone": "Third man"}.get(name.text or "", name.text)
    tone_higher(root)
    score: bytes = etree.tostring(root)
    tuned = tuned_with(score, anchored)
    names = [part.name for part in tuned.score.parts]
    assert names == ["Melodist", "Tenor", "Third man", "Bass"]
    assert tuned.policy.melody == "Melodist"
    assert not lost(tuned)
    assert any(str(s.ratio) == "7/4" for n in tuned.notes if n.note.part == 2 for s in n.segments)
    assert {f.what for f in tuned.score.findings if "is called" in f.what} == {
        "the part 'Lead' is called 'Melodist' now; its choices follow it",
        "the part 'Baritone' is called 'Third man' now; its choices follow it",
    }
    fresh, _ = brought_up(score, anchored)
    assert "Lead" not in fresh
    assert 'part = "Third man"' in fresh
    assert 'parts = ["Melodist", "Bass"]' in fresh
