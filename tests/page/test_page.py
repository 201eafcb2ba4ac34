"""The rehearsal page in a real browser: it plays in tune, obeys its controls and harms nobody.

Accessibility is checked with axe-core (WCAG 2.2 A and AA rules).
"""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page

from retune.export.notes import NotesExporter, NotesOptions
from retune.export.page import PageExporter, PageOptions
from retune.harmony import analyse
from retune.score.read import read_bytes
from retune.tracks.take import Take
from retune.tuning import tune
from retune.tuning.model import TunedScore
from retune.tuning.policy import Policy
from tests.page.browser import chromium, needs_chromium, opened, until
from tests.tracks.pieces import NAMES, tuned
from tests.voice.measuring import measured_hz

pytestmark = needs_chromium


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with chromium() as found:
        yield found


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("pages")


def written(piece: TunedScore, folder: Path) -> Path:
    """The pages of a piece; the path of the main one."""
    for file in PageExporter().export([Take(piece)], PageOptions()):
        if not (folder / file.name).exists():
            (folder / file.name).write_bytes(file.data)
    return folder / f"{piece.score.stem}.html"


@pytest.fixture
def hymn(browser: Browser, folder: Path) -> Iterator[Page]:
    page = opened(browser, written(tuned("harbour-hymn"), folder))
    yield page
    assert page.faults == []  # type: ignore[attr-defined]
    page.context.close()


@pytest.mark.parametrize("name", NAMES)
def test_every_score_opens_plays_and_asks_for_nothing(
    browser: Browser, folder: Path, name: str
) -> None:
    path = written(tuned(name), folder)
    assert path.stat().st_size < 3_000_000
    page = opened(browser, path)
    assert page.locator(".system svg").count() > 0
    page.click("#play")
    until(page, "rehearsal.player.now() > 0.6")
    assert page.locator(".cursor").is_visible()
    assert page.locator("#play").inner_text() == "Pause"
    assert page.faults == []  # type: ignore[attr-defined]
    assert all(url.startswith("file:") for url in page.asked)  # type: ignore[attr-defined]
    page.context.close()


def test_every_notehead_that_sounds_is_known_to_the_page(hymn: Page) -> None:
    notes = len(tuned("harbour-hymn").score.notes)
    assert hymn.evaluate("rehearsal.view.heads.size") == notes


def rendered(page: Page, start: float, stop: float, equal: bool, part: int) -> np.ndarray:
    """What the page sounds of one part in a stretch, both channels added."""
    samples = page.evaluate(
        """async ([from, to, equal, part]) => {
            const { player } = rehearsal;
            player.muted = player.piece.parts.map((_, index) => index !== part);
            const sound = await player.render(from, to, equal);
            return [...sound.getChannelData(0)].map((x, i) => x + sound.getChannelData(1)[i]);
        }""",
        [start, stop, equal, part],
    )
    return np.array(samples)


@pytest.mark.parametrize("equal", [False, True])
def test_what_sounds_is_tuned(hymn: Page, equal: bool) -> None:
    piece = tuned("harbour-hymn")
    checked = 0
    for one in piece.notes:
        segment = one.segments[-1]
        begin, end = piece.seconds(segment.onset), piece.seconds(segment.end)
        if end - begin < 1.3 or checked > 7 * (one.note.part + 1):
            continue
        sound = rendered(hymn, begin - 0.1, end, equal, one.note.part)
        key = one.note.pitch.key
        wanted = 440.0 * 2 ** ((key - 69) / 12) if equal else piece.hz(one, segment)
        heard = measured_hz(sound[round(0.4 * 44100) : round(1.2 * 44100)], wanted)
        assert abs(1200 * np.log2(heard / wanted)) < 1.0
        checked += 1
        if checked > 12:
            break
    assert checked > 5


