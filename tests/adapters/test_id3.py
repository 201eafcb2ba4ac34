"""ID3v2.3 headers, byte by byte as the standard has them (id3.org, ID3 tag version 2.3.0)."""

from __future__ import annotations

import pytest

from retune.adapters.id3 import id3_header


def test_one_text_frame_by_hand() -> None:
    # Header: "ID3", version 3.0, no flags, size 17 synchsafe. Frame: name, size 7 (plain
    # integer), no flags, encoding 1, byte order mark, "Ä" and "b" little-endian.
    assert id3_header({"TIT2": "Äb"}) == bytes.fromhex(
        "494433 0300 00 00000011 54495432 00000007 0000 01 fffe c400 6200"
    )


def test_sizes_are_synchsafe_in_the_header_and_plain_in_frames() -> None:
    header = id3_header({"TIT2": "x" * 100})
    assert header[14:18] == (1 + 2 + 200).to_bytes(4)
    body = 10 + 1 + 2 + 200
    assert header[6:10] == bytes([0, 0, body >> 7, body & 0x7F])
    assert len(header) == 10 + body


def test_lyrics_and_comment_have_language_and_an_empty_description() -> None:
    header = id3_header({}, "a\r\nb", "c", "deu")
    lyrics = b"\x01deu\xff\xfe\x00\x00\xff\xfe" + "a\nb".encode("utf-16-le")
    comment = b"\x01deu\xff\xfe\x00\x00\xff\xfe" + "c".encode("utf-16-le")
    assert header[10:14] == b"USLT"
    assert lyrics in header
    assert b"COMM" + len(comment).to_bytes(4) + b"\x00\x00" + comment in header


def test_letters_beyond_the_basic_plane_and_lone_surrogates() -> None:
    assert "𝄞".encode("utf-16-le") in id3_header({"TIT2": "𝄞"})
    assert b"?\x00" in id3_header({"TIT2": "\ud800"})


def test_nothing_to_say_is_no_header() -> None:
    assert id3_header({"TIT2": ""}) == b""


@pytest.mark.parametrize("language", ["", "de", "germ", "dëu", "1 3"])
def test_languages_that_are_no_codes(language: str) -> None:
    with pytest.raises(ValueError, match="ISO 639-2"):
        id3_header({}, "words", language=language)


def test_a_comment_by_hand() -> None:
    # Content: encoding 1, language 3, empty description 2 + 2, text 2 + 4 bytes; frame 10 more.
    assert id3_header({}, comment="hi", language="eng") == bytes.fromhex(
        "494433 0300 00 00000018 434f4d4d 0000000e 0000 01 656e67 fffe 0000 fffe 6800 6900"
    )
