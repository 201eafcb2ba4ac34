"""What a director may wish of the learning tracks."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum

from retune.errors import WishError
from retune.pitch import Pitch, PitchClass

LEAST_DB, MOST_DB = -60.0, 12.0
MOST_COUNT_IN, MOST_LOOPS = 8, 50


class StartingNotes(StrEnum):
    """What sounds before the count-in."""

    CHORD = "chord"
    TONIC = "tonic"
    NONE = "none"


class GuideSound(StrEnum):
    """What starting notes and drone sound like."""

    VOICE = "voice"
    KEYS = "keys"
    ORGAN = "organ"


class ClickSound(StrEnum):
    """What the count-in and the click sound like."""

    BLOCK = "block"
    STICKS = "sticks"
    BELL = "bell"


@dataclass(frozen=True, slots=True)
class Drone:
    """A note held below the music.

    With `root`, on the root of each chord; else on `pitch`, or on the home tonic where that is
    None. A pitch class sounds in the octave from C3 to B3.
    """

    root: bool = False
    pitch: Pitch | PitchClass | None = None

    @classmethod
    def parse(cls, text: str) -> Drone:
        """Read tonic, root, or a pitch such as D or D3; raises `WishError`."""
        word = text.strip().casefold()
        if word in ("tonic", "root"):
            return cls(root=word == "root")
        with_octave = word[-1:].isdigit()
        try:
            return cls(pitch=Pitch.parse(text) if with_octave else PitchClass.parse(text))
        except WishError as error:
            raise WishError(
                f"no drone on '{text}'", hint="It is tonic, root, or a pitch such as D or D3"
            ) from error


@dataclass(frozen=True, slots=True)
class TrackOptions:
    """What the learning tracks hold.

    Parameters
    ----------
    parts : tuple of str
        Names of the parts that get tracks, case ignored; all sung parts where empty.
    starting_notes, count_in
        What sounds before the music; the count-in in bars, 0 for none.
    click : bool
        Whether the click goes on through the piece.
    starting_sound, drone_sound, click_sound
        What they sound like.
    drone : Drone or None
    sides : bool
        Also a track with the part in the left ear and the rest in the right.
    others_db : float
        Level of the other voices where one part is predominant (common practice, no source:
        about -9).
    accompaniment_db : float
        Level of the accompaniment beside the voices; -inf for none.
    width : float
        How far the voices spread from the middle, 0 to 1 (the outermost hard left and right).
    loops : int
        How often the music is played.
    compare : str
        Bars that a track of its own plays just and then equal; "" for none.
    """

    parts: tuple[str, ...] = ()
    starting_notes: StartingNotes = StartingNotes.CHORD
    starting_sound: GuideSound = GuideSound.VOICE
    count_in: int = 1
    click: bool = False
    click_sound: ClickSound = ClickSound.BLOCK
    drone: Drone | None = None
    drone_sound: GuideSound = GuideSound.ORGAN
    sides: bool = False
    others_db: float = -9.0
    accompaniment_db: float = -6.0
    width: float = 0.3
    loops: int = 1
    compare: str = ""

    def __post_init__(self) -> None:
        for what, value, allowed in (
            ("count-in bars", self.count_in, 0 <= self.count_in <= MOST_COUNT_IN),
            ("loops", self.loops, 1 <= self.loops <= MOST_LOOPS),
            ("others in dB", self.others_db, LEAST_DB <= self.others_db <= 0.0),
            (
                "accompaniment in dB",
                self.accompaniment_db,
                self.accompaniment_db == -math.inf or LEAST_DB <= self.accompaniment_db <= MOST_DB,
            ),
            ("width", self.width, 0.0 <= self.width <= 1.0),
        ):
            if not allowed:
                raise WishError(f"{what} cannot be {value:g}")