def live(page: Page) -> np.ndarray:
    """The last three quarters of a second that were played."""
    return np.array(
        page.evaluate(
            """() => {
                const { ear } = rehearsal.player.graph;
                const samples = new Float32Array(ear.fftSize);
                ear.getFloatTimeDomainData(samples);
                return [...samples];
            }"""
        )
    )


def test_just_and_equal_while_it_plays(hymn: Page) -> None:
    # The last chord, held for over two seconds: the alto's third of E flat.
    piece = tuned("harbour-hymn")
    final = [n for n in piece.notes if n.note.end == piece.score.end]
    third = next(n for n in final if n.segments[-1].ratio and n.segments[-1].ratio.numerator == 5)
    start = piece.seconds(third.note.onset)
    hymn.evaluate(
        "part => { const p = rehearsal.player; p.muted = p.muted.map((_, i) => i !== part); }",
        third.note.part,
    )
    heard = []
    for equal in (False, True):
        hymn.evaluate(f"rehearsal.player.seek({start})")
        hymn.evaluate(f"rehearsal.setTuning({str(equal).lower()})")
        hymn.evaluate("rehearsal.player.play()")
        until(hymn, f"rehearsal.player.now() > {start + 1.4}")
        rate = hymn.evaluate("rehearsal.player.graph.context.sampleRate")
        near = 440.0 * 2 ** ((third.note.pitch.key - 69) / 12)
        heard.append(measured_hz(live(hymn), near * 44100 / rate) * rate / 44100)
        hymn.evaluate("rehearsal.player.pause()")
    just = piece.hz(third, third.segments[-1])
    assert abs(1200 * np.log2(heard[0] / just)) < 1.0
    assert abs(1200 * np.log2(heard[1] / near)) < 1.0
    assert hymn.locator("#tuningnow").inner_text() == "Equal temperament"


def test_mute_silences(hymn: Page) -> None:
    hymn.click(".more summary")
    for index in range(4):
        hymn.uncheck(f"#on{index}")
    hymn.click("#play")
    until(hymn, "rehearsal.player.now() > 1.5")
    assert np.abs(live(hymn)).max() < 1e-4
    hymn.check("#on0")
    hymn.wait_for_timeout(900)
    assert np.abs(live(hymn)).max() > 1e-3


def test_loudness_is_bounded_from_the_start(hymn: Page) -> None:
    piece = tuned("harbour-hymn")
    sounds = hymn.evaluate(
        """async (to) => {
            const sound = await rehearsal.player.render(0, to, false);
            const data = sound.getChannelData(0);
            let peak = 0;
            for (const x of data) peak = Math.max(peak, Math.abs(x));
            return [peak, Math.abs(data[0]), Math.abs(data[40])];
        }""",
        min(piece.seconds(piece.score.end), 40.0),
    )
    assert 0.05 < sounds[0] < 0.9
    assert sounds[1] == 0.0
    assert sounds[2] < 0.01


def test_seek_by_note_bar_and_keys(hymn: Page) -> None:
    piece = tuned("harbour-hymn")
    third = piece.score.bars[2]
    place = hymn.locator('[data-bar="2"] [data-note]').first.bounding_box()
    assert place is not None
    hymn.mouse.click(place["x"] + 3, place["y"] + 3)
    assert hymn.evaluate("rehearsal.player.now()") == pytest.approx(
        piece.seconds(third.onset), abs=1e-3
    )
    hymn.evaluate("rehearsal.player.seek(0)")
    hymn.keyboard.press("ArrowRight")
    hymn.keyboard.press("ArrowRight")
    assert hymn.evaluate("rehearsal.player.now()") == pytest.approx(
        piece.seconds(third.onset), abs=1e-3
    )
    until(hymn, "document.getElementById('where').textContent.startsWith('Bar 3')")
    hymn.keyboard.press("Home")
    assert hymn.evaluate("rehearsal.player.now()") == 0
    hymn.keyboard.press("e")
    assert hymn.evaluate("rehearsal.player.equal")


