"""The figures of the tuned pitches, policy by policy, beside other tunings.

    python tests/benchmarks/tuning.py [--quick] [--compare] [--speed]

Thirty chorales, six madrigals of Monteverdi's third book and four movements of Palestrina from
music21's corpus. Prints a table of means over the pieces and writes results/tuning.json;
`--compare` prints the changes from the file instead of writing it.
"""

from __future__ import annotations

import argparse
import json
import resource
import sys
import time
from collections.abc import Callable
from dataclasses import asdict, replace
from pathlib import Path

from music21 import corpus

sys.path.insert(0, str(Path(__file__).parent))

from tuning_measures import Measured, Pitching, Tally, measure
from tuning_rivals import best_scale, chained, equal

import retune
from retune.harmony.model import Harmony
from retune.score.model import PartKind, Score
from retune.tuning.policy import Drift, Policy, Pull, Temperament

RESULTS = Path(__file__).parent / "results" / "tuning.json"
CHORALES = [f"bach/bwv{number}" for number in range(253, 283)]
MADRIGALS = [f"monteverdi/madrigal.3.{number}" for number in range(1, 7)]
PALESTRINA = [
    f"palestrina/{name}" for name in ("Agnus_02", "Kyrie_02", "Sanctus_02_a", "Gloria_02")
]
QUICK = [*CHORALES[:4], MADRIGALS[0], PALESTRINA[0]]

POLICIES: dict[str, Policy] = {
    "gentle (default)": Policy(),
    "anchored": Policy(drift=Drift.ANCHORED),
    "within 22": Policy(drift=Drift.WITHIN),
    "follow": Policy(drift=Drift.FOLLOW),
    "gentle, held none": Policy(held_shift=0.0),
    "gentle, held 3": Policy(held_shift=3.0),
    "gentle, held any": Policy(held_shift=float("inf")),
    "prime limit 7": Policy(prime_limit=7),
    "prime limit 3": Policy(prime_limit=3),
    "pythagorean": Policy(temperament=Temperament.PYTHAGOREAN),
    "meantone": Policy(temperament=Temperament.MEANTONE),
}
ACCOMPANIED: dict[str, Policy] = {
    "equal, roots drawn": Policy(),
    "equal, all drawn": Policy(accompaniment_pull=Pull.ALL),
    "meantone, roots drawn": Policy(accompaniment_tuning=None),
    "meantone, all drawn": Policy(accompaniment_tuning=None, accompaniment_pull=Pull.ALL),
}
RIVALS: dict[str, Callable[[Score, Harmony], Pitching]] = {
    "equal temperament": equal,
    "best fixed just scale": best_scale,
    "chained by common tones": chained,
}
COLUMNS = (
    ("vk_mean", "VK mean", "7.3f"),
    ("vk_rms", "rms", "6.3f"),
    ("vx_mean", "VX mean", "7.3f"),
    ("vx_rms", "rms", "6.3f"),
    ("vx_within_1", "<=1c %", "6.2f"),
    ("held_mean", "held", "6.3f"),
    ("held_most", "most", "7.3f"),
    ("held_over_5", ">5c", "5.0f"),
    ("melody_mean", "melody", "6.3f"),
    ("melody_over_10", ">10c %", "6.2f"),
    ("repeated_over_5", "rep>5 %", "7.2f"),
    ("drift_most", "drift", "6.2f"),
    ("drift_worst", "worst", "6.1f"),
    ("drift_end", "end", "6.2f"),
)


def tuned_pitching(score: Score, harmony: Harmony, policy: Policy) -> Pitching:
    """The stretches of every note of a tuned score."""
    tuned = retune.tune(score, harmony, policy)
    return [[(s.onset, s.end, s.cents) for s in note.segments] for note in tuned.notes]


def pooled(pieces: list[Measured]) -> dict[str, float]:
    """Means over the pieces; of held shifts the greatest and the count, of drift the worst too."""
    rows = [asdict(piece) for piece in pieces]
    found = {name: sum(row[name] for row in rows) / len(rows) for name in rows[0]}
    found["held_most"] = max(row["held_most"] for row in rows)
    found["held_over_5"] = sum(row["held_over_5"] for row in rows)
    found["drift_worst"] = max(row["drift_most"] for row in rows)
    return found


def load(name: str) -> tuple[Score, Harmony]:
    """One piece of the corpus, read and analysed."""
    found = corpus.getWork(name)
    paths = [Path(str(one)) for one in (found if isinstance(found, list) else [found])]
    score = retune.read(min(paths, key=lambda path: path.suffix != ".mxl"))
    return score, retune.analyse(score)


def figures(names: list[str], only: str) -> dict[str, dict[str, float]]:
    """The table: one row a tuning."""
    pieces = [load(name) for name in names]
    print(f"{len(pieces)} pieces, {sum(len(score.notes) for score, _ in pieces)} notes\n")
    print(f"{'':26}" + " ".join(f"{head:>{max(len(head), 6)}}" for _, head, _ in COLUMNS))
    found = {}
    for name in [*RIVALS, *POLICIES]:
        if only not in name:
            continue
        limit = POLICIES[name].prime_limit if name in POLICIES else 5
        pitchings = [
            RIVALS[name](score, harmony)
            if name in RIVALS
            else tuned_pitching(score, harmony, POLICIES[name])
            for score, harmony in pieces
        ]
        found[name] = pooled(
            [
                measure(score, harmony, pitching, limit)
                for (score, harmony), pitching in zip(pieces, pitchings, strict=True)
            ]
        )
        cells = (
            f"{found[name][key]:{max(len(head), 6)}{form[form.index('.') :]}}"
            for key, head, form in COLUMNS
        )
        print(f"{name:26}" + " ".join(cells), flush=True)
    return found


