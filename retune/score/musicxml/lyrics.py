"""Syllables under a note."""

from __future__ import annotations

import re
from functools import lru_cache

from retune.adapters.xml import Element
from retune.score.musicxml.values import MAX_LABEL, MAX_TEXT, words
from retune.written import WrittenLyric

UNDERTIE = "\u203f"
HUMMED = "mm"
"""What is written for a hummed note (common practice, no source)."""

_SYLLABICS = ("single", "begin", "middle", "end")
_NUMBERED = re.compile(r"(?:.*[^0-9])?0*([1-9][0-9]{0,3})")
_CHORUS = re.compile(r"chorus|refrain|refr\.?|burden", re.IGNORECASE)
_PASS = re.compile(r"[0-9]{1,3}")


def read_lyrics(note: Element) -> tuple[WrittenLyric, ...]:
    """The syllables of a note; lines that only extend an earlier syllable are left out."""
    syllables = (_syllable(lyric) for lyric in note.iterchildren("lyric"))
    return tuple(syllable for syllable in syllables if syllable is not None)


def _syllable(lyric: Element) -> WrittenLyric | None:
    text, syllabics = "", []
    joint, pending = "", "single"
    for child in lyric:
        if child.tag == "syllabic":
            pending = words(child)
        elif child.tag == "elision":
            joint = _joint(child.text)
        elif child.tag == "text" and child.text and child.text.strip():
            text += (joint if text else "") + " ".join(child.text.split())
            joint = ""
            syllabics.append(pending if pending in _SYLLABICS else "single")
        elif child.tag == "humming":
            text, syllabics = text or HUMMED, syllabics or ["single"]
    if not text:
        return None
    text = text[:MAX_TEXT]
    number, name = (lyric.get("number") or "")[:MAX_LABEL], (lyric.get("name") or "")[:MAX_LABEL]
    return WrittenLyric(
        text, _joined_syllabic(syllabics), _verse(number, name), _passes(lyric.get("time-only"))
    )


def _joint(text: str | None) -> str:
    """What stands between two syllables on one note: the undertie, unless the file says else.

    An empty elision, the low line and private-use glyphs (the lyric elisions of SMuFL) mean it.
    """
    sign = (text or "").strip()
    if not sign or sign == "_" or "\ue000" <= sign <= "\uf8ff":
        return UNDERTIE
    return sign


def _joined_syllabic(syllabics: list[str]) -> str:
    """The place in its word of several syllables on one note, taken together."""
    if len(syllabics) == 1:
        return syllabics[0]
    begins = syllabics[0] in ("single", "begin")
    ends = syllabics[-1] in ("single", "end")
    return {(True, True): "single", (True, False): "begin", (False, True): "end"}.get(
        (begins, ends), "middle"
    )


@lru_cache(maxsize=1024)
def _verse(number: str, name: str) -> str:
    """Verse number, or "chorus" for a line the file calls so; names like part1verse2 mean 2."""
    number, name = number.strip(), name.strip()
    if _CHORUS.search(number) or _CHORUS.search(name):
        return "chorus"
    for label in (number, name):
        match = _NUMBERED.fullmatch(label)
        if match is not None:
            return match[1]
    label = number or name
    return "1" if label.lower() in ("", "verse") else label


def _passes(time_only: str | None) -> tuple[int, ...]:
    return tuple(map(int, _PASS.findall(time_only[:MAX_LABEL]))) if time_only else ()
