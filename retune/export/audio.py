"""The exporter `audio`: each take as a sound file, in the built-in voice or a sound font's.

A part is synthesised once and mixed into every take. All files of a run come out equally loud
(ITU-R BS.1770), with peaks bounded and a fade at both ends.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import ClassVar

from retune.adapters.soundfiles import SoundFormat, Tags, encode
from retune.errors import OutputError, Place, WishError
from retune.export.audio_level import levelled
from retune.export.audio_mix import RATE, Player, Stems, mixed
from retune.export.audio_words import LANGUAGE_CODES, words_of
from retune.export.base import LateFile
from retune.export.midi_mix import VOICE_OOHS
from retune.export.names import safe_name
from retune.export.options import did_you_mean, require_allowed
from retune.tracks.take import Take
from retune.voice.formants import VOWELS
from retune.voice.language import LANGUAGES
from retune.voice.options import SoundOptions
from retune.voice.room import Room, in_room
from retune.voice.stems import stem

FOLDER = "tracks"


@dataclass(frozen=True, slots=True)
class AudioOptions:
    """Options of the exporter."""

    format: SoundFormat = field(default=SoundFormat.MP3, metadata={"help": "mp3, wav, flac or ogg"})
    loudness: float = field(
        default=-18.0,
        metadata={"help": "loudness of every file in LUFS", "least": -36, "most": -14},
    )
    vowel: str = field(default="neutral", metadata={"help": "the vowel that is sung"})
    language: str = field(
        default="", metadata={"help": "sing the vowels of the text in this language"}
    )
    singers: int = field(
        default=4, metadata={"help": "singers in each part", "least": 1, "most": 8}
    )
    scatter: float = field(
        default=0.0,
        metadata={"help": "spread of the singers' pitches in cents", "least": 0, "most": 30},
    )
    vibrato: float = field(
        default=0.0,
        metadata={"help": "vibrato in cents to either side", "least": 0, "most": 100},
    )
    room: Room = field(
        default=Room.OFF, metadata={"help": "reverberation; leave it off to listen for beats"}
    )
    soundfont: str = field(
        default="", metadata={"help": "a sound font to play instead of the built-in voice"}
    )
    font_program: int = field(
        default=VOICE_OOHS,
        metadata={"help": "the font's program for the voices, from 0", "least": 0, "most": 127},
    )


class AudioExporter:
    """Writes each take as one sound file."""

    name: ClassVar[str] = "audio"
    summary: ClassVar[str] = "Sound files in a choir voice, or through a sound font"
    suffixes: ClassVar[tuple[str, ...]] = tuple(f".{one}" for one in SoundFormat)
    Options: ClassVar[type[AudioOptions]] = AudioOptions

    def export(self, takes: Sequence[Take], options: AudioOptions) -> Iterator[LateFile]:
        """Yield a file a take; its sound is rendered when its bytes are asked for.

        Raises
        ------
        OutputError
            There is no note, or the sound font or its player cannot be used.
        WishError
            An option is out of its range, or names no vowel or language.
        """
        require_allowed(self.name, options)
        _require_known("vowel", options.vowel, VOWELS)
        if options.language:
            _require_known("language", options.language, LANGUAGES)
        for take in takes:
            if not take.tuned.score.notes:
                raise OutputError("there is no note to sound", Place(take.tuned.score.file))
        stems = Stems(takes, _player(options))
        for take in takes:
            yield LateFile(_file_name(take, options.format), _renderer(take, stems, options))


def _require_known(option: str, value: str, known: Sequence[str]) -> None:
    if value not in known:
        raise WishError(
            f"audio.{option} cannot be '{value}'",
            hint=f"{did_you_mean(value, known)}It is one of {', '.join(known)}",
        )


def _player(options: AudioOptions) -> Player:
    """What makes the sound of a part."""
    if options.soundfont:
        from retune.export.font_voice import font_stem

        return font_stem(Path(options.soundfont), options.font_program, RATE)
    wish = SoundOptions(
        vowel=options.vowel,
        language=options.language,
        singers=options.singers,
        scatter_cents=options.scatter,
        vibrato_cents=options.vibrato,
    )
    return lambda tuned, part: stem(tuned, part, wish, RATE)


def _renderer(take: Take, stems: Stems, options: AudioOptions) -> Callable[[], bytes]:
    def render() -> bytes:
        """The bytes of one sound file."""
        sound = in_room(mixed(take, stems), RATE, options.room)
        sound = levelled(sound, RATE, options.loudness, take.sides)
        return encode(sound, RATE, options.format, _tags(take, options))

    return render


def _tags(take: Take, options: AudioOptions) -> Tags:
    """What a phone shows: "Alto predominant - NAME" in the album NAME."""
    score = take.tuned.score
    name = score.title or score.stem
    return Tags(
        title=f"{take.name} - {name}",
        album=name,
        composer=score.composer,
        lyricist=score.lyricist,
        copyright=score.copyright,
        track=take.track + 1,
        of=take.of + 1,
        lyrics=words_of(take),
        comment=_comment(take),
        language=LANGUAGE_CODES.get(options.language, ""),
    )


def _comment(take: Take) -> str:
    policy = take.tuned.policy
    return (
        f"{policy.temperament} intonation"
        if policy.temperament == "just"
        else f"{policy.temperament} temperament"
    ) + f", A4 = {policy.reference_hz:g} Hz. Start with the volume low."


def _file_name(take: Take, kind: SoundFormat) -> str:
    folders = [FOLDER, *([safe_name(take.folder)] if take.folder else [])]
    stem = safe_name(take.tuned.score.stem)
    digits = max(len(str(take.of)), 2)
    return "/".join([*folders, f"{take.track:0{digits}d} {safe_name(take.name)} - {stem}.{kind}"])