def doubled(score: Score) -> Score:
    """The piece with every voice doubled by an accompaniment that cannot move."""
    count = len(score.parts)
    parts = [
        replace(part, index=part.index + count, kind=PartKind.ACCOMPANIMENT) for part in score.parts
    ]
    notes = [replace(note, part=note.part + count) for note in score.notes]
    every = sorted((*score.notes, *notes), key=lambda n: (n.onset, n.part, n.pitch.key))
    return replace(score, parts=(*score.parts, *parts), notes=tuple(every))


def accompanied(names: list[str]) -> dict[str, dict[str, float]]:
    """Voices doubled by an accompaniment: how far their roots and notes lie from its tuning."""
    pieces = [doubled(load(name)[0]) for name in names]
    harmonies = [retune.analyse(score) for score in pieces]
    print(
        f"\n{'':26}{'roots rms':>10}{'notes rms':>10}{'VX mean':>9}{'rms':>7}"
        f"{'melody':>8}{'rep>5 %':>9}"
    )
    found = {}
    for name, policy in ACCOMPANIED.items():
        rows, squares, roots = [], Tally(), Tally()
        for score, harmony in zip(pieces, harmonies, strict=True):
            tuned = retune.tune(score, harmony, policy)
            own = {
                n.note.pitch.pitch_class: n.segments[0].cents
                for n in tuned.notes
                if not score.parts[n.note.part].tuned
            }
            for one in tuned.notes:
                for segment in one.segments if score.parts[one.note.part].tuned else ():
                    away = abs(segment.cents - own[one.note.pitch.pitch_class])
                    squares.add(away, float(segment.duration))
                    if segment.ratio == 1:
                        roots.add(away, float(segment.duration))
            pitching = [[(s.onset, s.end, s.cents) for s in n.segments] for n in tuned.notes]
            rows.append(measure(score, harmony, pitching))
        row = pooled(rows)
        found[name] = {"roots_rms": roots.rms, "notes_rms": squares.rms} | row
        print(
            f"{name:26}{roots.rms:10.2f}{squares.rms:10.2f}{row['vx_mean']:9.3f}{row['vx_rms']:7.3f}"
            f"{row['melody_mean']:8.3f}{row['repeated_over_5']:9.2f}",
            flush=True,
        )
    return found


def repeated_score(score: Score, times: int) -> Score:
    """A piece sung several times over, as one score."""
    length = score.end
    notes = [
        replace(note, onset=note.onset + turn * length)
        for turn in range(times)
        for note in score.notes
    ]
    bars = [
        replace(bar, onset=bar.onset + turn * length, index=bar.index + turn * len(score.bars))
        for turn in range(times)
        for bar in score.bars
    ]
    return replace(score, notes=tuple(notes), bars=tuple(bars))


def speed(sizes: tuple[int, ...] = (10_000, 100_000)) -> dict[str, float]:
    """Processor seconds to tune scores of that many notes, best of three, and their ratio."""
    score, _ = load(MADRIGALS[0])
    found: dict[str, float] = {}
    for size in sizes:
        long = repeated_score(score, -(-size // len(score.notes)))
        harmony = retune.analyse(long)
        took = []
        for _ in range(3):
            start = time.process_time()
            retune.tune(long, harmony, Policy())
            took.append(time.process_time() - start)
        found[f"seconds_{size}"] = min(took)
        memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
        print(f"{len(long.notes):>9} notes tuned in {min(took):.2f} s, process at {memory:.0f} MiB")
    found["ratio"] = found[f"seconds_{sizes[-1]}"] / found[f"seconds_{sizes[0]}"]
    print(f"{sizes[-1] / sizes[0]:.0f} times the notes, {found['ratio']:.2f} times as long")
    return found


def compare(old: dict[str, dict[str, float]], new: dict[str, dict[str, float]]) -> None:
    """Print what changed by more than a thousandth."""
    for name, row in new.items():
        changes = [
            f"{key} {old[name][key]:.3f} -> {value:.3f}"
            for key, value in row.items()
            if name in old and abs(old[name].get(key, value) - value) > 1e-3
        ]
        print(f"{name}: {', '.join(changes) or 'no change'}")


def main() -> None:
    """Run the benchmark."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else "")
    parser.add_argument("--quick", action="store_true", help="six pieces only; writes nothing")
    parser.add_argument("--compare", action="store_true", help="compare with the kept results")
    parser.add_argument("--speed", action="store_true", help="speed only, to 1,000,000 notes")
    parser.add_argument("--only", default="", help="tunings whose name holds this text")
    options = parser.parse_args()
    if options.speed:
        speed((10_000, 100_000, 1_000_000))
        return
    names = QUICK if options.quick else [*CHORALES, *MADRIGALS, *PALESTRINA]
    table = figures(names, options.only)
    beside = {} if options.only else accompanied(names)
    if options.compare:
        compare(json.loads(RESULTS.read_text(encoding="utf-8"))["figures"], table)
    elif not options.quick and not options.only:
        kept = {"figures": table, "accompanied": beside, "speed": speed()}
        RESULTS.parent.mkdir(exist_ok=True)
        RESULTS.write_text(json.dumps(kept, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
