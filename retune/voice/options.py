"""What a director may wish of the sound."""

from __future__ import annotations

from dataclasses import dataclass

from retune.errors import WishError

VOWELS = (
    "neutral", "a", "e", "ɛ", "i", "ɪ", "o", "ɔ", "u", "ʊ", "y", "ø", "œ", "æ", "ʌ", "ə", "ɜ",
)  # fmt: skip
"""Names of the vowels; all but the first are letters of the International Phonetic Alphabet."""

LANGUAGES = ("latin", "italian", "german", "english")

MOST_SINGERS = 16
MOST_SCATTER, MOST_VIBRATO = 50.0, 100.0


@dataclass(frozen=True, slots=True)
class SoundOptions:
    """How the choir voice sounds.

    Parameters
    ----------
    vowel : str
        One of `VOWELS`, for everything that is sung without text.
    language : str
        One of `LANGUAGES`, and the vowels follow the sung text; "" for one vowel throughout.
    singers : int
        Singers a part, 1 to 16; more make no louder part.
    scatter_cents : float
        Standard deviation of the singers' mean pitches, 0 to 50; their mean frequency is
        exactly the tuned one. A section with scatter beats by itself.
    vibrato_cents : float
        Peak deviation of each singer's vibrato, 0 (straight tone) to 100.

    Raises
    ------
    WishError
        A value is not among these.
    """

    vowel: str = "neutral"
    language: str = ""
    singers: int = 4
    scatter_cents: float = 0.0
    vibrato_cents: float = 0.0

    def __post_init__(self) -> None:
        if self.vowel not in VOWELS:
            raise WishError(f"no vowel '{self.vowel}'", hint=f"It is one of {', '.join(VOWELS)}")
        if self.language and self.language not in LANGUAGES:
            raise WishError(
                f"no vowels for the language '{self.language}'",
                hint=f"It is one of {', '.join(LANGUAGES)}",
            )
        for what, value, most in (
            ("scatter in cents", self.scatter_cents, MOST_SCATTER),
            ("vibrato in cents", self.vibrato_cents, MOST_VIBRATO),
        ):
            if not 0.0 <= value <= most:
                raise WishError(f"{what} cannot be {value:g}", hint=f"It is 0 to {most:g}")
        if not 1 <= self.singers <= MOST_SINGERS:
            raise WishError(
                f"a part cannot have {self.singers} singers", hint=f"It has 1 to {MOST_SINGERS}"
            )
