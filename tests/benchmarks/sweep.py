"""The main job on every score of music21's corpus (without ABC collections).

    python tests/benchmarks/sweep.py             all, two at a time
    python tests/benchmarks/sweep.py --every 20  one in twenty

Each score is read, analysed, tuned and exported as `midi`, `scala` and `notes`, and the MIDI is
decoded again and compared with the tuned pitches, all without touching the disk. Prints how
many were done, refused (with the reasons) and crashed, and the slowest; a crash or a run over
60 seconds makes it fail.
"""

from __future__ import annotations

import argparse
import json
import statistics
import sys
import time
import traceback
from collections import Counter
from collections.abc import Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import asdict, dataclass
from multiprocessing import get_context
from pathlib import Path

RESULTS = Path(__file__).parent / "results" / "sweep.json"
SUFFIXES = {".xml", ".mxl", ".musicxml", ".krn"}
MOST_SECONDS = 60.0


@dataclass(frozen=True)
class Outcome:
    """What became of one score: done, refused or crashed, and why."""

    score: str
    state: str
    seconds: float
    notes: int = 0
    why: str = ""


def corpus_scores() -> list[Path]:
    """All scores of the corpus in the formats of `SUFFIXES`, sorted."""
    import music21

    root = Path(music21.__file__).parent / "corpus"
    return sorted(path for path in root.rglob("*") if path.suffix in SUFFIXES)


def main_job(path: Path) -> Outcome:
    """Run the main job on one score."""
    import retune
    from retune import pipeline

    name = "/".join(path.parts[-2:])
    start = time.perf_counter()
    try:
        tuned = pipeline.retuned(path, str(path), retune.ReadOptions(), retune.Policy())
        for file in pipeline.exported(pipeline.takes_of(tuned), pipeline.ALL_OUTPUTS, {}):
            if file.check is not None:
                file.check(file.data)
    except retune.RetuneError as error:
        return Outcome(name, "refused", time.perf_counter() - start, why=error.what)
    except Exception:
        why = traceback.format_exc(limit=-3)
        return Outcome(name, "crashed", time.perf_counter() - start, why=why)
    return Outcome(name, "done", time.perf_counter() - start, notes=len(tuned.notes))


def sweep(paths: Sequence[Path], workers: int = 2) -> list[Outcome]:
    """Outcomes of all scores, in their order."""
    with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
        return list(pool.map(main_job, paths, chunksize=4))


def report(outcomes: Sequence[Outcome]) -> str:
    """The result in words."""
    states = Counter(outcome.state for outcome in outcomes)
    seconds = [outcome.seconds for outcome in outcomes]
    slowest = max(outcomes, key=lambda outcome: outcome.seconds)
    lines = [
        (
            f"{len(outcomes)} scores: {states['done']} done "
            f"({states['done'] / len(outcomes):.2%}), {states['refused']} refused, "
            f"{states['crashed']} crashed; {sum(o.notes for o in outcomes):,} notes"
        ),
        (
            f"seconds a score: median {statistics.median(seconds):.2f}, most {max(seconds):.1f} "
            f"({slowest.score})"
        ),
    ]
    for state in ("refused", "crashed"):
        lines += [f"{state}: {o.score}: {o.why}" for o in outcomes if o.state == state]
    return "\n".join(lines)


def main() -> None:
    """Sweep, print and keep the result."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--every", type=int, default=1, metavar="N")
    parser.add_argument("--only", default="", metavar="TEXT", help="paths that contain this")
    wish = parser.parse_args()
    paths = [path for path in corpus_scores() if wish.only in str(path)][:: wish.every]
    outcomes = sweep(paths)
    print(report(outcomes))
    if wish.every == 1 and not wish.only:
        RESULTS.parent.mkdir(exist_ok=True)
        kept = [asdict(outcome) for outcome in outcomes if outcome.state != "done"]
        summary = {"scores": len(outcomes), "not done": kept}
        RESULTS.write_text(json.dumps(summary, indent=1) + "\n")
    if any(o.state == "crashed" or o.seconds > MOST_SECONDS for o in outcomes):
        sys.exit(1)


if __name__ == "__main__":
    main()
