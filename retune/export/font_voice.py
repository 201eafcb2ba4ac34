"""Parts played by a sound font instead of the built-in voice."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from retune.adapters.soundfont import FontNote, render, require_soundfont
from retune.export.midi import VOICE_OOHS
from retune.export.midi_plan import pitch_of
from retune.score.model import Part, PartKind
from retune.tuning.model import TunedNote, TunedScore
from retune.voice.stems import TAIL_SECONDS


def font_stem(font: Path, rate: int) -> Callable[[TunedScore, int], NDArray[np.float32]]:
    """What plays a part through a sound font.

    Raises `OutputError` where the font cannot be read or there is no player for it.
    """
    require_soundfont(font)

    def play(tuned: TunedScore, part: int) -> NDArray[np.float32]:
        """One part, mono, as long as the score and its tail."""
        who = tuned.score.parts[part]
        notes = [_font_note(tuned, one) for one in tuned.notes if one.note.part == part]
        seconds = tuned.seconds(tuned.score.end) + TAIL_SECONDS
        click = who.kind is PartKind.CLICK
        return render(notes, _program(who), seconds, font, rate, percussion=click)

    return play


def _program(part: Part) -> int:
    if part.tuned or part.program is None:
        return VOICE_OOHS if part.tuned else 0
    return part.program


def _font_note(tuned: TunedScore, one: TunedNote) -> FontNote:
    note = one.note
    return FontNote(
        tuned.seconds(note.onset),
        tuned.seconds(note.end),
        note.velocity,
        tuple((tuned.seconds(s.onset), pitch_of(tuned, one, s)) for s in one.segments),
    )
