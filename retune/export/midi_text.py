"""Words in a MIDI file: names, titles and lyrics as bytes.

Text is UTF-8: plain ASCII, which RP-001 advises, wherever the words are. Lyrics follow RP-017:
a blank ends a word, the engraver's hyphens are left out.
"""

from __future__ import annotations

from functools import lru_cache

_RESERVED = str.maketrans({"[": "(", "]": ")", "{": "(", "}": ")", "\\": "/"})


def text_bytes(text: str) -> bytes:
    """One line of text; line breaks and other control characters become blanks."""
    line = "".join(char if char.isprintable() else " " for char in text)
    return " ".join(line.split()).encode("utf-8", "replace")


def copyright_bytes(text: str) -> bytes:
    """The copyright line, with the (C) that RP-001 asks for in place of the sign.

    >>> copyright_bytes("© 2031 A. Nyman")
    b'(C) 2031 A. Nyman'
    """
    return text_bytes(text.replace("©", "(C)"))


@lru_cache(maxsize=4096)
def lyric_bytes(lyric: str) -> bytes:
    """One syllable as RP-017 wants it; empty where there is nothing to show.

    The characters that RP-017 keeps for other uses become their nearest plain ones.

    >>> lyric_bytes("Lan-"), lyric_bytes("dal,"), lyric_bytes("-")
    (b'Lan', b'dal, ', b'')
    """
    text = text_bytes(lyric.translate(_RESERVED))
    syllable = text.removesuffix(b"-")
    if not syllable:
        return b""
    return syllable if syllable != text else syllable + b" "
