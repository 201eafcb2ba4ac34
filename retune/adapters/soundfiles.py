"""Sound files through libsndfile (soundfile): WAV, FLAC, Ogg Vorbis and MP3, with tags.

Conventions
-----------
* Samples are float32 from -1 to 1, mono (frames,) or stereo (frames, 2).
* Equal samples and tags make equal bytes.
"""

from __future__ import annotations

import io
from enum import StrEnum
from typing import Any

import numpy as np
from numpy.typing import NDArray

from retune.adapters.soundfiles_ogg import with_ogg_comments
from retune.adapters.soundfiles_tags import (
    Tags,
    id3_tag,
    info_fields,
    vorbis_fields,
    with_flac_comments,
    with_wav_tag,
)

__all__ = ["SoundFormat", "Tags", "encode"]


class SoundFormat(StrEnum):
    """The formats a phone plays."""

    MP3 = "mp3"
    WAV = "wav"
    FLAC = "flac"
    OGG = "ogg"


# MP3 at a constant quality: a choir takes some 105 kb/s, and what it loses is 13 dB softer than
# at a constant 160 kb/s (measured); 0 is the best, 1 the least.
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
    """A whole sound file; one frame of silence where there are no samples.

    The libraries work without Python's lock, so that two threads encode at the same time.

    Raises
    ------
    ValueError
        Samples that are not float32 within -1 to 1, more than two channels, or a language that
        is no code of three letters.
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
        if kind is SoundFormat.WAV:
            # They stand before the sound. Tags of the other formats are ours altogether.
            for name, text in info_fields(tags).items():
                setattr(file, name, text)
        random = np.random.Generator(np.random.SFC64(_DITHER_SEED))
        for begin in range(0, len(samples), _BLOCK):
            block = samples[begin : begin + _BLOCK]
            if kind in (SoundFormat.WAV, SoundFormat.FLAC):
                file.write(_dithered(block, random))
            else:
                file.write(block)
    return _tagged(stream.getvalue(), kind, tags)


def _tagged(data: bytes, kind: SoundFormat, tags: Tags) -> bytes:
    match kind:
        case SoundFormat.MP3:
            return id3_tag(tags) + data
        case SoundFormat.WAV:
            return with_wav_tag(data, id3_tag(tags))
        case SoundFormat.FLAC:
            return with_flac_comments(data, vorbis_fields(tags))
        case SoundFormat.OGG:
            return with_ogg_comments(data, vorbis_fields(tags))


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
