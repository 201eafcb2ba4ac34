"""Every setting of a choices file: its kind of value, and what it means in a director's words."""

from __future__ import annotations

from dataclasses import dataclass
from types import MappingProxyType as Fixed

from retune.choicesfile.kinds import (
    AT,
    BARS,
    BEGINS,
    FLAG,
    HELD_SHIFT,
    LEVEL,
    NAMES,
    PACE,
    PITCH,
    RATIO,
    SOUNDS,
    TEXT,
    TEXTS,
    Kind,
    number,
    one_of,
    whole,
)
from retune.harmony.model import Quality
from retune.score.transpose import FURTHEST
from retune.tracks.options import MOST_COUNT_IN, MOST_LOOPS, ClickSound, GuideSound, StartingNotes
from retune.tuning.policy import PRIME_LIMITS, Drift, Pull, Temperament

QUALITIES = tuple(str(one) for one in Quality)


@dataclass(frozen=True, slots=True)
class Setting:
    """One key: its kind, what it means, and whether its table cannot do without it."""

    kind: Kind
    help: str
    needed: bool = False


Table = Fixed[str, Setting]


def _table(**settings: tuple[Kind, str] | tuple[Kind, str, bool]) -> Table:
    return Fixed({name: Setting(*entry) for name, entry in settings.items()})


_LIMIT = one_of(*PRIME_LIMITS)
_DRIFT = one_of(*(str(one) for one in Drift))
_CENTS = number(-1200, 1200, "cents")
_WHICH = "which time through, where the bar is repeated"
_HERE = "what sounded here; by it the line is found again when bars move"

PIECE = _table(
    title=(TEXT, "title of the piece"),
    reference=(number(220, 880, "Hz"), "frequency of A4 in Hz"),
)

TUNING = _table(
    prime_limit=(_LIMIT, "largest prime in the ratios; 7 tunes dominant sevenths 4:5:6:7"),
    drift=(_DRIFT, "follow, within, gentle or anchored"),
    drift_within=(number(1, 200, "cents"), 'bound in cents, for drift = "within"'),
    held_shift=(HELD_SHIFT, 'the most a sounding note may move, in cents, or "none" or "any"'),
    tonic=(PITCH, "home tonic"),
    temperament=(one_of(*(str(one) for one in Temperament)), "just, or one to compare with"),
    accompaniment_tuning=(TEXT, '"equal", "meantone" or a .scl file'),
    accompaniment_pull=(one_of(*(str(one) for one in Pull)), "which notes it draws: roots or all"),
)

PARTS = _table(
    order=(TEXTS, "parts from the top; parts not named follow"),
    names=(NAMES, "new names for parts"),
    accompaniment=(TEXTS, "parts whose pitch cannot move"),
    voices=(TEXTS, "parts that follow the just targets, whatever their names say"),
    doubled=(TEXTS, "parts that only double the voices; they are not played"),
    melody=(TEXT, "the part whose line is kept smoothest"),
    begins=(BEGINS, "each part's first notes; by them a part is known under a new name"),
)

PLAYING = _table(
    tempo=(PACE, 'beats a minute, or a share of the score\'s tempo, as "80%"'),
    repeats=(FLAG, "play repeats and jumps"),
    fermatas=(FLAG, "hold the fermatas"),
    transpose=(whole(-FURTHEST, FURTHEST, "semitones"), "semitones up, or down with -2"),
)

