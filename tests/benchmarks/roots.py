"""Agreement of the harmonic analysis with human analysts, weighted by duration.

    python tests/benchmarks/roots.py                  the development set, as a table
    python tests/benchmarks/roots.py --compare        beside the last result
    python tests/benchmarks/roots.py --set check      the unseen pieces: look once, at the end

Measures
--------
* root: share of labelled time whose root's pitch class is the analyst's.
* supported: the same without the labels that the sounding notes contradict. A label is
  contradicted when at most one of its pitch classes sounds while two or more do, or when its
  root never sounds and fewer than all but one of its pitch classes do while more than two sound.
* quality: share of the time with a right root whose quality is exactly the analyst's, where the
  label is one of the ten qualities.
* baseline: the root that music21 gives each slice by itself.
"""

from __future__ import annotations

import argparse
import json
import sys
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

import corpus
import numpy as np
from corpus import Label, Piece
from music21 import chord as music21_chord

from retune.harmony import Harmony, analyse
from retune.score.model import Score
from retune.score.options import ReadOptions
from retune.score.read import read

RESULTS = Path(__file__).parent / "results" / "roots.json"
CONFIDENCES = (0.0, 0.5, 0.6, 0.7, 0.8, 0.9, 0.95, 0.99)


@dataclass
class Tally:
    """Quarter notes by outcome."""

    total: float = 0.0
    right: float = 0.0
    supported: float = 0.0
    supported_right: float = 0.0
    judged: float = 0.0
    exact: float = 0.0
    baseline: float = 0.0
    baseline_supported: float = 0.0
    by_confidence: Counter[float] = field(default_factory=Counter)
    right_by_confidence: Counter[float] = field(default_factory=Counter)
    confusions: Counter[str] = field(default_factory=Counter)
    qualities: Counter[str] = field(default_factory=Counter)

    def add(self, other: Tally) -> None:
        """Add another piece's outcome to this one."""
        for name in (
            "total", "right", "supported", "supported_right",
            "judged", "exact", "baseline", "baseline_supported",
        ):  # fmt: skip
            setattr(self, name, getattr(self, name) + getattr(other, name))
        for name in ("by_confidence", "right_by_confidence", "confusions", "qualities"):
            getattr(self, name).update(getattr(other, name))

    def figures(self) -> dict[str, float]:
        """Shares, 0 to 1."""
        return {
            "quarters": round(self.total, 2),
            "root": _share(self.right, self.total),
            "supported": _share(self.supported_right, self.supported),
            "quality": _share(self.exact, self.judged),
            "baseline": _share(self.baseline, self.total),
            "baseline supported": _share(self.baseline_supported, self.supported),
            "contradicted": _share(self.total - self.supported, self.total),
        }


def _share(part: float, whole: float) -> float:
    return round(part / whole, 4) if whole else 0.0


def is_supported(label: Label, sounding: set[int]) -> bool:
    """Whether the pitch classes that sound in a label's time allow it."""
    common = len(sounding & label.tones)
    if common <= 1 and len(sounding) >= 2:
        return False
    rootless = label.root not in sounding
    return not (rootless and common < len(label.tones) - 1 and len(sounding) > 2)


def slices_in(label: Label, time: np.ndarray) -> Iterator[tuple[int, float]]:
    """Slices that a label covers, with the quarter notes they share."""
    start, end = float(label.onset), float(label.end)
    first = max(int(np.searchsorted(time, start + 1e-9, side="right")) - 1, 0)
    for index in range(first, len(time) - 1):
        shared = min(end, time[index + 1]) - max(start, time[index])
        if shared <= 1e-9:
            return
        yield index, float(shared)


def baseline_root(score: Score, notes: tuple[int, ...]) -> int | None:
    """The root music21 finds for a slice by itself."""
    if not notes:
        return None
    keys = sorted({score.notes[i].pitch.key for i in notes})
    root = music21_chord.Chord(keys).root()
    return None if root is None else int(root.pitchClass)


