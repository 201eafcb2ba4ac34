"""Parts by the names that a choices file gives them, also where the score calls them otherwise."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field

from retune.choicesfile.anchor import known_parts
from retune.choicesfile.kinds import meant
from retune.choicesfile.model import ChoicesFile
from retune.errors import Finding, Weight
from retune.pitch import Pitch
from retune.score.model import Score

_FIRST_NOTES = 8


def melodies(score: Score) -> dict[str, tuple[Pitch, ...]]:
    """The first notes of every part by name."""
    found: dict[int, list[Pitch]] = {part.index: [] for part in score.parts}
    for note in score.notes:
        line = found[note.part]
        if not note.grace and len(line) < _FIRST_NOTES:
            line.append(note.pitch)
    return {part.name: tuple(found[part.index]) for part in score.parts}


@dataclass
class PartNames:
    """Finds the parts of one score; names that no part has are gathered for the findings.

    `placed` tells where each part went when the parts were ordered.
    """

    score: Score
    file: ChoicesFile
    placed: Mapping[int, int] = field(default_factory=dict)
    renamed: dict[str, str] = field(init=False)
    """Names of the file -> names of the score, of parts known by their first notes alone."""
    missing: dict[tuple[str, int], None] = field(init=False, default_factory=dict)

    def __post_init__(self) -> None:
        begins = self.file.section("parts").get("begins", {})
        self.renamed = known_parts(begins, melodies(self.score))
        self._own = {part.name.casefold(): part.index for part in self.score.parts}
        self._out = {name.casefold(): name for name in self.score.left_out}
        new = self.file.section("parts").get("names", {})
        self._new = {value.casefold(): key for key, value in new.items()}

    def name(self, wish: str) -> str | None:
        """The score's name of a part, also of one that is left out; None where it has none."""
        for word in (wish, self._new.get(wish.casefold(), wish)):
            index = self._own.get(word.casefold())
            if index is not None:
                return self.score.parts[index].name
            if word in self.renamed:
                return self.renamed[word]
            if word.casefold() in self._out:
                return self._out[word.casefold()]
        return None

    def index(self, wish: str, line: int) -> int | None:
        """The part of a name; one that does not sound is missing."""
        name = self.name(wish)
        found = None if name is None else self._own.get(name.casefold())
        if found is None:
            self.missing[wish, line] = None
            return None
        return self.placed.get(found, found)

    def indices(self, wishes: Sequence[str] | None, line: int) -> tuple[int, ...]:
        """Parts of several names; all voices where none is named."""
        if wishes is None:
            tuned = (part.index for part in self.score.parts if part.tuned)
            return tuple(sorted(self.placed.get(index, index) for index in tuned))
        found = (self.index(wish, line) for wish in wishes)
        return tuple(index for index in found if index is not None)

    def findings(self) -> Iterator[Finding]:
        """What to tell of names: those that no part has, and parts known under a new one."""
        for old, new in self.renamed.items():
            line = self.file.lines.get(("parts", "begins"))
            what = f"the part '{old}' is called '{new}' now; its choices follow it"
            yield Finding(Weight.NOTE, what, self.file.place(line))
        names = [part.name for part in self.score.parts]
        for wish, line in self.missing:
            guess = meant(wish, names) or f"; there are {', '.join(names)}"
            yield Finding(
                Weight.LOSS,
                f"no part is called '{wish}', so this was left out{guess}",
                self.file.place(line),
            )
