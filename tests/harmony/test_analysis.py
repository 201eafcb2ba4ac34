"""Hand-written progressions: what any harmony primer says of them."""

from __future__ import annotations

from fractions import Fraction

from retune.harmony import Harmony, analyse
from retune.pitch import Pitch
from retune.score.model import Bar, Note, Part, Score


def score_of(*voices: str, metre: tuple[int, int] = (4, 4)) -> Score:
    """Voices written as 'C5:1 D5:1/2 r:1', quarter notes, bars of one metre."""
    notes, longest = [], Fraction(0)
    for part, line in enumerate(voices):
        onset = Fraction(0)
        for word in line.split():
            name, _, length = word.partition(":")
            duration = Fraction(length or "1")
            if name != "r":
                notes.append(Note(part, onset, duration, Pitch.parse(name)))
            onset += duration
        longest = max(longest, onset)
    notes.sort(key=lambda note: (note.onset, note.part, note.pitch.key))
    bar = Fraction(4 * metre[0], metre[1])
    bars = tuple(Bar(i, i, str(i + 1), i * bar, bar, metre) for i in range(-int(-longest // bar)))
    parts = tuple(Part(i, f"Part {i + 1}") for i in range(len(voices)))
    return Score("invented", "", parts, tuple(notes), bars)


def roots(harmony: Harmony) -> list[str]:
    return [str(chord.root) if chord.root else "-" for chord in harmony.chords]


def qualities(harmony: Harmony) -> list[str]:
    return [str(chord.quality) for chord in harmony.chords]


def test_circle_progression() -> None:
    harmony = analyse(
        score_of("G4:2 A4:2 A4:2 G4:2 G4:4", "E4:2 E4:2 F4:2 D4:2 E4:4",
                 "C4:2 C4:2 D4:2 B3:2 C4:4", "C3:2 A2:2 D3:2 G2:2 C3:4")
    )  # fmt: skip
    assert roots(harmony) == ["C", "A", "D", "G", "C"]
    assert qualities(harmony) == ["major", "minor", "minor", "major", "major"]
    assert harmony.tonic.root.name == "C"
    assert not harmony.tonic.minor


def test_empty_score_has_no_chords() -> None:
    harmony = analyse(Score("empty", "", (), (), ()))
    assert harmony.chords == ()
    assert harmony.slices == ()


def test_silence_is_a_chord_without_root() -> None:
    harmony = analyse(
        score_of("r:4 C5:4 r:4 G4:4", "r:4 E4:4 r:4 D4:4", "r:4 G3:4 r:4 B3:4", "r:4 C3:4 r:4 G2:4")
    )
    assert roots(harmony) == ["-", "C", "-", "G"]
    assert harmony.chords[0].onset == 0
    assert harmony.chords[-1].end == 16
