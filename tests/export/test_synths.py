"""Every MIDI layout as two independent open synths play it, measured by spectrum.

FluidSynth takes every pitch down to whole cents and bends for 127/128 of themselves; TiMidity++
knows steps of about 0.4 cents, a bend range of 24 semitones at most and only some messages
(handbook, libraries.md 4a and standards.md 4). The sound font is exactly tuned, its key 69 at
441 Hz, where the files have 440.
"""

from __future__ import annotations

import os
import shutil
import subprocess
from collections.abc import Callable
from functools import cache
from pathlib import Path

import numpy as np
import pytest
import soundfile

from retune.export.base import Exporter
from retune.export.midi import MidiExporter, MidiOptions
from retune.export.midi_channels import Channels
from retune.export.mpe import MpeExporter, MpeOptions
from retune.export.mts import Form, MtsExporter, MtsOptions
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from tests.adapters.test_soundfont import font_bytes
from tests.export.building import choir, sung, tuned_score
from tests.voice.measuring import measured_hz

RATE = 44_100
PROGRAM = 53


def needs(program: str) -> pytest.MarkDecorator:
    return pytest.mark.skipif(
        shutil.which(program) is None and os.environ.get("CI") != "true",
        reason=f"needs {program}: sudo apt-get install {program}",
    )


fluidsynth, timidity = needs("fluidsynth"), needs("timidity")


@cache
def chords() -> TunedScore:
    """Three chords of four parts: keys tuned to both sides, one key tuned apart in two parts, two
    notes that move while they sound.

    All lie within an octave, so that no harmonic of one note falls on the first of another.
    """
    return tuned_score(
        [
            sung(0, 0, "G4", (2, 1.955), (2, -3.0)),
            sung(0, 4, "A4", (2, -15.641)),
            sung(1, 0, "E4", (2, -13.686)),
            sung(1, 2, "F4", (2, -1.955)),
            sung(1, 4, "F4", (2, 19.55)),
            sung(2, 0, "C4", (2, 0.0), (2, -4.9)),
            sung(2, 4, "E4", (2, 2.2)),
            sung(3, 0, "A#3", (2, -31.174)),
            sung(3, 2, "A3", (2, -49.0)),
            sung(3, 4, "B3", (2, 48.0)),
        ]
    )


@cache
def line() -> TunedScore:
    """One part, a key at two tunings and one that moves while it sounds."""
    tones = (("C4", 0.0), ("E4", -13.686), ("G4", 1.955), ("E4", 20.0), ("A#4", -31.174))
    notes = [sung(0, 2 * place, pitch, (2, cents)) for place, (pitch, cents) in enumerate(tones)]
    return tuned_score([*notes, sung(0, 10, "C5", (2, 4.0), (2, -0.9))], parts=choir(1))


@cache
def steady() -> TunedScore:
    """The chords with the moving notes struck again."""
    notes = [
        sung(note.note.part, segment.onset, str(note.note.pitch), (2, segment.cents))
        for note in chords().notes
        for segment in note.segments
    ]
    return tuned_score(notes)


