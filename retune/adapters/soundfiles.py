"""Sound files through libsndfile (soundfile): WAV, FLAC, Ogg Vorbis and MP3, with tags.

Conventions
-----------
* Samples are float32 from -1 to 1, mono (frames,) or stereo (frames, 2).
* Equal samples and tags make equal bytes, but for the serial number of an Ogg stream.
"""

from __future__ import annotations

import io
import unicodedata
from dataclasses import dataclass
from enum import StrEnum
from typing import Any

import numpy as np
from numpy.typing import NDArray

from retune.adapters.id3 import id3_header


class SoundFormat(StrEnum):
    """The formats a phone plays."""

    MP3 = "mp3"
    WAV = "wav"
    FLAC = "flac"
    OGG = "ogg"


@dataclass(frozen=True, slots=True)
class Tags:
    """What a player shows. `language` is an ISO 639-2 code; track n of N, 0 for none."""

    title: str
    album: str = ""
    composer: str = ""
    lyricist: str = ""
    copyright: str = ""
    track: int = 0
    of: int = 0
    lyrics: str = ""
    comment: str = ""
    language: str = ""


# MP3 at a constant quality of about 150 kb/s for a choir (measured); 0 is the best, 1 the least.
_SETTINGS: dict[SoundFormat, dict[str, Any]] = {
    SoundFormat.MP3: {
        "format": "MP3",
        "subtype": "MPEG_LAYER_III",
        "bitrate_mode": "VARIABLE",
        "compression_level": 0.2,
    },
    SoundFormat.WAV: {"format": "WAV", "subtype": "PCM_16"},
    SoundFormat.FLAC: {"format": "FLAC", "subtype": "PCM_16", "compression_level": 0.5},
    SoundFormat.OGG: {"format": "OGG", "subtype": "VORBIS", "compression_level": 0.4},
}
_BLOCK = 8192
"""Frames written at a time: more than some two million at once crash the Vorbis encoder."""

_DITHER_SEED = 1
_SIXTEEN_BITS = 32767.0


def encode(samples: NDArray[np.float32], rate: int, kind: SoundFormat, tags: Tags) -> bytes:
    """A whole sound file.

    Raises `ValueError` for samples that are not float32 within -1 to 1, or more than two
    channels.
    """
    import soundfile

    _require_sound(samples)
    if not len(samples):
        # No reader takes an empty MP3 or FLAC file.
        samples = np.zeros((1, *samples.shape[1:]), np.float32)
    channels = 1 if samples.ndim == 1 else samples.shape[1]
    stream = io.BytesIO()
    with soundfile.SoundFile(
        stream, "w", samplerate=rate, channels=channels, **_SETTINGS[kind]
    ) as file:
        # Tags stand before the sound; those of MP3 files are ours, see `id3`.
        if kind is not SoundFormat.MP3:
            for name, text in _fields(kind, tags).items():
                setattr(file, name, text)
        random = np.random.Generator(np.random.SFC64(_DITHER_SEED))
        for begin in range(0, len(samples), _BLOCK):
            block = samples[begin : begin + _BLOCK]
            if kind in (SoundFormat.WAV, SoundFormat.FLAC):
                file.write(_dithered(block, random))
            else:
                file.write(block)
    data = stream.getvalue()
    return _header(tags) + data if kind is SoundFormat.MP3 else data


def _require_sound(samples: NDArray[np.float32]) -> None:
    if samples.dtype != np.float32 or samples.ndim not in (1, 2):
        raise ValueError("samples must be float32, mono or stereo")
    if samples.ndim == 2 and samples.shape[1] not in (1, 2):
        raise ValueError("more than two channels")
    # A sum is not finite where any sample is not, and needs no copy.
    peak = max(float(samples.max(initial=0.0)), -float(samples.min(initial=0.0)))
    if not peak <= 1.0:
        raise ValueError("samples beyond -1 to 1")


def _dithered(block: NDArray[np.float32], random: np.random.Generator) -> NDArray[np.int16]:
    """16-bit samples with triangular dither of one step to either side, so that soft sound keeps
    its pitch instead of being distorted (Lipshitz, Wannamaker & Vanderkooy 1992, from memory)."""
    noise = random.random((2, *block.shape), np.float32)
    scaled = block * np.float32(_SIXTEEN_BITS - 1.0) + noise[0] - noise[1]
    whole: NDArray[np.int16] = np.rint(scaled).astype(np.int16)
    return whole


def _fields(kind: SoundFormat, tags: Tags) -> dict[str, str]:
    """Tags by the library's names; WAV's INFO chunk is ASCII."""
    number = f"{tags.track}/{tags.of}" if tags.of else str(tags.track or "")
    found = {
        "title": tags.title,
        "artist": tags.composer,
        "album": tags.album,
        "tracknumber": number,
        "copyright": tags.copyright,
        "comment": tags.comment,
    }
    plain = _ascii if kind is SoundFormat.WAV else _clean
    return {name: plain(text) for name, text in found.items() if text}


def _clean(text: str) -> str:
    """Text without control characters, which end a tag before its time."""
    return "".join(" " if unicodedata.category(char) == "Cc" else char for char in text)


def _ascii(text: str) -> str:
    """The nearest ASCII: accents go, other letters become question marks."""
    parts = unicodedata.normalize("NFKD", _clean(text).replace("–", "-").replace("’", "'"))
    bare = "".join(char for char in parts if not unicodedata.combining(char))
    return bare.encode("ascii", "replace").decode("ascii")


def _header(tags: Tags) -> bytes:
    number = f"{tags.track}/{tags.of}" if tags.of else str(tags.track or "")
    texts = {
        "TIT2": tags.title,
        "TALB": tags.album,
        "TPE1": tags.composer,
        "TCOM": tags.composer,
        "TEXT": tags.lyricist,
        "TCOP": _copyright(tags.copyright),
        "TRCK": number,
    }
    cleaned = {name: _clean(text) for name, text in texts.items()}
    return id3_header(cleaned, tags.lyrics, _clean(tags.comment), tags.language or "und")


def _copyright(text: str) -> str:
    """ID3v2.3 wants the year and a space first; without a year the frame is left out."""
    return text if text[:4].isdigit() and text[4:5] == " " else ""
