"""Learning tracks as sound: pitch, beats, loudness, length and tags, measured from the files.

Loudness and peaks by ITU-R BS.1770 (pyloudnorm); beat rates by f_beat = |p f_low - q f_high|
(handbook, voice.md 3.1).
"""

from __future__ import annotations

import io
from functools import cache

import numpy as np
import pytest
import soundfile

from retune.adapters.loudness import integrated_lufs, true_peak_db
from retune.adapters.soundfiles import SoundFormat
from retune.errors import OutputError, WishError
from retune.export.audio import AudioExporter, AudioOptions
from retune.export.audio_level import levelled
from retune.export.audio_mix import RATE, Stems, mixed, panned
from retune.export.audio_words import part_words
from retune.tracks.learning import excerpt, learning_takes
from retune.tracks.options import Drone, TrackOptions
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.policy import Temperament
from retune.voice.options import SoundOptions
from retune.voice.room import Room, in_room
from retune.voice.stems import stem
from tests.tracks.pieces import NAMES, tuned
from tests.voice.measuring import measured_hz

WAV = AudioOptions(format=SoundFormat.WAV)


def plain_stem(played: TunedScore, part: int) -> np.ndarray:
    """A part as it sounds by default."""
    return stem(played, part, SoundOptions(), RATE)


@cache
def files(name: str, bars: str, sides: bool = False) -> dict[str, tuple[np.ndarray, Take]]:
    """Sound and take of every file of an excerpt, by the file's name."""
    takes = learning_takes(excerpt(tuned(name), bars), TrackOptions(sides=sides))
    found = {}
    for file, take in zip(AudioExporter().export(takes, WAV), takes, strict=True):
        sound, rate = soundfile.read(io.BytesIO(file.data), dtype="float32")
        assert rate == RATE
        found[file.name] = (sound, take)
    return found


def held_segments(take: Take) -> list[tuple[float, float]]:
    """Start in seconds and frequency of what the take's own part holds for 0.9 s or longer."""
    played = take.played
    return [
        (played.seconds(segment.onset), played.hz(one, segment))
        for one in played.notes
        if played.score.parts[one.note.part].name == take.folder
        for segment in one.segments
        if played.seconds(segment.end) - played.seconds(segment.onset) >= 0.9
    ]


@pytest.mark.parametrize("name", NAMES)
def test_held_notes_of_alone_tracks_have_their_tuned_pitch(name: str) -> None:
    piece = tuned(name)
    wish = TrackOptions(accompaniment_db=-np.inf)
    takes = [t for t in learning_takes(piece, wish) if t.name.endswith("alone")]
    stems = Stems(takes, plain_stem)
    measured = 0
    for take in takes:
        sound = mixed(take, stems).sum(axis=1)
        for begin, hz in held_segments(take)[:12]:
            heard = sound[round((begin + 0.2) * RATE) : round((begin + 0.6) * RATE)]
            error = 1200.0 * np.log2(measured_hz(heard.astype(float), hz) / hz)
            assert abs(error) < 0.5, (take.name, begin)
            measured += 1
    assert measured > 10


def test_beats_are_those_that_the_pitches_predict() -> None:
    """A held third of the hymn's last chord: it beats in equal temperament, not in just."""
    depths = {}
    for temperament in (Temperament.JUST, Temperament.EQUAL):
        piece = tuned("harbour-hymn", temperament)
        last = piece.harmony.chords[-1]
        held = {
            piece.score.parts[n.note.part].name: piece.hz(n, n.segments[-1])
            for n in piece.notes
            if n.note.end == piece.score.end
        }
        begin = piece.seconds(last.onset)
        stems = [stem(piece, p.index, SoundOptions(), RATE) for p in piece.score.parts]
        sound = np.sum(stems, axis=0)[
            round((begin + 0.3) * RATE) : round((piece.seconds(last.end) - 0.3) * RATE)
        ]
        depths[temperament] = _beating(sound.astype(float), held)
    just, equal = depths[Temperament.JUST], depths[Temperament.EQUAL]
    assert len(equal) == len(just) > 0
    for (rate_just, predicted_just), (rate_equal, predicted_equal) in zip(just, equal, strict=True):
        assert rate_equal == pytest.approx(predicted_equal, abs=0.1)
        assert rate_just == pytest.approx(predicted_just, abs=0.1)
        assert predicted_just <= predicted_equal / 10.0


