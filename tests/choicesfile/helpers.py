"""What the tests of choices share: a score, a text of choices, what comes of both."""

from __future__ import annotations

from pathlib import Path

from retune.choicesfile.read import loads
from retune.pipeline import retuned
from retune.score.options import ReadOptions
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy

FIXTURES = Path(__file__).parents[2] / "fixtures"
HYMN = FIXTURES / "harbour-hymn.musicxml"
MOTET = FIXTURES / "tide-motet.musicxml"
STREET = FIXTURES / "lantern-street.musicxml"


def tuned_with(
    score: Path | bytes, text: str | None, policy: Policy | None = None, transpose: int = 0
) -> TunedScore:
    """A score tuned with choices; None for none."""
    file = None if text is None else loads(text, Path("test.choices.toml"))
    name = str(score) if isinstance(score, Path) else "score.musicxml"
    return retuned(score, name, ReadOptions(transpose=transpose), policy or Policy(), file)


def chord_rows(tuned: TunedScore) -> list[tuple[str, str, str | None, str]]:
    """Bar, beat, root and quality of every chord."""
    score = tuned.score
    return [
        (
            score.bar_at(chord.onset).number,
            str(score.beat_at(chord.onset)),
            chord.root.name if chord.root else None,
            str(chord.quality),
        )
        for chord in tuned.harmony.chords
    ]


def at(tuned: TunedScore, bar: str, beat: str) -> tuple[str | None, str]:
    """Root and quality of the chord that begins at a place."""
    return next((r, q) for b, t, r, q in chord_rows(tuned) if (b, t) == (bar, beat))
