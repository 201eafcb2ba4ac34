"""How large the rehearsal page is, how soon it opens, how much each frame costs while it plays.

    python tests/benchmarks/page.py

The bundled scores, and a made-up piece of 100 bars in 8 parts. A frame's cost is the time its
script takes, beside the 16.7 ms there are for it at 60 frames a second; medians and the 99th
percentile of five seconds of playing, in headless Chromium (Debian: apt-get install chromium).
"""

from __future__ import annotations

import json
import random
import shutil
import statistics
import tempfile
import time
from pathlib import Path

from playwright.sync_api import Browser, sync_playwright

from retune.export.page import PageExporter, PageOptions
from retune.harmony import analyse
from retune.score.read import read, read_bytes
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy

RESULTS = Path(__file__).parent / "results" / "page.json"
FIXTURES = Path(__file__).parents[2] / "fixtures"
BARS, PARTS = 100, 8

_FRAMES = """() => new Promise((done) => {
  const page = rehearsal;
  const plain = page.frame.bind(page);
  const costs = [];
  page.frame = () => { const t = performance.now(); plain(); costs.push(performance.now() - t); };
  page.player.play();
  setTimeout(() => { page.player.pause(); done(costs); }, 5000);
})"""


def big_piece() -> bytes:
    """100 bars of quarter notes in 8 parts as MusicXML."""
    chance = random.Random(3)
    chords = ((0, 4, 7), (5, 9, 0), (7, 11, 2), (9, 0, 4))
    names = {0: "C", 2: "D", 4: "E", 5: "F", 7: "G", 9: "A", 11: "B"}
    floors = (67, 64, 60, 57, 55, 52, 48, 43)
    plan = [[chance.choice(chords) for _ in range(4)] for _ in range(BARS)]
    parts = "".join(
        f'<score-part id="P{p}"><part-name>Voice {p + 1}</part-name></score-part>'
        for p in range(PARTS)
    )
    bodies = []
    for part, floor in enumerate(floors):
        bars = []
        for number, bar in enumerate(plan):
            notes = "".join(_note(names, floor, chord, part) for chord in bar)
            head = "<attributes><divisions>1</divisions><time><beats>4</beats>" * (number == 0)
            tail = "<beat-type>4</beat-type></time></attributes>" * (number == 0)
            bars.append(f'<measure number="{number + 1}">{head}{tail}{notes}</measure>')
        bodies.append(f'<part id="P{part}">{"".join(bars)}</part>')
    return (
        f'<score-partwise version="4.0"><part-list>{parts}</part-list>{"".join(bodies)}'
        "</score-partwise>"
    ).encode()


def _note(names: dict[int, str], floor: int, chord: tuple[int, ...], part: int) -> str:
    key = floor + (chord[part % 3] - floor) % 12
    return (
        f"<note><pitch><step>{names[key % 12]}</step><octave>{key // 12 - 1}</octave></pitch>"
        "<duration>1</duration><type>quarter</type><lyric><text>la</text></lyric></note>"
    )


def measured(browser: Browser, tuned: TunedScore, folder: Path) -> dict[str, float]:
    """Size, seconds to make and to open, and the cost of a frame in milliseconds."""
    begun = time.perf_counter()
    file = next(iter(PageExporter().export([Take(tuned)], PageOptions())))
    data = file.data
    made = time.perf_counter() - begun
    path = folder / file.name
    path.write_bytes(data)
    page = browser.new_page()
    opening = []
    for _ in range(3):
        begun = time.perf_counter()
        page.goto(path.as_uri())
        while not page.evaluate("document.documentElement.classList.contains('alive')"):
            pass
        opening.append(time.perf_counter() - begun)
    costs = sorted(page.evaluate(_FRAMES))
    page.close()
    return {
        "MB": len(data) / 1e6,
        "seconds to make": made,
        "seconds to open": statistics.median(opening),
        "frames": len(costs),
        "ms a frame": statistics.median(costs),
        "ms a frame, 99 %": costs[int(0.99 * len(costs))],
    }


def main() -> None:
    """Print the table and keep it as JSON."""
    pieces = {path.stem: read(path) for path in sorted(FIXTURES.glob("*.musicxml"))}
    pieces["100 bars, 8 parts"] = read_bytes(big_piece(), "big.musicxml")
    table = {}
    with tempfile.TemporaryDirectory() as folder, sync_playwright() as playwright:
        browser = playwright.chromium.launch(
            executable_path=shutil.which("chromium"),
            args=["--no-sandbox", "--autoplay-policy=no-user-gesture-required"],
        )
        for name, score in pieces.items():
            tuned = tune(score, analyse(score), Policy())
            table[name] = measured(browser, tuned, Path(folder))
        browser.close()
    columns = list(next(iter(table.values())))
    print(f"{'':<20}" + "".join(f"{column:>18}" for column in columns))
    for name, row in table.items():
        print(f"{name:<20}" + "".join(f"{row[column]:>18.2f}" for column in columns))
    RESULTS.write_text(json.dumps(table, indent=1) + "\n")


if __name__ == "__main__":
    main()