def test_tempo_changes_how_fast_it_goes(hymn: Page) -> None:
    hymn.click(".more summary")
    for percent in (50, 100):
        hymn.evaluate(
            "v => { const t = document.getElementById('tempo'); t.value = v;"
            " t.dispatchEvent(new Event('input')); }",
            percent,
        )
        hymn.evaluate("rehearsal.player.seek(5)")
        hymn.evaluate("rehearsal.player.play()")
        until(hymn, "rehearsal.player.now() > 5.05")
        first, clock = hymn.evaluate(
            "[rehearsal.player.now(), rehearsal.player.graph.context.currentTime]"
        )
        hymn.wait_for_timeout(800)
        then, later = hymn.evaluate(
            "[rehearsal.player.now(), rehearsal.player.graph.context.currentTime]"
        )
        hymn.evaluate("rehearsal.player.pause()")
        assert (then - first) / (later - clock) == pytest.approx(percent / 100, abs=0.02)


def test_a_loop_comes_back_after_a_breath(hymn: Page) -> None:
    piece = tuned("harbour-hymn")
    start, stop = (piece.seconds(piece.score.bars[i].onset) for i in (4, 5))
    hymn.click(".more summary")
    hymn.fill("#loopfrom", "5")
    hymn.fill("#loopto", "5")
    hymn.check("#loopon")
    assert hymn.evaluate("rehearsal.player.loop") == pytest.approx([start, stop], abs=1e-3)
    hymn.click("#play")
    until(hymn, f"rehearsal.player.now() > {stop - 0.3}")
    until(hymn, f"rehearsal.player.now() < {start + 0.2}")
    until(hymn, f"rehearsal.player.now() > {start + 0.3}")
    hymn.fill("#loopfrom", "999")
    hymn.locator("#loopfrom").blur()
    assert hymn.locator("#loopbad").is_visible()


def test_starting_notes_and_count_in_come_before_the_music(hymn: Page) -> None:
    hymn.click(".more summary")
    hymn.check("#starting")
    hymn.check("#countin")
    hymn.select_option("#mypart", "1")
    hymn.click("#play")
    hymn.wait_for_timeout(1200)
    assert hymn.evaluate("rehearsal.player.now()") == 0
    assert np.abs(live(hymn)).max() > 1e-3
    delay = hymn.evaluate("rehearsal.player.started - rehearsal.player.graph.context.currentTime")
    # Four notes of the chord, the alto's own for twice as long, a beat, four beats counted.
    slot, beat = hymn.evaluate("[rehearsal.piece.start.slot, rehearsal.piece.start.beat]")
    assert delay == pytest.approx(6 * slot + 5 * beat - 1.2, abs=0.4)


def test_rehearsal_notes_lead_to_their_bars(hymn: Page) -> None:
    notes = hymn.locator("#advice li")
    assert notes.count() == 12
    place = notes.last.locator("button").last
    bar = place.inner_text()
    place.click()
    until(hymn, f"document.getElementById('where').textContent === 'B{bar[1:]}'")
    # It is brought into sight, a little later where it slides there.
    until(
        hymn,
        """(() => {
            const box = document.querySelector(".cursor").getBoundingClientRect();
            return box.top >= 0 && box.bottom <= innerHeight;
        })()""",
    )


def test_rehearsal_notes_of_a_part_stand_first(hymn: Page) -> None:
    hymn.select_option("#mypart", label="Tenor")
    own, others = hymn.locator("#advice ul").all()
    assert own.evaluate("list => list.previousSibling.textContent") == "Tenor"
    assert own.locator("strong").count() == 0
    assert "Tenor" not in others.locator("strong").all_inner_texts()
    hymn.select_option("#mypart", "")
    assert hymn.locator("#advice ul").count() == 1


