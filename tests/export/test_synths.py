"""Every MIDI layout as two independent open synths play it, measured by spectrum.

FluidSynth takes pitches down to whole cents and bends for 127/128 of themselves; TiMidity++ knows
steps of about 0.4 cents, a bend range of 24 semitones at most and only some messages (handbook,
libraries.md 4a and standards.md 4). The sound font is exactly tuned, its key 69 at 441 Hz.
"""

from __future__ import annotations

import os
import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest
import soundfile

from retune.export.base import Exporter
from retune.export.midi import MidiExporter, MidiOptions
from retune.export.mpe import MpeExporter, MpeOptions
from retune.export.mts import Form, MtsExporter, MtsOptions
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from tests.adapters.test_soundfont import font_bytes
from tests.export.building import sung, tuned_score
from tests.voice.measuring import measured_hz

RATE = 44_100

# A just scale of an octave on C4 and some held chords' tones, as (pitch, cents).
TONES = (
    ("C4", 0.0),
    ("D4", 3.910),
    ("E4", -13.686),
    ("F4", -1.955),
    ("G4", 1.955),
    ("A4", -15.641),
    ("B4", -11.731),
    ("Bb4", -31.174),
    ("Eb4", 15.641),
    ("F#4", 49.0),
)


def needs(program: str) -> pytest.MarkDecorator:
    return pytest.mark.skipif(
        shutil.which(program) is None and os.environ.get("CI") != "true",
        reason=f"needs {program}: sudo apt-get install {program}",
    )


def piece(tuned: bool = True) -> TunedScore:
    """Each tone by itself for two seconds, in two parts by turns; or the same untuned."""
    notes = [
        sung(place % 2, 2 * place, pitch, (2, cents if tuned else 0.0))
        for place, (pitch, cents) in enumerate(TONES)
    ]
    return tuned_score(notes, parts=["Alto", "Tenor"])


def heard(sound: np.ndarray, tuned: bool) -> list[float]:
    """The frequency of each tone in Hz, looked for near its pitch on the font's reference."""
    score = piece(tuned)
    found = []
    for place, one in enumerate(score.notes):
        near = score.hz(one, one.segments[0]) * 441.0 / 440.0
        stretch = sound[round((2 * place + 0.4) * RATE) : round((2 * place + 1.7) * RATE)]
        found.append(measured_hz(stretch, near, partials=4))
    return found


def played_by(synth: str, data: bytes, folder: Path, program: int = 53) -> np.ndarray:
    font, song, out = folder / "exact.sf2", folder / "song.mid", folder / "out.wav"
    font.write_bytes(font_bytes(program))
    song.write_bytes(data)
    if synth == "fluidsynth":
        command = ["fluidsynth", "-ni", "-R", "0", "-C", "0", "-r", str(RATE), "-F", str(out)]
        command += [str(font), str(song)]
    else:
        config = folder / "timidity.cfg"
        config.write_text(f"soundfont {font}\n")
        command = ["timidity", "-c", str(config), "-Ow", "-s", str(RATE), "-EFreverb=0"]
        command += ["-EFchorus=0", "-o", str(out), str(song)]
    subprocess.run(command, check=True, capture_output=True, timeout=60)
    sound, rate = soundfile.read(out)
    assert rate == RATE
    return sound if sound.ndim == 1 else sound.sum(axis=1)


def file_of(exporter: Exporter, options: object, tuned: bool = True) -> bytes:
    (file,) = exporter.export([Take(piece(tuned))], options)
    return file.data


LAYOUTS = [
    # Greatest error in cents that the synth itself makes (measured, libraries.md 4a).
    pytest.param("fluidsynth", MidiExporter(), MidiOptions(), 53, 1.3, id="bend fluidsynth"),
    pytest.param("timidity", MidiExporter(), MidiOptions(), 53, 1.3, id="bend timidity"),
    pytest.param(
        "fluidsynth", MidiExporter(), MidiOptions(bend_range=12), 53, 1.3, id="bend 12 fluidsynth"
    ),
    pytest.param(
        "fluidsynth", MpeExporter(), MpeOptions(program=0, members=8), 0, 1.6, id="mpe fluidsynth"
    ),
    pytest.param("fluidsynth", MtsExporter(), MtsOptions(), 53, 1.1, id="single fluidsynth"),
    pytest.param("timidity", MtsExporter(), MtsOptions(), 53, 1.3, id="single timidity"),
    pytest.param(
        "timidity", MtsExporter(), MtsOptions(form=Form.BULK), 53, 1.3, id="bulk timidity"
    ),
]


@needs("fluidsynth")
@needs("timidity")
@pytest.mark.parametrize(("synth", "exporter", "options", "program", "bound"), LAYOUTS)
def test_a_synth_plays_what_is_tuned(
    synth: str, exporter: Exporter, options: object, program: int, bound: float, tmp_path: Path
) -> None:
    found = heard(played_by(synth, file_of(exporter, options), tmp_path, program), True)
    plain = file_of(MidiExporter(), MidiOptions(program=program), tuned=False)
    untuned = heard(played_by(synth, plain, tmp_path, program), False)
    errors = [
        1200 * np.log2(hz / other) - cents
        for hz, other, (_, cents) in zip(found, untuned, TONES, strict=True)
    ]
    assert max(map(abs, errors)) < bound, errors
