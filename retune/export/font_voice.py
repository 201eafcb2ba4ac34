"""Parts played by a sound font instead of the built-in voice."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from retune.adapters.soundfont import FontNote, render, require_soundfont
from retune.export.audio_mix import Player
from retune.export.midi_mix import VOICE_OOHS
from retune.export.midi_plan import pitch_of
from retune.score.model import Part, PartKind
from retune.tuning.model import TunedNote, TunedScore
from retune.voice.options import SoundOptions
from retune.voice.stems import TAIL_SECONDS, stem


def font_stem(font: Path, voices: int, rate: int) -> Player:
    """What plays a part through a sound font, `voices` being the program of those who sing.

    Clicks keep their own sound, as many fonts have no drums.

    Raises `OutputError` where the font cannot be read or there is no player for it.
    """
    require_soundfont(font)

    def play(tuned: TunedScore, part: int) -> NDArray[np.float32]:
        """One part, mono, as long as the score and its tail."""
        who = tuned.score.parts[part]
        if who.kind is PartKind.CLICK:
            return stem(tuned, part, SoundOptions(), rate)
        notes = [_font_note(tuned, one) for one in tuned.notes if one.note.part == part]
        seconds = tuned.seconds(tuned.score.end) + TAIL_SECONDS
        return render(notes, _program(who, voices), seconds, font, rate)

    return play


def _program(part: Part, voices: int) -> int:
    if part.tuned or (part.kind is PartKind.GUIDE and part.program == VOICE_OOHS):
        return voices
    return part.program or 0


def _font_note(tuned: TunedScore, one: TunedNote) -> FontNote:
    note = one.note
    return FontNote(
        tuned.seconds(note.onset),
        tuned.seconds(note.end),
        note.velocity,
        tuple((tuned.seconds(s.onset), pitch_of(tuned, one, s)) for s in one.segments),
    )
