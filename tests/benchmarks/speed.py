"""How fast the main job is, as ratios measured in one run.

    python tests/benchmarks/speed.py            all tables
    python tests/benchmarks/speed.py --quick    fewer rounds, up to 10,000 notes

1. The whole process ``retune export --to midi --to scala --to notes`` against the whole process
   of a bare ``music21.converter.parse(..., forceSource=True)`` of the same file.
2. Reading MusicXML alone: our reader against music21's parse of the same file, in one process.
3. A synthetic score built in memory: analysed, tuned and written, from 1,000 notes up; seconds,
   growth against ten times fewer notes, and the peak of resident memory.

Figures are medians; the two processes of a pair run in turn, so that both meet the same noise.
"""

from __future__ import annotations

import argparse
import json
import random
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from fractions import Fraction
from pathlib import Path

RESULTS = Path(__file__).parent / "results" / "speed.json"

BARE = (
    "import sys; from music21 import converter; "
    "converter.parse(sys.argv[1], forceSource=True, storePickle=False)"
)
PIECES = {"chorale": "bach/bwv269.mxl", "long madrigal": "monteverdi/madrigal.5.8.mxl"}
"""One short and one long piece of music21's corpus."""


def seconds_of(arguments: list[str]) -> float:
    """Wall seconds of one process."""
    start = time.perf_counter()
    subprocess.run(arguments, check=True, capture_output=True)
    return time.perf_counter() - start


def against_bare_parse(rounds: int) -> dict[str, dict[str, float]]:
    """For each piece: median seconds of both processes and their ratio."""
    import music21

    corpus = Path(music21.__file__).parent / "corpus"
    table: dict[str, dict[str, float]] = {}
    for label, name in PIECES.items():
        path = str(corpus / name)
        ours, bare = [], []
        for _ in range(rounds):
            with tempfile.TemporaryDirectory() as folder:
                outputs = ["--to", "midi", "--to", "scala", "--to", "notes", "-o", folder]
                ours.append(seconds_of([sys.executable, "-m", "retune", "export", path, *outputs]))
            bare.append(seconds_of([sys.executable, "-c", BARE, path]))
        mine, theirs = statistics.median(ours), statistics.median(bare)
        table[label] = {"retune": mine, "bare parse": theirs, "ratio": mine / theirs}
    return table


def reading(rounds: int) -> dict[str, dict[str, float]]:
    """For each piece: median seconds of reading it with music21 and with ours, and their ratio."""
    import music21

    from retune.limits import Limits
    from retune.score.musicxml import read_musicxml

    table: dict[str, dict[str, float]] = {}
    for label, name in PIECES.items():
        path = Path(music21.__file__).parent / "corpus" / name
        data, ours, theirs = path.read_bytes(), [], []
        for _ in range(rounds):
            start = time.perf_counter()
            read_musicxml(data, Limits())
            between = time.perf_counter()
            music21.converter.parse(path, format="musicxml", forceSource=True, storePickle=False)
            ours.append(between - start)
            theirs.append(time.perf_counter() - between)
        mine, other = statistics.median(ours), statistics.median(theirs)
        table[label] = {"retune": mine, "music21": other, "ratio": other / mine}
    return table


