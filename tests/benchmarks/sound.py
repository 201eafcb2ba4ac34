"""How fast learning tracks are rendered, and where the time goes.

    python tests/benchmarks/sound.py            both tables, kept as JSON
    python tests/benchmarks/sound.py --quick    one round

1. The whole process ``retune tracks`` on the bundled hymn played twice (about three minutes, four
   parts, 13 files) by format: how many times faster it renders than the files play in sum, and
   its peak of resident memory.
2. The same work in one thread by stage: synthesis, mixing, levelling, encoding. The plain baseline
   is a synthesis that renders every part anew for every file.

Figures are medians.
"""

from __future__ import annotations

import argparse
import json
import os
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

RESULTS = Path(__file__).parent / "results" / "sound.json"
PIECE = Path(__file__).parents[2] / "fixtures" / "harbour-hymn.musicxml"
LOOPS = "2"


def one_run(kind: str) -> tuple[float, float, float]:
    """Wall seconds, seconds of sound in all files, and peak MiB of one process."""
    import soundfile

    with tempfile.TemporaryDirectory() as folder:
        command = [sys.executable, "-m", "retune", "tracks", str(PIECE), "-o", folder]
        start = time.perf_counter()
        process = subprocess.Popen(
            [*command, "--loops", LOOPS, "--audio", kind, "--quiet"], env={**os.environ}
        )
        _, status, usage = os.wait4(process.pid, 0)
        wall = time.perf_counter() - start
        assert status == 0, "retune tracks failed"
        files = list(Path(folder).rglob(f"*.{kind}"))
        assert len(files) == 13
        return wall, sum(soundfile.info(f).duration for f in files), usage.ru_maxrss / 1024


def whole(rounds: int) -> dict[str, dict[str, float]]:
    """Medians by format."""
    table = {}
    for kind in ("mp3", "wav", "flac", "ogg"):
        runs = [one_run(kind) for _ in range(rounds)]
        wall, sound, peak = (statistics.median(column) for column in zip(*runs, strict=True))
        table[kind] = {"seconds": wall, "sound": sound, "times": sound / wall, "peak MiB": peak}
    return table


def stages() -> dict[str, float]:
    """Seconds of one thread by stage, for the thirteen files as MP3."""
    from retune.adapters.soundfiles import SoundFormat, Tags, encode
    from retune.export.audio_level import levelled
    from retune.export.audio_mix import RATE, Stems, mixed
    from retune.pipeline import learning_tracks, retuned
    from retune.score.options import ReadOptions
    from retune.tracks.options import TrackOptions
    from retune.tuning.policy import Policy
    from retune.voice.options import SoundOptions
    from retune.voice.stems import stem

    clock = time.perf_counter
    spent = dict.fromkeys(("read and tune", "synthesis", "mixing", "levelling", "encoding"), 0.0)
    begun = clock()
    tuned = retuned(PIECE, str(PIECE), ReadOptions(), Policy())
    takes = learning_tracks(tuned, TrackOptions(loops=int(LOOPS)))
    spent["read and tune"] = clock() - begun
    begun = clock()
    stems = Stems(takes, lambda played, part: stem(played, part, SoundOptions(), RATE))
    mixed(takes[0], stems)
    spent["synthesis"] = clock() - begun
    anew = 0.0
    for take in takes:
        begun = clock()
        sound = mixed(take, stems)
        spent["mixing"] += clock() - begun
        begun = clock()
        sound = levelled(sound, RATE, -18.0)
        spent["levelling"] += clock() - begun
        begun = clock()
        encode(sound, RATE, SoundFormat.MP3, Tags("benchmark"))
        spent["encoding"] += clock() - begun
        begun = clock()
        for part in take.played.score.parts:
            if take.strip(part.index) is not None:
                stem(take.played, part.index, SoundOptions(), RATE)
        anew += clock() - begun
    spent["synthesis for every file anew"] = anew
    return spent


def main() -> None:
    """Print both tables and keep them as JSON."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--quick", action="store_true")
    wish = parser.parse_args()
    table = whole(1 if wish.quick else 5)
    print(f"{'format':<8}{'seconds':>10}{'sound s':>10}{'times':>8}{'peak MiB':>10}")
    for kind, row in table.items():
        print(
            f"{kind:<8}"
            + "".join(
                f"{value:>{w}.1f}" for value, w in zip(row.values(), (10, 10, 8, 10), strict=True)
            )
        )
    parts = stages()
    print(f"\n{'stage, one thread':<34}{'seconds':>10}")
    for name, seconds in parts.items():
        print(f"{name:<34}{seconds:>10.2f}")
    if not wish.quick:
        RESULTS.write_text(json.dumps({"whole": table, "stages": parts}, indent=1) + "\n")


if __name__ == "__main__":
    main()