def judge(score: Score, harmony: Harmony, labels: list[Label]) -> Tally:
    """Compare an analysis with a human one."""
    tally = Tally()
    time = np.array([float(s.onset) for s in harmony.slices] + [float(score.end)])
    chord_of = [chord for chord in harmony.chords for _ in range(chord.first, chord.last)]
    plain: dict[frozenset[int], int | None] = {}
    for label in labels:
        shared = list(slices_in(label, time))
        notes = {i for index, _ in shared for i in harmony.slices[index].notes}
        supported = is_supported(label, {score.notes[i].pitch.key % 12 for i in notes})
        for index, quarters in shared:
            chord = chord_of[index]
            root = None if chord.root is None else chord.root.chroma
            right = quarters * (root == label.root)
            sounding = harmony.slices[index].notes
            keys = frozenset(score.notes[i].pitch.key for i in sounding)
            if keys not in plain:
                plain[keys] = baseline_root(score, sounding)
            naive = quarters * (plain[keys] == label.root)
            tally.total += quarters
            tally.right += right
            tally.baseline += naive
            bin_ = max(c for c in CONFIDENCES if c <= chord.confidence + 1e-12)
            if supported:
                tally.supported += quarters
                tally.supported_right += right
                tally.baseline_supported += naive
                tally.by_confidence[bin_] += quarters
                tally.right_by_confidence[bin_] += right
            if not right:
                away = "silent" if root is None else f"+{(root - label.root) % 12}"
                tally.confusions[f"{label.figure} {away} {chord.quality}"] += quarters
            elif label.quality is not None:
                tally.judged += quarters
                tally.exact += quarters * (chord.quality == label.quality)
                if chord.quality != label.quality:
                    tally.qualities[f"{label.quality} as {chord.quality}"] += quarters
    return tally


def read_piece(piece: Piece) -> tuple[Score, list[Label]]:
    """A piece's score as written, and the human labels on it."""
    score = read(piece.score, ReadOptions(repeats=False))
    return score, corpus.read_labels(piece, score)


def table(rows: dict[str, dict[str, float]], last: dict[str, dict[str, float]]) -> str:
    """Figures as text, with the change since the last result where there is one."""
    names = list(next(iter(rows.values())))
    lines = ["  ".join([f"{'':14}", *(f"{name:>18}" for name in names)])]
    for piece, figures in rows.items():
        cells = [f"{piece:14}"]
        for name in names:
            before = last.get(piece, {}).get(name)
            change = "" if before is None else f" ({figures[name] - before:+.4f})"
            cells.append(f"{figures[name]:.4f}{change}".rjust(18))
        lines.append("  ".join(cells))
    return "\n".join(lines)


def calibration(tally: Tally) -> list[dict[str, float]]:
    """Agreement on supported time, of everything at or above each confidence."""
    rows = []
    for least in CONFIDENCES:
        kept = sum(v for c, v in tally.by_confidence.items() if c >= least)
        right = sum(v for c, v in tally.right_by_confidence.items() if c >= least)
        rows.append(
            {
                "confidence": least,
                "share of time": _share(kept, tally.supported),
                "agreement": _share(right, kept),
            }
        )
    return rows


def main() -> None:
    """Run the benchmark."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--set", choices=("dev", "check"), default="dev")
    parser.add_argument("--compare", action="store_true", help="show changes since the last run")
    parser.add_argument("--out", type=Path, default=RESULTS)
    wish = parser.parse_args()
    pieces = corpus.development() if wish.set == "dev" else corpus.check()
    stored = json.loads(wish.out.read_text("utf-8")) if wish.out.exists() else {}
    groups: dict[str, Tally] = {}
    rows: dict[str, dict[str, float]] = {}
    for piece in pieces:
        score, labels = read_piece(piece)
        tally = judge(score, analyse(score), labels)
        rows[piece.name] = tally.figures()
        groups.setdefault(piece.group, Tally()).add(tally)
    rows |= {group: tally.figures() for group, tally in groups.items()}
    last = stored.get(wish.set, {}).get("rows", {}) if wish.compare else {}
    print(table(rows, last))
    calibrations = {group: calibration(tally) for group, tally in groups.items()}
    for group, tally in groups.items():
        print(f"\n{group}: confidence, share of supported time at or above it, agreement")
        for row in calibrations[group]:
            print("  ".join(f"{value:8.4f}" for value in row.values()))
        print(f"\n{group}: labels with a wrong root, in quarter notes (root found above label's)")
        for name, quarters in tally.confusions.most_common(25):
            print(f"{quarters:8.2f}  {name}")
        print(f"\n{group}: right root, other quality, in quarter notes")
        for name, quarters in tally.qualities.most_common(12):
            print(f"{quarters:8.2f}  {name}")
    stored[wish.set] = {"rows": rows, "calibration": calibrations}
    wish.out.parent.mkdir(exist_ok=True)
    wish.out.write_text(json.dumps(stored, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    sys.exit(main())