TRACKS = _table(
    audio=(one_of("mp3", "wav", "flac", "ogg", "none"), "kind of sound files"),
    parts=(TEXTS, "only these parts get tracks"),
    starting_notes=(one_of(*(str(s) for s in StartingNotes)), "chord, tonic or none"),
    starting_sound=(one_of(*(str(s) for s in GuideSound)), "voice, keys or organ"),
    count_in=(whole(0, MOST_COUNT_IN, "bars"), "bars counted in"),
    click=(FLAG, "let the click go on"),
    click_sound=(one_of(*(str(s) for s in ClickSound)), "block, sticks or bell"),
    drone=(TEXT, 'a held note: "tonic", "root" or a pitch such as "D3"'),
    drone_sound=(one_of(*(str(s) for s in GuideSound)), "voice, keys or organ"),
    sides=(FLAG, "also a track with the part in the left ear"),
    compare=(BARS, "bars for a track that plays them just, then equal"),
    loops=(whole(1, MOST_LOOPS, "times"), "how often the piece is played"),
    archives=(FLAG, "also a zip archive for each section"),
    vowel=(TEXT, "what is sung: neutral, a, e, i, o, u"),
    language=(one_of("latin", "italian", "german", "english"), "sing the text's vowels"),
    others=(number(-60, 0, "dB"), "level of the others beside the predominant part, in dB"),
    accompaniment_level=(LEVEL, 'level of the accompaniment in dB, or "none"'),
    width=(number(0, 100, "percent"), "how far the voices spread, in percent"),
)

SECTIONS: Fixed[str, Table] = Fixed(
    {"tuning": TUNING, "parts": PARTS, "playing": PLAYING, "tracks": TRACKS}
)

_AT = (AT, "bar and beat", True)
_BARS = (BARS, "bars or rehearsal letters", True)
_PASS = (whole(1, 99, "times"), _WHICH)
_SOUNDS = (SOUNDS, _HERE)
_ENDS = (SOUNDS, "what sounded where its last bar begins")

DECISIONS: Fixed[str, Table] = Fixed(
    {
        "chord": _table(
            at=_AT,
            root=(PITCH, "root of the chord"),
            quality=(one_of(*QUALITIES), "its quality"),
            limit=(_LIMIT, "largest prime in its ratios"),
            beats=(number(0.01, 400, "beats"), "how long it lasts; else to the chord's end"),
            **{"pass": _PASS},
            sounds=_SOUNDS,
        ),
        "ratio": _table(
            at=_AT,
            part=(TEXT, "whose note", True),
            ratio=(RATIO, "its ratio above the root", True),
            **{"pass": _PASS},
            sounds=_SOUNDS,
        ),
        "passage": _table(
            bars=_BARS,
            prime_limit=(_LIMIT, TUNING["prime_limit"].help),
            drift=(_DRIFT, TUNING["drift"].help),
            held_shift=(HELD_SHIFT, TUNING["held_shift"].help),
            melody=(TEXT, PARTS["melody"].help),
            sounds=_SOUNDS,
            ends=_ENDS,
        ),
        "pedal": _table(
            bars=_BARS,
            pitch=(PITCH, "what everything is tuned to", True),
            cents=(_CENTS, "where it stands; else its place in the scale"),
            sounds=_SOUNDS,
            ends=_ENDS,
        ),
        "centre": _table(
            at=_AT,
            tonic=(PITCH, "the tonic from here on; else the home tonic"),
            cents=(_CENTS, "where it stands, in cents from equal temperament"),
            **{"pass": _PASS},
            sounds=_SOUNDS,
        ),
        "tempo": _table(
            at=_AT,
            beats=(number(10, 400, "beats a minute"), "beats a minute from here on", True),
            sounds=_SOUNDS,
        ),
        "fermata": _table(
            at=_AT,
            hold=(number(1, 10, "times its length"), "times its length; 1 is not held", True),
            sounds=_SOUNDS,
        ),
        "breath": _table(
            at=(AT, "bar and beat before which to breathe", True),
            parts=(TEXTS, "who breathes; else all"),
            sounds=_SOUNDS,
        ),
        "note_to_singers": _table(
            bars=_BARS,
            parts=(TEXTS, "for whom; else for all"),
            text=(TEXT, "what to tell them", True),
            sounds=_SOUNDS,
            ends=_ENDS,
        ),
    }
)
"""Tables that stand in double brackets, any number of each."""
