"""Humdrum, ABC and MEI as written scores: Humdrum and MEI through music21, ABC by our own reader.

music21 10.5 loses notes, inline fields and every second voice of ABC tunes, so that format is
read in `retune.adapters.abc`; what it leaves out of the other two is added here.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

from retune.adapters.abc import read_pieces
from retune.adapters.humdrum import add_names_and_lyrics
from retune.adapters.mei import add_title_signs_and_tempi
from retune.adapters.music21_parsing import guarded, parse, written
from retune.adapters.xml import Element, read_document
from retune.errors import LimitError, RetuneError, UnreadableError
from retune.limits import Limits
from retune.written import WrittenScore

FORMATS = {"humdrum": "Humdrum", "abc": "ABC", "mei": "MEI", "musicxml": "MusicXML"}
"""Formats by name, with what the user calls them."""

_XML = frozenset(("mei", "musicxml"))
_DECLARED = re.compile(rb"""<\?xml[^>]{0,200}encoding\s*=\s*["']([A-Za-z0-9._-]{1,40})["']""")
_BYTE_ORDER_MARKS = (b"\xff\xfe", b"\xfe\xff")
_LISTED = 20


def read_notation(
    data: bytes, format: str, piece: int | None = None, limits: Limits | None = None
) -> WrittenScore:
    """Read a score that is neither MusicXML nor MIDI.

    Parameters
    ----------
    data : bytes
        The whole file.
    format : str
        humdrum, abc or mei; musicxml too, for comparison with this project's own reader.
    piece : int, optional
        Which piece of a file that holds several, from 1.
    limits : Limits, optional
        The largest file that is read.

    Raises
    ------
    UnreadableError
        The file is not a score of that format.
    RetuneError
        The file holds several pieces and none was chosen, or fewer than the chosen one.
    LimitError
        More bytes or notes than `limits` allows.
    """
    limits = limits or Limits()
    if len(data) > limits.max_bytes:
        raise LimitError(f"the file has {len(data)} bytes; at most {limits.max_bytes} are read")
    # Reading the XML here too refuses what could do harm.
    root = read_document(data, limits).root if format in _XML else None
    text = _decoded(data, format)
    if format == "abc":
        score = _read_abc(text, piece)
    else:
        score = _read_by_music21(text, format, piece, root)
    if not any(bar.notes for part in score.parts for bar in part.bars):
        raise UnreadableError(
            f"no notes were found in the {FORMATS[format]} file",
            hint="Check the file's format, or export the score as MusicXML",
        )
    if sum(len(bar.notes) for part in score.parts for bar in part.bars) > limits.max_notes:
        raise LimitError(f"the file has more than {limits.max_notes} notes")
    return score


def _decoded(data: bytes, format: str) -> str:
    """The text of a file: by its byte order mark, its XML declaration, UTF-8, else Latin-1."""
    declared = _DECLARED.match(data.lstrip()) if format in _XML else None
    wide = data.startswith(_BYTE_ORDER_MARKS)
    for encoding in ("utf-16" if wide else "utf-8-sig", declared and declared[1].decode()):
        try:
            if encoding:
                return data.decode(encoding)
        except (UnicodeError, LookupError):
            continue
    return data.decode("latin-1")


def _read_by_music21(
    text: str, format: str, piece: int | None, root: Element | None
) -> WrittenScore:
    with guarded(FORMATS[format]) as said:
        scores = parse(text, format)
        score = scores[_chosen([_title(one) for one in scores], piece)]
        if format == "humdrum" and len(scores) == 1:
            add_names_and_lyrics(text, score)
        if format == "mei" and root is not None:
            add_title_signs_and_tempi(root, score)
        result = written(score, format)
    return said.told(result)


def _title(score: object) -> str:
    about = getattr(score, "metadata", None)
    return str(getattr(about, "title", None) or "")


def _read_abc(text: str, piece: int | None) -> WrittenScore:
    pieces = read_pieces(text)
    return pieces[_chosen([one.title for one in pieces], piece)].read()


def _chosen(titles: Sequence[str], piece: int | None) -> int:
    """The index of the chosen piece; the only one needs no choice."""
    if piece is None and len(titles) == 1:
        return 0
    if piece is not None and 1 <= piece <= len(titles):
        return piece - 1
    listed = "; ".join(f"{n} {title}".strip() for n, title in enumerate(titles[:_LISTED], start=1))
    more = f"; and {len(titles) - _LISTED} more" if len(titles) > _LISTED else ""
    if piece is None and titles:
        what = f"the file holds {len(titles)} pieces: {listed}{more}"
        raise RetuneError(what, hint="Choose one with --piece N")
    if not titles:
        raise UnreadableError("the file holds no piece")
    raise RetuneError(f"the file holds {len(titles)} pieces, not {piece}: {listed}{more}")