def test_the_card_says_what_the_note_list_says(hymn: Page) -> None:
    piece = tuned("harbour-hymn")
    listed = json.loads(
        next(
            file.data
            for file in NotesExporter().export([Take(piece)], NotesOptions())
            if file.name.endswith(".json")
        )
    )
    for index, chord in list(enumerate(listed["chords"]))[:12]:
        hymn.evaluate(f"rehearsal.card.open({index})")
        title = hymn.locator("#card h2").inner_text()
        assert title.replace("♭", "b").replace("♯", "#") == chord["symbol"]
        rows = hymn.locator("#card table").first.locator("tbody tr")
        for place in range(rows.count()):
            cells = [
                cell.replace("−", "-")
                for cell in rows.nth(place).locator("th, td").all_inner_texts()
            ]
            part = next(p["index"] for p in listed["parts"] if p["name"] == cells[0])
            candidates = [
                segment
                for note in listed["notes"]
                if note["part"] == part
                for segment in note["segments"]
                if segment["chord"] == index
            ]
            assert any(
                abs(float(cells[4]) - segment["cents"]) < 0.06
                and abs(float(cells[5]) - segment["hz"]) < 0.006
                and cells[2].replace(":", "/") in (segment["ratio"], f"{segment['ratio']}/1")
                for segment in candidates
            ), (cells, candidates)
    hymn.keyboard.press("Escape")
    assert hymn.locator("#card").is_hidden()


def test_a_chord_is_held_in_both_tunings_and_slides(hymn: Page) -> None:
    hymn.evaluate(
        "document.querySelector('[data-chord]').dispatchEvent(new Event('click', {bubbles: true}))"
    )
    assert hymn.locator("#card").is_visible()
    hymn.click("text=Hold it just")
    hymn.wait_for_timeout(900)
    assert np.abs(live(hymn)).max() > 1e-3
    hymn.click("text=Hold it equal")
    hymn.wait_for_timeout(300)
    hymn.select_option("#slidewho", "1")
    hymn.locator("#card button", has_text="Slide").click()
    hymn.wait_for_timeout(300)
    assert np.abs(live(hymn)).max() > 1e-3


def test_the_address_remembers_the_part(browser: Browser, folder: Path) -> None:
    path = written(tuned("harbour-hymn"), folder)
    page = opened(browser, path)
    page.select_option("#mypart", label="Alto")
    assert page.evaluate("location.hash") == "#part=Alto"
    assert page.evaluate("rehearsal.player.gainOf(1)") > page.evaluate("rehearsal.player.gainOf(0)")
    page.reload()
    assert page.evaluate("rehearsal.part") == 1
    assert "First note" in page.locator("#entries").inner_text()
    page.context.close()


def test_the_page_of_a_part_has_it_chosen(browser: Browser, folder: Path) -> None:
    path = written(tuned("harbour-hymn"), folder)
    page = opened(browser, path.with_name("harbour-hymn - Tenor.html"))
    assert page.evaluate("rehearsal.part") == 2
    assert page.title().endswith("Tenor")
    page.check("#ownline")
    until(page, "rehearsal.shown === 'part2'")
    own = sum(1 for n in tuned("harbour-hymn").score.notes if n.part == 2)
    until(page, f"rehearsal.view.heads.size === {own}")
    assert page.faults == []  # type: ignore[attr-defined]
    page.context.close()


def test_cents_and_chords_are_shown_as_wished(hymn: Page) -> None:
    small = hymn.locator("#score .cents.small").first
    large = hymn.locator("#score .cents:not(.small)").first
    assert not small.is_visible()
    assert large.is_visible()
    hymn.select_option("#cents", "all")
    assert small.is_visible()
    hymn.select_option("#cents", "none")
    assert not large.is_visible()
    chord = hymn.locator("#score .chord").first
    assert chord.is_visible()
    hymn.uncheck("#chords")
    assert not chord.is_visible()


