"""Jump signs: which marks jump, and what words such as "D.C. al Fine" mean."""

from __future__ import annotations

import re
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

# What singers find in print (common practice, no source); the first match decides.
_WORDS: tuple[tuple[re.Pattern[str], MarkKind], ...] = tuple(
    (re.compile(pattern, re.IGNORECASE), kind)
    for pattern, kind in (
        (r"\bd\.?\s*c\.?(?!\w)|\bda\s+capo\b", MarkKind.DA_CAPO),
        (r"\bd\.?\s*s\.?(?!\w)|\bd(al|el)\s+segno\b", MarkKind.DAL_SEGNO),
        (r"\b(to|alla|zur|à la)\s+coda\b", MarkKind.TO_CODA),
        (r"^\W*coda\W*$", MarkKind.CODA),
        (r"^\W*segno\W*$", MarkKind.SEGNO),
        (r"^\W*(il\s+)?fine\W*$", MarkKind.FINE),
    )
)
_ENDS_AT_CODA = re.compile(r"\bcoda\b", re.IGNORECASE)
_ENDS_AT_FINE = re.compile(r"\b(al|until|bis|until the)\s+(fine|end)\b|\bfine\b", re.IGNORECASE)


def jumps_in_words(mark: Mark) -> tuple[Mark, ...]:
    """The jump sign that a text stands for, if it stands for one.

    >>> from fractions import Fraction
    >>> [str(sign.value) for sign in jumps_in_words(
    ...     Mark(MarkKind.WORDS, Fraction(0), "D.C. al Fine"))]
    ['fine']
    """
    text = str(mark.value or "")
    for pattern, kind in _WORDS:
        if pattern.search(text):
            return (replace(mark, kind=kind, value=_ending(kind, text)),)
    return ()


def _ending(kind: MarkKind, text: str) -> str:
    if kind not in (MarkKind.DA_CAPO, MarkKind.DAL_SEGNO):
        return ""
    if _ENDS_AT_CODA.search(text):
        return "coda"
    return "fine" if _ENDS_AT_FINE.search(text) else ""
