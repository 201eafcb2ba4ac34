"""What goes into learning tracks, as options; the command gets `practice`."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import click

from retune.cli.choices_option import from_file
from retune.cli.stacking import gathered, stacked
from retune.errors import WishError
from retune.tracks.options import (
    MOST_COUNT_IN,
    MOST_LOOPS,
    ClickSound,
    Drone,
    GuideSound,
    StartingNotes,
    TrackOptions,
)

_FORMATS = ("mp3", "wav", "flac", "ogg", "none")


@dataclass(frozen=True)
class Practice:
    """The tracks' contents, the settings of the sound by name, and what else is written.

    `audio` is the format, or "none" for MIDI alone.
    """

    tracks: TrackOptions
    audio: str
    sound: Mapping[str, str]
    archives: bool

    def outputs(self, names: tuple[str, ...]) -> tuple[str, ...]:
        """The outputs to write, of those that a command writes."""
        return tuple(name for name in names if name != "audio" or self.audio != "none")

    def settings(self, given: Mapping[str, dict[str, str]]) -> dict[str, dict[str, str]]:
        """Settings by output: those of --set, over those that have an option of their own."""
        if self.audio == "none":
            return dict(given)
        return {**given, "audio": {"format": self.audio, **self.sound, **given.get("audio", {})}}


class DroneType(click.ParamType[Any]):
    """tonic, root, or a pitch."""

    name = "drone"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> Drone:
        """A drone from its text."""
        if isinstance(value, Drone):
            return value
        try:
            return Drone.parse(value)
        except WishError as error:
            self.fail(f"{error.what}. {error.hint}.", param, ctx)


class LevelType(click.ParamType[Any]):
    """A level in dB, or none."""

    name = "level"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> float:
        """dB; none is silence."""
        if isinstance(value, float):
            return value
        if value.strip().casefold() in ("none", "off"):
            return -math.inf
        return click.FloatRange(-60, 12).convert(value, param, ctx)


def _choice(kind: Any) -> click.Choice[str]:
    return click.Choice([str(one) for one in kind], case_sensitive=False)


_TRACKS = stacked(
    click.option(
        "--audio",
        type=click.Choice(_FORMATS, case_sensitive=False),
        default="mp3",
        show_default=True,
        help="Sound files, or none for MIDI alone.",
    ),
    click.option(
        "--part", "parts", multiple=True, metavar="NAME", help="Only this part; may be repeated."
    ),
    click.option(
        "--starting-notes",
        type=_choice(StartingNotes),
        default=str(StartingNotes.CHORD),
        show_default=True,
        help="What sounds before the count-in: the first chord and your note, the tonic, nothing.",
    ),
    click.option(
        "--count-in",
        type=click.IntRange(0, MOST_COUNT_IN),
        metavar="BARS",
        default=1,
        show_default=True,
        help="Bars counted in; 0 for none.",
    ),
    click.option("--click", is_flag=True, help="Let the click go on through the piece."),
    click.option(
        "--drone",
        type=DroneType(),
        metavar="tonic|root|PITCH",
        help="Hold a note below: the home tonic, each chord's root, or a pitch such as D3.",
    ),
    click.option("--sides", is_flag=True, help="Also a track with the part in the left ear."),
    click.option(
        "--compare", default="", metavar="A-B", help="Also a track of these bars, just and equal."
    ),
    click.option(
        "--loops",
        type=click.IntRange(1, MOST_LOOPS),
        metavar="N",
        default=1,
        show_default=True,
        help="Play it N times, each counted in.",
    ),
    click.option("--archives", is_flag=True, help="Also one zip archive for each section."),
)

_SOUND = stacked(
    click.option(
        "--vowel", metavar="NAME", help="What is sung: neutral, a, e, i, o, u …  [default: neutral]"
    ),
    click.option(
        "--language",
        metavar="NAME",
        help="Sing the text's vowels: latin, italian, german or english.",
    ),
    click.option(
        "--soundfont",
        type=click.Path(path_type=Path),
        metavar="FILE",
        help="Play through this sound font instead.",
    ),
    click.option(
        "--starting-sound",
        type=_choice(GuideSound),
        default=str(GuideSound.VOICE),
        show_default=True,
        help="Sound of the starting notes.",
    ),
    click.option(
        "--drone-sound",
        type=_choice(GuideSound),
        default=str(GuideSound.ORGAN),
        show_default=True,
        help="Sound of the drone.",
    ),
    click.option(
        "--click-sound",
        type=_choice(ClickSound),
        default=str(ClickSound.BLOCK),
        show_default=True,
        help="Sound of count-in and click.",
    ),
    click.option(
        "--others",
        "others_db",
        type=click.FloatRange(-60, 0),
        metavar="DB",
        default=-9.0,
        show_default=True,
        help="Level of the others where one part is predominant.",
    ),
    click.option(
        "--accompaniment-level",
        "accompaniment_db",
        type=LevelType(),
        metavar="DB|none",
        default=-6.0,
        show_default=True,
        help="Level of the accompaniment.",
    ),
    click.option(
        "--width",
        type=click.FloatRange(0, 100),
        metavar="PERCENT",
        default=30.0,
        show_default=True,
        help="How far the voices spread to left and right.",
    ),
)

_TRACK_NAMES = (
    "audio",
    "parts",
    "starting_notes",
    "count_in",
    "click",
    "drone",
    "sides",
    "compare",
    "loops",
    "archives",
    "vowel",
    "language",
    "soundfont",
    "starting_sound",
    "drone_sound",
    "click_sound",
    "others_db",
    "accompaniment_db",
    "width",
)


def _practice(wishes: dict[str, Any]) -> Practice:
    sound = {
        name: str(wishes[name])
        for name in ("vowel", "language", "soundfont")
        if wishes[name] is not None and not (wishes["audio"] == "none" and from_file(name))
    }
    if sound and wishes["audio"] == "none":
        raise click.UsageError(f"--{next(iter(sound))} is for sound, and --audio none makes none")
    tracks = TrackOptions(
        parts=wishes["parts"],
        starting_notes=StartingNotes(wishes["starting_notes"].lower()),
        starting_sound=GuideSound(wishes["starting_sound"].lower()),
        count_in=wishes["count_in"],
        click=wishes["click"],
        click_sound=ClickSound(wishes["click_sound"].lower()),
        drone=wishes["drone"],
        drone_sound=GuideSound(wishes["drone_sound"].lower()),
        sides=wishes["sides"],
        others_db=wishes["others_db"],
        accompaniment_db=wishes["accompaniment_db"],
        width=wishes["width"] / 100.0,
        loops=wishes["loops"],
        compare=wishes["compare"],
    )
    return Practice(tracks, wishes["audio"].lower(), sound, wishes["archives"])


track_options = gathered(stacked(_TRACKS, _SOUND), _TRACK_NAMES, "practice", _practice)
"""Options on learning tracks; the command gets `practice`."""