@pytest.mark.parametrize("width", [380, 1100, 1900])
def test_the_engraving_fits_the_width(browser: Browser, folder: Path, width: int) -> None:
    path = written(tuned("regatta-day"), folder)
    page = opened(browser, path, viewport={"width": width, "height": 800})
    wanted = {380: "narrow", 1100: "plain", 1900: "wide"}[width]
    until(page, f"rehearsal.shown === '{wanted}'")
    assert page.evaluate("document.documentElement.scrollWidth <= innerWidth + 1")
    assert page.evaluate("rehearsal.view.heads.size") > 50
    page.context.close()


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("card", [False, True])
def test_accessibility(browser: Browser, folder: Path, scheme: str, card: bool) -> None:
    path = written(tuned("harbour-hymn"), folder)
    page = opened(browser, path, color_scheme=scheme)
    page.click(".more summary")
    page.select_option("#mypart", "1")
    if card:
        page.evaluate("rehearsal.card.open(2)")
    # axe is injected as a script of its own, which the page's policy forbids to anything else.
    page.context.close()
    page = opened(browser, path, color_scheme=scheme, bypass_csp=True)
    page.click(".more summary")
    page.select_option("#mypart", "1")
    if card:
        page.evaluate("rehearsal.card.open(2)")
    found = Axe().run(page, options={"runOnly": ["wcag2a", "wcag2aa", "wcag21aa", "wcag22aa"]})
    assert found.violations_count == 0, found.generate_report()
    page.context.close()


def test_without_scripts_the_score_stands_there(browser: Browser, folder: Path) -> None:
    path = written(tuned("harbour-hymn"), folder)
    page = opened(browser, path, java_script_enabled=False)
    assert page.locator(".system svg").first.is_visible()
    assert page.locator(".notice").is_visible()
    assert not page.locator("#transport").is_visible()
    assert "80 dB(A)" in page.locator("#care").inner_text()
    page.context.close()


def test_printing_gives_pages(hymn: Page) -> None:
    paper = hymn.pdf(format="A4")
    assert len(re.findall(rb"/Type\s*/Page\b", paper)) >= 1
    hymn.emulate_media(media="print")
    assert not hymn.locator("#transport").is_visible()
    assert hymn.locator(".system svg").first.is_visible()


EVIL = "</script><script>window.ran=1</script><img src=x onerror=window.ran=1>"


def test_text_of_the_score_stays_text(browser: Browser, folder: Path) -> None:
    source = (Path(__file__).parents[2] / "fixtures" / "harbour-hymn.musicxml").read_text("utf-8")
    escaped = EVIL.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
    changed = source.replace("Hymn for the Blessing of the Nets", escaped)
    changed = changed.replace("<text>Bless</text>", f"<text>{escaped}</text>")
    changed = re.sub(r"<part-name>[^<]*", f"<part-name>{escaped}", changed)
    score = read_bytes(changed.encode("utf-8"), "evil.musicxml")
    piece = tune(score, analyse(score), Policy())
    page = opened(browser, written(piece, folder))
    assert page.locator("h1").inner_text() == EVIL
    page.evaluate("rehearsal.card.open(1)")
    page.wait_for_timeout(200)
    assert page.evaluate("window.ran") is None
    assert page.faults == []  # type: ignore[attr-defined]
    page.context.close()


def test_other_scores_are_shown_as_a_grid(browser: Browser, folder: Path) -> None:
    piece = tuned("harbour-hymn")
    other = replace(piece, score=replace(piece.score, format="midi", stem="grid"))
    page = opened(browser, written(other, folder))
    assert "grid of chords" in page.locator(".notice").first.inner_text()
    page.locator("tr[data-row='4'] td").nth(4).click()
    at = piece.seconds(piece.harmony.chords[4].onset)
    assert page.evaluate("rehearsal.player.now()") == pytest.approx(at, abs=1e-3)
    page.locator("tr[data-row='4'] [data-chord]").click()
    assert page.locator("#card").is_visible()
    page.click("#play")
    until(page, f"rehearsal.player.now() > {at} + 0.3")
    assert page.locator("tr.now").count() == 1
    assert page.faults == []  # type: ignore[attr-defined]
    page.context.close()
