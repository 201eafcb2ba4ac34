"""The sung words of a part as text, for the tags of a sound file."""

from __future__ import annotations

from retune.score.model import Score
from retune.tracks.take import Take

LANGUAGE_CODES = {"latin": "lat", "italian": "ita", "german": "deu", "english": "eng"}
"""ISO 639-2."""


def words_of(take: Take) -> str:
    """The words of the part that the take is for; of the first sung part for the full mix."""
    score = take.tuned.score
    titled = {part.index: part.name for part in score.parts}
    own = [index for index, name in titled.items() if take.folder and name == take.folder]
    for index in own or list(titled):
        text = part_words(score, index)
        if text or own:
            return text
    return ""


def part_words(score: Score, part: int) -> str:
    """One part's words, syllables joined, a line for each stretch between rests."""
    lines: list[str] = []
    line, end = "", None
    for note in score.notes:
        if note.part != part:
            continue
        if end is not None and note.onset > end and line and not line.endswith("-"):
            lines.append(line.strip())
            line = ""
        end = note.end
        if note.lyric:
            line = line[:-1] + note.lyric if line.endswith("-") else f"{line} {note.lyric}"
    return "\n".join([*lines, line.strip().removesuffix("-")]).strip()
