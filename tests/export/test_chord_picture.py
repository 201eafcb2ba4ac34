"""A chord as a picture: what is drawn, and files that others can read."""

from __future__ import annotations

import sys
from xml.etree import ElementTree

import pytest

from retune.chordcard.found import chord_of
from retune.chordcard.naming import parse_pitches
from retune.errors import OutputError
from retune.export.chord_picture import chord_picture, spectrum_plot

CHORD = chord_of(parse_pitches(["C3 G3 E4 C5"]))


def test_stems_are_the_partials_of_every_voice() -> None:
    equal, tuned = spectrum_plot(CHORD, "C").panels
    for index, tone in enumerate(CHORD.tones):
        for panel, f0 in ((equal, tone.equal_hz), (tuned, tone.hz)):
            own = [stem for stem in panel.stems if stem.series == index]
            numbers = [stem.hz / f0 for stem in own]
            assert numbers == pytest.approx([round(number) for number in numbers])
            assert numbers[0] == pytest.approx(1.0)
    levels = [stem.level for stem in tuned.stems]
    assert max(levels) == 0.0
    assert not any(stem.marked for stem in equal.stems)


def test_marked_partials_are_shared() -> None:
    tuned = spectrum_plot(CHORD, "C").panels[1]
    marked = [stem for stem in tuned.stems if stem.marked]
    assert marked
    for stem in marked:
        assert any(
            other.series != stem.series and other.hz == pytest.approx(stem.hz)
            for other in tuned.stems
        )


def test_places_seen_near_tell_the_textbooks_beats() -> None:
    """C3-E4: 5.19 beats a second near 656.5 Hz, 13.686 cents apart (handbook, voice.md 3.1)."""
    zoom = next(z for z in spectrum_plot(CHORD, "C").zooms if "E4" in z.title and "C3" in z.title)
    assert zoom.upper_words == "equal: 5.19 beats a second"
    assert zoom.lower_words == "as tuned: still"
    low, high = sorted(cents for cents, _, series in zoom.upper if series in (0, 2))
    assert high - low == pytest.approx(13.686, abs=1e-3)
    met = [cents for cents, _, series in zoom.lower if series in (0, 2)]
    assert met[0] == pytest.approx(met[1], abs=1e-9)


def test_axis_is_marked_by_pitches() -> None:
    """C4 is 261.63 Hz (scientific pitch, A4 = 440 Hz)."""
    plot = spectrum_plot(CHORD, "C")
    ticks = {label.split("\n")[0]: hz for hz, label in plot.ticks}
    assert ticks["C4"] == pytest.approx(261.63, abs=0.01)
    assert all(plot.lowest_hz <= hz <= plot.highest_hz for hz in ticks.values())


def test_files_are_what_they_are_called_and_equal_each_time() -> None:
    made = {
        ending: [chord_picture(CHORD, f"c.{ending}", "C major").data for _ in range(2)]
        for ending in ("svg", "png", "pdf")
    }
    for first, second in made.values():
        assert first == second
    assert made["png"][0].startswith(b"\x89PNG\r\n\x1a\n")
    assert made["pdf"][0].startswith(b"%PDF-")
    root = ElementTree.fromstring(made["svg"][0])
    assert root.tag.endswith("svg")


def test_without_the_library_the_install_line_is_told(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    with pytest.raises(OutputError, match="matplotlib") as caught:
        _ = chord_picture(CHORD, "c.png", "C major").data
    assert "pip install 'retune-choir[pictures]'" in caught.value.hint