def synthetic_score(notes: int) -> object:
    """Four voices walking through primary and secondary triads with passing notes and ties."""
    from retune.pitch import Pitch
    from retune.score.model import Bar, Note, Part, Score

    chance = random.Random(7)
    spelled = {0: "C", 2: "D", 4: "E", 5: "F", 7: "G", 9: "A", 11: "B"}
    floors = (67, 60, 52, 43)
    chords = ((0, 4, 7), (5, 9, 0), (7, 11, 2), (9, 0, 4), (2, 5, 9), (4, 7, 11))
    made: list[Note] = []
    beat, previous = 0, [0, 0, 0, 0]
    while len(made) < notes:
        chord = chance.choice(chords)
        for part, floor in enumerate(floors):
            chroma = chord[0] if part == 3 else chance.choice(chord)
            key = floor + (chroma - floor) % 12
            if key == previous[part] and chance.random() < 0.3 and made:
                continue
            previous[part] = key
            long = chance.random() < 0.2
            length = Fraction(1) if not long else Fraction(1, 2)
            pitch = Pitch(spelled[key % 12], 0, key // 12 - 1)
            made.append(Note(part, Fraction(beat), length, pitch))
            if long:
                step = key + (2 if (key + 2) % 12 in spelled else 1)
                second = Pitch(spelled[step % 12], 0, step // 12 - 1)
                made.append(Note(part, Fraction(2 * beat + 1, 2), length, second))
        beat += 1
    made.sort(key=lambda note: (note.onset, note.part, note.pitch.key))
    bars = tuple(
        Bar(i, i, str(i + 1), Fraction(4 * i), Fraction(4)) for i in range((beat + 3) // 4)
    )
    names = ("Soprano", "Alto", "Tenor", "Bass")
    parts = tuple(Part(i, name) for i, name in enumerate(names))
    return Score("synthetic", "Synthetic", parts, tuple(made[:notes]), bars)


def main_job(notes: int) -> None:
    """Analyse, tune and write one synthetic score; prints seconds by stage and peak memory."""
    import retune
    from retune.score.model import Score

    score = synthetic_score(notes)
    assert isinstance(score, Score)
    stages: dict[str, float] = {}
    start = time.perf_counter()
    harmony = retune.analyse(score)
    stages["analyse"] = time.perf_counter() - start
    tuned = retune.tune(score, harmony, retune.Policy())
    stages["tune"] = time.perf_counter() - start - sum(stages.values())
    with tempfile.TemporaryDirectory() as folder:
        retune.write(tuned, ["midi", "scala", "notes"], folder)
    stages["write"] = time.perf_counter() - start - sum(stages.values())
    stages["all"] = sum(stages.values())
    stages["peak MiB"] = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(json.dumps(stages))


def growth(sizes: list[int]) -> dict[str, dict[str, float]]:
    """Stages by number of notes, each size in a process of its own."""
    table: dict[str, dict[str, float]] = {}
    for notes in sizes:
        done = subprocess.run(
            [sys.executable, __file__, "--one", str(notes)],
            check=True,
            capture_output=True,
            text=True,
        )
        table[str(notes)] = json.loads(done.stdout.splitlines()[-1])
    return table


def main() -> None:
    """Print all tables and keep them as JSON."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--quick", action="store_true")
    parser.add_argument("--one", type=int, help=argparse.SUPPRESS)
    wish = parser.parse_args()
    if wish.one:
        main_job(wish.one)
        return
    pairs = against_bare_parse(3 if wish.quick else 9)
    print(f"{'whole process':<16}{'retune s':>10}{'parse s':>10}{'ratio':>8}")
    for label, row in pairs.items():
        print(f"{label:<16}{row['retune']:>10.2f}{row['bare parse']:>10.2f}{row['ratio']:>8.2f}")
    readers = reading(5 if wish.quick else 15)
    print(f"\n{'reading alone':<16}{'retune s':>10}{'music21 s':>10}{'times':>8}")
    for label, row in readers.items():
        print(f"{label:<16}{row['retune']:>10.3f}{row['music21']:>10.3f}{row['ratio']:>8.1f}")
    sizes = [1_000, 10_000] if wish.quick else [1_000, 10_000, 100_000]
    table = growth(sizes)
    columns = ("analyse", "tune", "write", "all", "peak MiB")
    print(f"\n{'notes':<10}" + "".join(f"{c:>10}" for c in columns) + f"{'growth':>10}")
    before: float | None = None
    for size, row in table.items():
        cells = "".join(f"{row[c]:>10.2f}" for c in columns)
        print(f"{int(size):<10,}{cells}" + (f"{row['all'] / before:>10.1f}" if before else ""))
        before = row["all"]
    if not wish.quick:
        RESULTS.parent.mkdir(exist_ok=True)
        RESULTS.write_text(
            json.dumps({"process": pairs, "reading": readers, "growth": table}, indent=1) + "\n"
        )


if __name__ == "__main__":
    main()