@cache
def many() -> TunedScore:
    """Twenty parts, four of them after another, each with a bend of its own."""
    names = ("C4", "E4", "G4", "A4")
    notes = [
        sung(part, 2 * (part // 4), names[part % 4], (2, 4.7 * part - 45.0)) for part in range(20)
    ]
    return tuned_score(notes, parts=choir(20))


def errors_of(piece: TunedScore, sound: np.ndarray) -> list[float]:
    """How far each segment is off its tuned pitch in cents, on the font's own reference."""
    errors = []
    for one in piece.notes:
        for segment in one.segments:
            target = piece.hz(one, segment) * 441.0 / 440.0
            # A glide is over after 40 milliseconds.
            start, stop = piece.seconds(segment.onset) + 0.2, piece.seconds(segment.end) - 0.1
            stretch = sound[round(start * RATE) : round(stop * RATE)]
            errors.append(1200 * np.log2(measured_hz(stretch, target, partials=1) / target))
    return errors


def played(synth: str, data: bytes, folder: Path) -> np.ndarray:
    font, song, out = folder / "exact.sf2", folder / "song.mid", folder / "out.wav"
    # Members of an MPE zone are sent no program: a synth that knows no zone plays their first.
    font.write_bytes(font_bytes(0))
    song.write_bytes(data)
    if synth == "fluidsynth":
        command = ["fluidsynth", "-ni", "-R", "0", "-C", "0", "-r", str(RATE), "-g", "0.4"]
        command += ["-F", str(out), str(font), str(song)]
    else:
        config = folder / "timidity.cfg"
        tones = "\n".join(f'{tone} %font "{font}" 0 0 amp=50' for tone in (0, PROGRAM))
        config.write_text(f"bank 0\n{tones}\n")
        command = ["timidity", "-c", str(config), "-Ow", "-s", str(RATE), "-EFreverb=0"]
        command += ["-EFchorus=0", "-o", str(out), str(song)]
    subprocess.run(command, check=True, capture_output=True, timeout=60)
    sound, rate = soundfile.read(out)
    assert rate == RATE
    return np.asarray(sound if sound.ndim == 1 else sound.mean(axis=1))


def file_of(piece: TunedScore, exporter: Exporter, options: object) -> bytes:
    (file,) = exporter.export([Take(piece)], options)
    return file.data


# The greatest error that each synth itself makes: FluidSynth takes off up to 1 cent and 1/128 of
# the bend (0.4 cents of 50), TiMidity++ errs by up to 1 cent in these octaves (libraries.md 4a);
# MPE at 48 semitones adds its own 0.29.
FLUID = [
    pytest.param(chords, MidiExporter(), MidiOptions(), 1.45, id="bend"),
    pytest.param(chords, MidiExporter(), MidiOptions(channels=Channels.ONE), 1.45, id="one"),
    pytest.param(chords, MidiExporter(), MidiOptions(bend_range=12), 1.45, id="bend 12"),
    pytest.param(chords, MpeExporter(), MpeOptions(), 1.75, id="mpe"),
    pytest.param(chords, MpeExporter(), MpeOptions(members=8), 1.75, id="mpe of 8 members"),
    pytest.param(chords, MtsExporter(), MtsOptions(), 1.05, id="single"),
    # It has one octave tuning for all channels, so that one part is all it can play so.
    pytest.param(line, MtsExporter(), MtsOptions(form=Form.OCTAVE), 1.05, id="octave"),
]
TIMIDITY = [
    pytest.param(chords, MidiExporter(), MidiOptions(), 1.1, id="bend"),
    pytest.param(chords, MidiExporter(), MidiOptions(channels=Channels.ONE), 1.1, id="one"),
    pytest.param(chords, MidiExporter(), MidiOptions(bend_range=24), 1.1, id="bend 24"),
    pytest.param(many, MidiExporter(), MidiOptions(ports=True), 1.1, id="ports"),
    pytest.param(chords, MpeExporter(), MpeOptions(bend_range=24), 1.1, id="mpe 24"),
    pytest.param(chords, MtsExporter(), MtsOptions(), 1.1, id="single"),
    pytest.param(many, MtsExporter(), MtsOptions(), 1.1, id="single, shared"),
    pytest.param(steady, MtsExporter(), MtsOptions(form=Form.BULK), 1.1, id="bulk"),
]


@fluidsynth
@pytest.mark.parametrize(("piece", "exporter", "options", "bound"), FLUID)
def test_fluidsynth_plays_what_is_tuned(
    piece: Callable[[], TunedScore],
    exporter: Exporter,
    options: object,
    bound: float,
    tmp_path: Path,
) -> None:
    sound = played("fluidsynth", file_of(piece(), exporter, options), tmp_path)
    errors = errors_of(piece(), sound)
    assert max(map(abs, errors)) < bound, errors


@timidity
@pytest.mark.parametrize(("piece", "exporter", "options", "bound"), TIMIDITY)
def test_timidity_plays_what_is_tuned(
    piece: Callable[[], TunedScore],
    exporter: Exporter,
    options: object,
    bound: float,
    tmp_path: Path,
) -> None:
    sound = played("timidity", file_of(piece(), exporter, options), tmp_path)
    errors = errors_of(piece(), sound)
    assert max(map(abs, errors)) < bound, errors


@fluidsynth
def test_what_a_synth_does_not_know_is_heard(tmp_path: Path) -> None:
    """The measure itself: FluidSynth ignores bulk dumps and plays equal temperament."""
    data = file_of(chords(), MtsExporter(), MtsOptions(form=Form.BULK))
    errors = errors_of(chords(), played("fluidsynth", data, tmp_path))
    cents = [segment.cents for one in chords().notes for segment in one.segments]
    assert errors == pytest.approx([-value for value in cents], abs=0.1)
