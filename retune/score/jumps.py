"""Jump signs: which marks send the player elsewhere, and what words such as "D.C." mean."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import replace

from retune.written import Mark, MarkKind

JUMP_KINDS = frozenset(
    {
        MarkKind.SEGNO,
        MarkKind.CODA,
        MarkKind.FINE,
        MarkKind.DA_CAPO,
        MarkKind.DAL_SEGNO,
        MarkKind.TO_CODA,
    }
)

_ENDING = r"(?P<how>(?: (?:al|alla|ad|e|et|con|senza|sino|fin|to|then|and|without|no)\b.*)?)"
# Words, with all but letters taken away (common practice, no source).
_WORDS = (
    (re.compile(rf"(?:d ?c|da capo){_ENDING}"), MarkKind.DA_CAPO),
    (re.compile(rf"(?:d ?s|dal segno|del segno){_ENDING}"), MarkKind.DAL_SEGNO),
    (re.compile(r"(?:to|al|alla) (?:the )?coda|alla ?coda"), MarkKind.TO_CODA),
    (re.compile(r"(?:il )?fine"), MarkKind.FINE),
    (re.compile(r"coda"), MarkKind.CODA),
    (re.compile(r"segno"), MarkKind.SEGNO),
)
_LONGEST = 60


def jump_in_words(text: str) -> tuple[MarkKind, str | None] | None:
    """The jump that a text asks for, and how it ends ("", "fine" or "coda"), if it asks for one.

    >>> jump_in_words("D.C. al Fine")
    (<MarkKind.DA_CAPO: 'da capo'>, 'fine')
    >>> jump_in_words("To Coda")
    (<MarkKind.TO_CODA: 'to coda'>, None)
    >>> jump_in_words("fine voices only") is None
    True
    """
    if len(text) > _LONGEST:
        return None
    plain = " ".join(re.sub(r"[\W_]", " ", text).lower().split())
    for pattern, kind in _WORDS:
        match = pattern.fullmatch(plain)
        if match is not None:
            return kind, _how_it_ends(match["how"]) if "how" in match.groupdict() else None
    return None


def _how_it_ends(text: str) -> str:
    return next((end for end in ("coda", "fine") if end in text), "")


def jumps_in(mark: Mark) -> Iterator[Mark]:
    """The jump that a mark stands for, as a sign or in words; nothing for other marks."""
    if mark.kind in JUMP_KINDS:
        yield mark
    elif mark.kind is MarkKind.WORDS:
        jump = jump_in_words(str(mark.value or ""))
        if jump is not None:
            yield replace(mark, kind=jump[0], value=jump[1])
