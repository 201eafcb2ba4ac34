"""Reading a score file of any kind: `read` for a path, `read_bytes` for what is at hand.

The kind is told by the content, and by the file's ending only where the content leaves it open.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path

from retune.errors import LimitError, Place, RetuneError, UnreadableError, WishError
from retune.score.build import build_score, own_tempo
from retune.score.model import Score
from retune.score.options import ReadOptions
from retune.score.pace import Pace
from retune.score.transpose import transposed
from retune.written import WrittenScore

SUFFIXES: dict[str, str] = {
    ".musicxml": "musicxml", ".mxl": "musicxml", ".xml": "musicxml",
    ".mid": "midi", ".midi": "midi", ".kar": "midi", ".rmi": "midi",
    ".krn": "humdrum", ".abc": "abc", ".mei": "mei",
}  # fmt: skip
"""File endings that are known, with the format each stands for."""

_KINDS = "MusicXML (.musicxml, .xml, .mxl), MIDI (.mid), Humdrum (.krn), ABC (.abc) or MEI (.mei)"
_HEAD = 4096
_BOMS = ((b"\xff\xfe", "utf-16"), (b"\xfe\xff", "utf-16"), (b"\xef\xbb\xbf", "utf-8-sig"))


def read(path: str | Path, options: ReadOptions | None = None) -> Score:
    """Read a score file as it is played.

    Raises
    ------
    UnreadableError
        The file is missing, no file, empty, damaged, of no known kind, or holds no notes.
    LimitError
        It is larger, or plays longer, than the limits in `options` allow.
    WishError
        A part or piece that `options` names is not in it, or it cannot be transposed so far.
    """
    options = options or ReadOptions()
    return read_bytes(_contents(Path(path), options), str(path), options)


def read_bytes(data: bytes, name: str, options: ReadOptions | None = None) -> Score:
    """Read a score from the bytes of a file; `name` is its name or path, or "-".

    Raises as `read` does.
    """
    options = options or ReadOptions()
    file = "standard input" if name == "-" else Path(name).name
    try:
        written = _written(data, name, options)
    except RetuneError as error:
        raise error.in_file(file) from error.__cause__
    score = build_score(written, stem=stem_of(name), file=file, options=options)
    if written.format == "midi":
        from retune.score.midi.grouping import gathered

        # What was struck together is told by the clock it was played by, not by a wished tempo.
        own = score.tempo if options.tempo == Pace() else own_tempo(written, options)
        pedals = {part.id: part.pedals for part in written.parts}
        score = replace(gathered(replace(score, tempo=own), pedals), tempo=score.tempo)
    return replace(transposed(score, options.transpose), source=data)


def stem_of(name: str) -> str:
    """A file's name without its folder and its ending, if the ending is a known one.

    >>> stem_of("scores/bwv6.6.mxl"), stem_of("bwv6.6"), stem_of("-")
    ('bwv6.6', 'bwv6.6', 'score')
    """
    base = Path(name).name
    ending = Path(base).suffix
    stem = base[: -len(ending)] if ending.lower() in SUFFIXES else base
    return stem if stem not in ("", "-") else "score"


def _contents(path: Path, options: ReadOptions) -> bytes:
    """The bytes of a file, no more than the limit."""
    most = options.limits.max_bytes
    where = Place(file=str(path))
    try:
        with path.open("rb") as file:
            data = file.read(most + 1)
    except FileNotFoundError:
        raise UnreadableError("there is no such file", where, "Check the path") from None
    except IsADirectoryError:
        raise UnreadableError("this is a folder, not a score", where, "Name a file") from None
    except PermissionError:
        raise UnreadableError(
            "the file may not be read", where, "Check the permissions of the file"
        ) from None
    except (OSError, ValueError) as error:
        raise UnreadableError(
            f"the file cannot be read: {error}", where, "Check the path"
        ) from None
    if len(data) > most:
        raise LimitError(
            f"the file is larger than {most} bytes", where, "Raise the limit if it is a score"
        )
    return data


def _written(data: bytes, name: str, options: ReadOptions) -> WrittenScore:
    if not data.strip(b"\0 \t\r\n"):
        raise UnreadableError("the file is empty", hint="Export the score again")
    kind = kind_of(data, name)
    if kind is None:
        raise UnreadableError("this is no kind of score that can be read", hint=f"Use {_KINDS}")
    return _READERS[kind](data, options)


def kind_of(data: bytes, name: str) -> str | None:
    """The format of a file: musicxml, midi, humdrum, abc or mei; None for anything else.

    >>> kind_of(b"MThd...", "song.xml")
    'midi'
    """
    if data.startswith(b"PK"):
        return "musicxml"
    if data.startswith(b"MThd") or (data.startswith(b"RIFF") and data[8:12] == b"RMID"):
        return "midi"
    text = _head(data)
    if text.startswith("<"):
        return "mei" if re.search(r"<(\w+:)?mei\b", text) else "musicxml"
    for pattern, kind in _TEXTS:
        if pattern.search(text):
            return kind
    return SUFFIXES.get(Path(name).suffix.lower())


_TEXTS = (
    (re.compile(r"^\*\*(kern|text|mens|silbe|dynam)\b", re.MULTILINE), "humdrum"),
    (re.compile(r"\A(%abc|(%.*\n|\s)*X:\s*\d)"), "abc"),
)


def _head(data: bytes) -> str:
    """The beginning of a text file, as far as it can be told without its declared encoding."""
    encoding = next((name for bom, name in _BOMS if data.startswith(bom)), "latin-1")
    if encoding == "latin-1" and b"\0" in data[:4]:
        encoding = "utf-16-be" if data[0] == 0 else "utf-16-le"
    return data[:_HEAD].decode(encoding, errors="replace").lstrip()


def _musicxml(data: bytes, options: ReadOptions) -> WrittenScore:
    from retune.score.musicxml import read_musicxml

    _only_piece(options)
    return read_musicxml(data, options.limits)


def _midi(data: bytes, options: ReadOptions) -> WrittenScore:
    from retune.score.midi import read_midi

    _only_piece(options)
    return read_midi(data, options.limits)


def _only_piece(options: ReadOptions) -> None:
    if options.piece not in (None, 1):
        raise WishError(
            f"there is no piece {options.piece}: the file holds one piece",
            hint="Leave the choice of a piece out",
        )


@dataclass(frozen=True, slots=True)
class _Notation:
    """Reads a format through the adapter for other notation."""

    format: str

    def __call__(self, data: bytes, options: ReadOptions) -> WrittenScore:
        from retune.adapters.notation import read_notation

        return read_notation(data, self.format, options.piece)


_READERS: dict[str, Callable[[bytes, ReadOptions], WrittenScore]] = {
    "musicxml": _musicxml,
    "midi": _midi,
    "humdrum": _Notation("humdrum"),
    "abc": _Notation("abc"),
    "mei": _Notation("mei"),
}
