"""How fast a long MIDI file goes through: read, analysed, tuned and given back.

    python tests/benchmarks/midi.py

A made-up hour of 100,000 notes in four parts, played in unevenly. Reading and writing alone are
set beside a bare mido read and write of the same file; each run is a process of its own, figures
are medians of three.
"""

from __future__ import annotations

import json
import random
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

RESULTS = Path(__file__).parent / "results" / "midi.json"
NOTES, TICKS = 100_000, 480

BARE = "import sys, mido; f = mido.MidiFile(sys.argv[1]); f.save(sys.argv[2])"


def song() -> bytes:
    """An hour of four parts on triads, every note up to 12 ticks late."""
    from retune.adapters.midi import (
        Control,
        Meta,
        MetaType,
        NoteOff,
        NoteOn,
        RawMidi,
        RawTrack,
        write_midi_file,
    )

    chance = random.Random(2)
    chords = ((0, 4, 7), (5, 9, 0), (7, 11, 2), (9, 0, 4), (2, 5, 9))
    beats = NOTES // 4
    plan = [chance.choice(chords) for _ in range(beats)]
    qpm = beats / 60
    head = Meta(MetaType.TEMPO, round(60_000_000 / qpm).to_bytes(3))
    tracks = [RawTrack(((0, head),), 0)]
    for part, floor in enumerate((67, 60, 52, 43)):
        events: list[tuple[int, object]] = [(0, Control(part, 7, 100))]
        for beat, chord in enumerate(plan):
            key = floor + (chord[part % 3] - floor) % 12
            start = beat * TICKS + chance.randint(0, 12)
            events.append((start, NoteOn(part, key, chance.randint(50, 100))))
            events.append((start + 440, NoteOff(part, key)))
            if beat % 8 == 0:
                events.append((start, Control(part, 11, chance.randint(60, 127))))
        events.sort(key=lambda event: event[0])
        tracks.append(RawTrack(tuple(events), beats * TICKS))  # type: ignore[arg-type]
    return write_midi_file(RawMidi(1, TICKS, tuple(tracks)))


def one_run(source: str, target: str) -> dict[str, float]:
    """Seconds by stage and peak memory of the main job."""
    from retune.adapters.midi import read_midi_file, write_midi_file
    from retune.limits import Limits
    from retune.pipeline import exported, retuned, takes_of
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy

    begun = time.perf_counter()
    tuned = retuned(Path(source), source, ReadOptions(), Policy())
    read = time.perf_counter()
    (file,) = exported(takes_of(tuned), ["midi"], {})
    Path(target).write_bytes(file.data)
    done = time.perf_counter()
    raw = read_midi_file(Path(source).read_bytes(), Limits(max_bytes=1 << 30, max_notes=1 << 30))
    write_midi_file(raw)
    alone = time.perf_counter() - done
    return {
        "read and tune": read - begun,
        "give back": done - read,
        "all": done - begun,
        "read and write alone": alone,
        "peak MiB": resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024,
    }


def main() -> None:
    """Print the table and keep it as JSON."""
    if len(sys.argv) == 3:
        print(json.dumps(one_run(sys.argv[1], sys.argv[2])))
        return
    with tempfile.TemporaryDirectory() as folder:
        source, target = f"{folder}/song.mid", f"{folder}/out.mid"
        Path(source).write_bytes(song())
        runs, bare = [], []
        for _ in range(3):
            ours = subprocess.run(
                [sys.executable, __file__, source, target],
                check=True,
                capture_output=True,
                text=True,
            )
            runs.append(json.loads(ours.stdout))
            script = (
                "import time; t = time.perf_counter(); " + BARE + "; print(time.perf_counter() - t)"
            )
            plain = subprocess.run(
                [sys.executable, "-c", script, source, target],
                check=True,
                capture_output=True,
                text=True,
            )
            bare.append(float(plain.stdout))
    table = {key: statistics.median(run[key] for run in runs) for key in runs[0]}
    table["bare mido"] = statistics.median(bare)
    table["ratio"] = table["read and write alone"] / table["bare mido"]
    for key, value in table.items():
        print(f"{key:<24}{value:>10.2f}")
    RESULTS.write_text(json.dumps(table, indent=1) + "\n")


if __name__ == "__main__":
    main()