def _beating(sound: np.ndarray, held: dict[str, float]) -> list[tuple[float, float]]:
    """(measured, predicted) beat rate in Hz of every major third, tenth and seventeenth."""
    names = sorted(held, key=lambda name: held[name])
    pairs = []
    for low in names:
        for high in names:
            ratio = held[high] / held[low]
            for p, q in ((5, 4), (5, 2), (5, 1)):
                if abs(1200 * np.log2(ratio * q / p)) < 30.0:
                    first, second = p * held[low], q * held[high]
                    centre = (first + second) / 2
                    pairs.append((_envelope_rate(sound, centre), abs(first - second)))
    return pairs


def _envelope_rate(sound: np.ndarray, centre: float) -> float:
    """Rate in Hz at which the amplitude around one frequency goes up and down; 0 for steady."""
    time = np.arange(len(sound)) / RATE
    base = sound * np.exp(-2j * np.pi * centre * time)
    width = RATE // 30
    kernel = np.hanning(width)
    envelope = np.abs(np.convolve(base, kernel / kernel.sum(), "valid"))[:: RATE // 200]
    if envelope.std() < 0.1 * envelope.mean():
        return 0.0
    wave = (envelope - envelope.mean()) * np.hanning(len(envelope))
    spectrum = np.abs(np.fft.rfft(wave, 1 << 16))
    return float(np.argmax(spectrum) * 200.0 * (RATE / 200 / (RATE // 200)) / (1 << 16))


@pytest.mark.parametrize(("name", "bars"), [("regatta-day", "1-4"), ("lamp-night", "9-12")])
def test_all_files_are_equally_loud_bounded_and_equally_long(name: str, bars: str) -> None:
    found = files(name, bars, sides=True)
    lengths = {len(sound) for sound, _ in found.values()}
    assert len(lengths) == 1
    for label, (sound, take) in found.items():
        assert integrated_lufs(sound, RATE) == pytest.approx(-18.0, abs=0.2), label
        assert true_peak_db(sound, RATE) <= -1.0
        # A fade-in: nothing is heard of the first millisecond.
        assert np.abs(sound[:44]).max() < 3e-3
        seconds = take.played.seconds(take.played.score.end)
        assert seconds <= len(sound) / RATE <= seconds + 2.0
        if take.sides:
            left, right = (integrated_lufs(np.ascontiguousarray(c), RATE) for c in sound.T)
            assert left == pytest.approx(right, abs=0.1)


def test_names_as_in_the_design() -> None:
    names = list(files("regatta-day", "1-4"))
    assert names[0] == "tracks/00 Full mix - regatta-day.wav"
    assert "tracks/Alto/07 Alto predominant - regatta-day.wav" in names


def test_predominant_missing_and_alone_differ_as_told() -> None:
    piece = excerpt(tuned("harbour-hymn"), "1-4")
    takes = {t.name: t for t in learning_takes(piece, TrackOptions())}
    stems = Stems(takes.values(), plain_stem)
    sounds = {
        name: mixed(takes[name], stems)
        for name in ("Full mix", "Alto predominant", "Alto alone", "Alto missing")
    }
    begin = round(takes["Full mix"].played.seconds(takes["Full mix"].played.score.bars[-4].onset))
    music = slice(begin * RATE, None)
    full, alone, missing = (
        sounds[f"{name}"][music] for name in ("Full mix", "Alto alone", "Alto missing")
    )
    assert np.abs(full - alone - missing).max() < 1e-5
    front = sounds["Alto predominant"][music]
    assert np.abs(front - alone - 10 ** (-9 / 20) * missing).max() < 1e-5


def test_a_part_is_synthesised_once_for_all_takes() -> None:
    calls: list[str] = []

    def player(played: TunedScore, part: int) -> np.ndarray:
        calls.append(played.score.parts[part].name)
        return np.ones(10, np.float32)

    takes = learning_takes(tuned("harbour-hymn"), TrackOptions(drone=Drone()))
    stems = Stems(takes, player)
    for take in takes:
        mixed(take, stems)
    assert calls.count("Soprano") == calls.count("Bass") == calls.count("Drone") == 1
    # One with each singer's own note, and that of the full mix.
    assert calls.count("Starting notes") == 5


def test_pan_keeps_power() -> None:
    for place in np.linspace(-1, 1, 21):
        left, right = panned(float(place))
        assert left**2 + right**2 == pytest.approx(1.0)


def test_loud_places_are_held_below_the_peak() -> None:
    time = np.arange(4 * RATE) / RATE
    soft = 0.02 * np.sin(2 * np.pi * 300 * time)
    soft[RATE : RATE + 400] *= 45.0
    sound = np.stack([soft, soft], axis=1).astype(np.float32)
    out = levelled(sound.copy(), RATE, -18.0)
    assert true_peak_db(out, RATE) <= -1.0
    # Away from the loud place nothing but the gain changed.
    ratio = out[3 * RATE : 3 * RATE + 1000, 0] / sound[3 * RATE : 3 * RATE + 1000, 0]
    heard = np.abs(sound[3 * RATE : 3 * RATE + 1000, 0]) > 1e-3
    assert np.ptp(ratio[heard]) < 1e-4 * ratio[heard].mean()


def test_silence_stays_silence() -> None:
    assert not np.any(levelled(np.zeros((RATE, 2), np.float32), RATE, -18.0))


def test_a_room_rings_on_and_keeps_the_pitch() -> None:
    time = np.arange(3 * RATE) / RATE
    tone = np.where(time < 1.0, 0.1 * np.sin(2 * np.pi * 330.0 * time), 0.0)
    sound = np.stack([tone, tone], axis=1).astype(np.float32)
    wet = in_room(sound, RATE, Room.CHURCH)
    assert wet.shape == sound.shape
    after = wet[round(1.1 * RATE) : round(1.5 * RATE)]
    assert 1e-4 < np.abs(after).max() < 0.1
    held = wet[round(0.4 * RATE) : round(0.9 * RATE)].sum(axis=1).astype(float)
    assert 1200 * np.log2(measured_hz(held, 330.0) / 330.0) == pytest.approx(0.0, abs=3.0)
    assert in_room(sound, RATE, Room.OFF) is sound


def test_words_for_the_tags() -> None:
    text = part_words(tuned("harbour-hymn").score, 0)
    assert "-" not in text.replace("\n", " ").split()
    first = [n.lyric for n in tuned("harbour-hymn").score.notes if n.part == 0][:6]
    assert text.startswith(" ".join(first).replace("- ", "")[:12])


@pytest.mark.parametrize(
    ("wish", "match"),
    [
        (AudioOptions(vowel="q"), "audio.vowel cannot be 'q'"),
        (AudioOptions(language="germn"), "audio.language cannot be 'germn'"),
        (AudioOptions(loudness=0.0), "audio.loudness cannot be"),
        (AudioOptions(singers=0), "audio.singers cannot be"),
    ],
)
def test_options_that_cannot_be(wish: AudioOptions, match: str) -> None:
    with pytest.raises(WishError, match=match):
        list(AudioExporter().export([Take(tuned("harbour-hymn"))], wish))


def test_a_font_that_is_not_there(tmp_path: object) -> None:
    wish = AudioOptions(soundfont=f"{tmp_path}/none.sf2")
    with pytest.raises(OutputError, match="cannot be read"):
        list(AudioExporter().export([Take(tuned("harbour-hymn"))], wish))
