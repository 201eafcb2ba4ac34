"""Comments and serial number of an Ogg Vorbis stream put in after it was encoded.

Ogg by RFC 3533, the three header packets of Vorbis by the Vorbis I specification (4.2.1, A.2).
libsndfile numbers every stream anew, which would make every run's bytes differ.
"""

from __future__ import annotations

import zlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from retune.adapters.soundfiles_tags import vorbis_comments

_SERIAL = 1
_CONTINUED = 1
_SEGMENT, _SEGMENTS = 255, 255
"""Bytes of a full segment, and segments of a page, at most."""

_UNFINISHED = b"\xff" * 8
"""Position of a page on which no packet ends."""

_COMMENT_PACKET, _FRAMING = b"\x03vorbis", b"\x01"
_ALL = 0xFFFFFFFF
_REVERSED = bytes(int(f"{byte:08b}"[::-1], 2) for byte in range(256))


@dataclass(frozen=True, slots=True)
class _Page:
    """A page: its flags, its position as the bytes of the file, its lacing and its body."""

    flags: int
    position: bytes
    lacing: bytes
    body: bytes


def with_ogg_comments(data: bytes, fields: Mapping[str, str]) -> bytes:
    """An Ogg Vorbis file whose comments and serial number are these; its vendor stays."""
    pages = list(_pages(data))
    # The first page holds the first packet alone; the sound begins on a page of its own.
    headers = next(
        count for count in range(2, len(pages) + 1) if len(_packets(pages[1:count])) == 2
    )
    comments, setup = _packets(pages[1:headers])
    start = len(_COMMENT_PACKET) + 4
    vendor_size = int.from_bytes(comments[start - 4 : start], "little")
    vendor = comments[start : start + vendor_size]
    renewed = _COMMENT_PACKET + vorbis_comments(vendor, fields) + _FRAMING
    all_pages = [pages[0], *_paged([renewed, setup]), *pages[headers:]]
    return b"".join(_bytes_of(page, number) for number, page in enumerate(all_pages))


def _pages(data: bytes) -> Iterator[_Page]:
    at = 0
    while at < len(data):
        lacing = data[at + 27 : at + 27 + data[at + 26]]
        body = at + 27 + len(lacing)
        end = body + sum(lacing)
        yield _Page(data[at + 5], data[at + 6 : at + 14], lacing, data[body:end])
        at = end


def _packets(pages: list[_Page]) -> list[bytes]:
    """Packets that end on these pages."""
    body, found, begin, end = b"".join(page.body for page in pages), [], 0, 0
    for size in b"".join(page.lacing for page in pages):
        end += size
        if size < _SEGMENT:
            found.append(body[begin:end])
            begin = end
    return found


def _paged(packets: list[bytes]) -> Iterator[_Page]:
    """Header packets on as few pages as hold them; their position is 0."""
    lacing = b"".join(
        bytes([_SEGMENT] * (len(packet) // _SEGMENT) + [len(packet) % _SEGMENT])
        for packet in packets
    )
    body, begin = b"".join(packets), 0
    for first in range(0, len(lacing), _SEGMENTS):
        own = lacing[first : first + _SEGMENTS]
        inside = first > 0 and lacing[first - 1] == _SEGMENT
        ends = min(own) < _SEGMENT
        yield _Page(
            _CONTINUED if inside else 0,
            bytes(8) if ends else _UNFINISHED,
            own,
            body[begin : begin + sum(own)],
        )
        begin += sum(own)


def _bytes_of(page: _Page, number: int) -> bytes:
    before = b"".join(
        [b"OggS\x00", bytes([page.flags]), page.position, _SERIAL.to_bytes(4, "little")]
    ) + number.to_bytes(4, "little")
    after = bytes([len(page.lacing)]) + page.lacing + page.body
    return before + _checksum(before + bytes(4) + after).to_bytes(4, "little") + after


def _checksum(data: bytes) -> int:
    """CRC of Ogg: the polynomial of zlib's, high bit first, from 0 and not inverted.

    zlib's takes the low bit first, so both the bytes and the sum are turned around.
    """
    low_first = zlib.crc32(data.translate(_REVERSED), _ALL) ^ _ALL
    return int(f"{low_first:032b}"[::-1], 2)
