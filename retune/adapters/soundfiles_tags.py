"""Tags of sound files, for what libsndfile cannot write.

It knows no composer, lyricist, lyrics or number of tracks, and WAV's own INFO chunk is ASCII. So
WAV files get an ID3 tag in a chunk besides, for players that read it, and FLAC files a block of
Vorbis comments of our own (RFC 9639, 8.6; field names of the Vorbis I specification, 5.2.2).
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass

from retune.adapters.id3 import id3_header

_LONGEST = 60_000
"""Characters of a text that are kept: more than any song has, and less than any block holds."""

_COMMENTS, _LAST = 4, 0x80
"""Type of a FLAC block of comments, and the flag of the last block before the sound."""

_YEAR = re.compile(r"(?:copyright|©|\(c\)|[\s:,])*(\d{4})\b[\s,:]*(.*)", re.IGNORECASE | re.DOTALL)


@dataclass(frozen=True, slots=True)
class Tags:
    """What a player shows.

    `track` of `of`, 0 of 0 for none; track 0 of some is a number too. `language`, of lyrics and
    comment, is an ISO 639-2 code; empty for undetermined.
    """

    title: str
    album: str = ""
    composer: str = ""
    lyricist: str = ""
    copyright: str = ""
    track: int = 0
    of: int = 0
    lyrics: str = ""
    comment: str = ""
    language: str = ""


def vorbis_fields(tags: Tags) -> dict[str, str]:
    """Vorbis comments by field name, empty ones left out."""
    numbered = bool(tags.track or tags.of)
    found = {
        "TITLE": line_of(tags.title),
        "ALBUM": line_of(tags.album),
        "ARTIST": line_of(tags.composer),
        "COMPOSER": line_of(tags.composer),
        "LYRICIST": line_of(tags.lyricist),
        "COPYRIGHT": line_of(tags.copyright),
        "TRACKNUMBER": str(tags.track) if numbered else "",
        "TRACKTOTAL": str(tags.of or ""),
        "LYRICS": lines_of(tags.lyrics),
        "DESCRIPTION": line_of(tags.comment),
    }
    return {name: text for name, text in found.items() if text}


def info_fields(tags: Tags) -> dict[str, str]:
    """Texts of the INFO chunk of a WAV file, by libsndfile's names."""
    found = {
        "title": tags.title,
        "artist": tags.composer,
        "album": tags.album,
        "tracknumber": _number(tags),
        "copyright": tags.copyright,
        "comment": tags.comment,
    }
    return {name: _ascii(text) for name, text in found.items() if text}


def id3_tag(tags: Tags) -> bytes:
    """An ID3v2.3 tag; empty where there is nothing to say."""
    texts = {
        "TIT2": line_of(tags.title),
        "TALB": line_of(tags.album),
        "TPE1": line_of(tags.composer),
        "TCOM": line_of(tags.composer),
        "TEXT": line_of(tags.lyricist),
        "TCOP": _copyright(line_of(tags.copyright)),
        "TRCK": _number(tags),
    }
    return id3_header(texts, lines_of(tags.lyrics), line_of(tags.comment), tags.language or "und")


def vorbis_comments(vendor: bytes, fields: Mapping[str, str]) -> bytes:
    """The comments of a Vorbis or FLAC stream, without the framing of either."""
    texts = [f"{name}={text}".encode() for name, text in fields.items()]
    return _sized(vendor) + len(texts).to_bytes(4, "little") + b"".join(map(_sized, texts))


def _sized(text: bytes) -> bytes:
    return len(text).to_bytes(4, "little") + text


def with_wav_tag(data: bytes, tag: bytes) -> bytes:
    """A WAV file with an ID3 tag in a chunk at its end."""
    if not tag:
        return data
    chunk = b"id3 " + len(tag).to_bytes(4, "little") + tag + b"\x00" * (len(tag) % 2)
    size = len(data) + len(chunk) - 8
    return b"".join([data[:4], size.to_bytes(4, "little"), data[8:], chunk])


def with_flac_comments(data: bytes, fields: Mapping[str, str]) -> bytes:
    """A FLAC file whose comments are these, behind its first block; its vendor stays."""
    blocks: list[tuple[int, bytes]] = []
    at, last = 4, 0
    vendor = b""
    while not last:
        kind, last = data[at] & ~_LAST, data[at] & _LAST
        end = at + 4 + int.from_bytes(data[at + 1 : at + 4])
        body = data[at + 4 : end]
        if kind == _COMMENTS:
            vendor = body[4 : 4 + int.from_bytes(body[:4], "little")]
        else:
            blocks.append((kind, body))
        at = end
    blocks.insert(1, (_COMMENTS, vorbis_comments(vendor, fields)))
    parts = [data[:4]]
    for place, (kind, body) in enumerate(blocks, 1):
        parts += [bytes([kind | (_LAST if place == len(blocks) else 0)])]
        parts += [len(body).to_bytes(3), body]
    return b"".join([*parts, data[at:]])


def line_of(text: str) -> str:
    """Text in one line: control characters, which end a tag before its time, become spaces."""
    return _usable("".join(" " if unicodedata.category(char) == "Cc" else char for char in text))


def lines_of(text: str) -> str:
    """Text whose lines end with a line feed, each without control characters."""
    return "\n".join(line_of(line) for line in re.split(r"\r\n|\r|\n", text[:_LONGEST]))


def _usable(text: str) -> str:
    """Not too long, and without lone surrogates, which no encoding holds."""
    return text[:_LONGEST].encode("utf-8", "replace").decode("utf-8")


def _number(tags: Tags) -> str:
    return f"{tags.track}/{tags.of}" if tags.of else str(tags.track or "")


def _ascii(text: str) -> str:
    """The nearest ASCII: accents go, other letters become question marks."""
    parts = unicodedata.normalize("NFKD", line_of(text).replace("–", "-").replace("’", "'"))
    bare = "".join(char for char in parts if not unicodedata.combining(char))
    return bare.encode("ascii", "replace").decode("ascii")


def _copyright(text: str) -> str:
    """ID3v2.3 wants the year and a space first, and players say "Copyright" themselves; without
    a year the frame is left out."""
    found = _YEAR.match(text)
    return f"{found[1]} {found[2]}" if found else ""
