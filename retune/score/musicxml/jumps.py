"""Signs and words that send the player elsewhere: D.C., D.S., Fine, Coda.

A file often says one jump several times: as a sign, in words, and as playback data. Each kind
counts once a bar, as the plainest of its statements has it.
"""

from __future__ import annotations

import re
from dataclasses import replace

from retune.adapters.xml import Element
from retune.errors import Weight
from retune.score.musicxml.draft import BarDraft, Jump
from retune.score.musicxml.placing import Place
from retune.written import MarkKind

BY_SIGN, BY_WORDS, BY_PLAYBACK = 0, 1, 2

# Attributes of <sound>, by the kind of jump they mean.
_SOUND = {
    "dacapo": MarkKind.DA_CAPO,
    "dalsegno": MarkKind.DAL_SEGNO,
    "tocoda": MarkKind.TO_CODA,
    "fine": MarkKind.FINE,
    "segno": MarkKind.SEGNO,
    "coda": MarkKind.CODA,
}

_ENDING = r"(?P<how>(?: (?:al|alla|ad|e|et|con|senza|sino|fin|to|then|and|without|no)\b.*)?)"
# Words, with all but letters taken away (common practice, no source).
_WORDS = (
    (re.compile(rf"(?:d ?c|da capo){_ENDING}"), MarkKind.DA_CAPO),
    (re.compile(rf"(?:d ?s|dal segno|del segno){_ENDING}"), MarkKind.DAL_SEGNO),
    (re.compile(r"(?:to|al|alla) (?:the )?coda|alla ?coda"), MarkKind.TO_CODA),
    (re.compile(r"fine"), MarkKind.FINE),
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
    plain = " ".join(re.sub(r"[^\w]", " ", text).lower().split())
    for pattern, kind in _WORDS:
        match = pattern.fullmatch(plain)
        if match is not None:
            return kind, _how_it_ends(match["how"]) if "how" in match.groupdict() else None
    return None


def _how_it_ends(text: str) -> str:
    return next((end for end in ("coda", "fine") if end in text), "")


def jumps_of_sound(sound: Element, place: Place) -> list[Jump]:
    """The jumps that a <sound> element names as playback data."""
    return [
        Jump(kind, place.onset, BY_PLAYBACK, "" if kind in _WITH_END else None)
        for attribute, kind in _SOUND.items()
        if (sound.get(attribute) or "no") != "no"
    ]


_WITH_END = (MarkKind.DA_CAPO, MarkKind.DAL_SEGNO)


def settle_jumps(bar: BarDraft) -> None:
    """Leave one jump of a kind in a bar."""
    best: dict[MarkKind, Jump] = {}
    for jump in bar.jumps:
        known = best.get(jump.kind, jump)
        plainer = jump if jump.rank > known.rank else known
        best[jump.kind] = Jump(jump.kind, plainer.onset, plainer.rank, jump.value or known.value)
    for sign, worded in ((MarkKind.CODA, MarkKind.TO_CODA), (MarkKind.SEGNO, MarkKind.DAL_SEGNO)):
        # A coda sign beside "To Coda", or a segno beside "D.S.", is part of those words.
        if worded in best and sign in best and best[sign].rank == BY_SIGN:
            del best[sign]
    bar.jumps = list(best.values())


def settle_coda_signs(bars: list[BarDraft]) -> None:
    """Read bare coda signs as "to coda", all but the last, where nothing else says so."""
    jumps = [jump for bar in bars for jump in bar.jumps]
    if any(jump.kind is MarkKind.TO_CODA for jump in jumps):
        return
    bare = [bar for bar in bars if any(_is_bare_coda(jump) for jump in bar.jumps)]
    for bar in bare[:-1]:
        bar.jumps = [
            replace(jump, kind=MarkKind.TO_CODA) if _is_bare_coda(jump) else jump
            for jump in bar.jumps
        ]
        bar.remark(Weight.NOTE, "a coda sign before the last one is read as To Coda")


def _is_bare_coda(jump: Jump) -> bool:
    return jump.kind is MarkKind.CODA and jump.rank == BY_SIGN
