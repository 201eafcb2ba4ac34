"""XML and .mxl: nothing a file holds may do harm, and what can be read is read.

Sources: MusicXML 4.0 (W3C), container.xsd and the compressed-file tutorial; XML 1.0, section
4.3.3 on encodings.
"""

from __future__ import annotations

import zipfile
from contextlib import suppress
from io import BytesIO
from pathlib import Path

import pytest

from retune.adapters.xml import CONTAINER, read_document
from retune.errors import LimitError, RetuneError, UnreadableError
from retune.limits import Limits

SCORE = "<score-partwise><part-name>Soprän</part-name></score-partwise>"


def name_in(data: bytes) -> str | None:
    return read_document(data, Limits()).root.findtext("part-name")


# --- encodings ----------------------------------------------------------------------------


@pytest.mark.parametrize(
    "encoding",
    ["UTF-8", "UTF-16", "UTF-32", "ISO-8859-1", "ISO-8859-15", "windows-1252", "macintosh"],
)
def test_declared_encodings_are_obeyed(encoding: str) -> None:
    python = {"macintosh": "mac_roman"}.get(encoding, encoding)
    data = f'<?xml version="1.0" encoding="{encoding}"?>{SCORE}'.encode(python)
    document = read_document(data, Limits())
    assert document.root.findtext("part-name") == "Soprän"
    assert not document.findings


@pytest.mark.parametrize("encoding", ["utf-8-sig", "utf-16", "utf-8"])
def test_a_byte_order_mark_is_enough(encoding: str) -> None:
    assert name_in(SCORE.encode(encoding)) == "Soprän"


@pytest.mark.parametrize(
    ("declared", "real"),
    [("UTF-8", "latin-1"), ("UTF-16", "utf-8"), ("no-such-code", "cp1252")],
)
def test_a_wrongly_declared_encoding_is_named(declared: str, real: str) -> None:
    data = f'<?xml version="1.0" encoding="{declared}"?>{SCORE}'.encode(real)
    document = read_document(data, Limits())
    assert document.root.findtext("part-name") == "Soprän"
    assert "encoding" in document.findings[0].what


def test_space_before_the_declaration_is_forgiven() -> None:
    assert name_in(f'\n <?xml version="1.0"?>{SCORE}'.encode()) == "Soprän"


# --- entities and document types ----------------------------------------------------------


def declaring(entities: str, content: str = "&e;") -> bytes:
    return f"<!DOCTYPE a [{entities}]><a>{content}</a>".encode()


LAUGHS = '<!ENTITY l0 "lol">' + "".join(
    f'<!ENTITY l{n} "{f"&l{n - 1};" * 10}">' for n in range(1, 10)
)


@pytest.mark.parametrize(
    "data",
    [
        declaring('<!ENTITY e "text">'),
        declaring(LAUGHS, "&l9;"),
        declaring('<!ENTITY e SYSTEM "file:///etc/passwd">'),
        declaring('<!ENTITY e SYSTEM "http://127.0.0.1:9/x">'),
        declaring('<!ENTITY % p SYSTEM "http://127.0.0.1:9/x"> %p;'),
        declaring(LAUGHS, "").replace(b"<a>", b'<a b="&l9;">'),
    ],
)
def test_files_that_declare_entities_are_refused(data: bytes) -> None:
    with pytest.raises(UnreadableError) as caught:
        read_document(data, Limits())
    assert caught.value.hint


def test_an_external_entity_is_never_read(tmp_path: Path) -> None:
    secret = tmp_path / "secret.txt"
    secret.write_text("secret")
    with pytest.raises(UnreadableError) as caught:
        read_document(declaring(f'<!ENTITY e SYSTEM "{secret.as_uri()}">'), Limits())
    assert "secret" not in str(caught.value)


def test_the_usual_document_type_is_not_loaded(tmp_path: Path) -> None:
    """A document type on disk that would change the text if it were loaded."""
    dtd = tmp_path / "partwise.dtd"
    dtd.write_text('<!ENTITY nbsp "LOADED"><!ATTLIST a b CDATA "LOADED">')
    data = f'<!DOCTYPE a SYSTEM "{dtd.as_uri()}"><a>one&nbsp;two<b/>&eacute;</a>'.encode()
    root = read_document(data, Limits()).root
    assert root.text == "one\u00a0two"
    assert root.get("b") is None
    assert [child.tag for child in root] == ["b"]


def test_a_flood_of_undeclared_characters_is_refused() -> None:
    flood = b'<!DOCTYPE a SYSTEM "x.dtd"><a>' + b"&nbsp;" * 20_000 + b"</a>"
    with pytest.raises(UnreadableError):
        read_document(flood, Limits())


def test_comments_instructions_and_namespaces_are_gone() -> None:
    data = b"<m:a xmlns:m='urn:x'><!-- c --><?pi x?><m:b>4<!-- d -->2</m:b><x:b xmlns:x='y'/></m:a>"
    root = read_document(data, Limits()).root
    assert root.tag == "a"
    assert [child.tag for child in root] == ["b", "{y}b"]
    assert root.findtext("b") == "42"


# --- files that are no XML ----------------------------------------------------------------


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (b"", "empty"),
        (b"\n\t ", "empty"),
        (b"MThd\0\0\0\6", "a MIDI file"),
        (b"%PDF-1.7", "a PDF"),
        (b"\x1f\x8b\x08", "gzip"),
        (b"plain text", "line 1"),
        (b"<a>\n<b>\n", "line 3"),
        (b"<a>\0</a>", "not well-formed"),
        (b"<a>" * 300 + b"</a>" * 300, "not well-formed"),
        (b"<a>" + b"x" * 11_000_000 + b"</a>", "not well-formed"),
    ],
)
def test_what_is_no_xml_is_refused_with_a_reason(data: bytes, words: str) -> None:
    with pytest.raises(UnreadableError, match=words) as caught:
        read_document(data, Limits())
    assert caught.value.hint
    assert "\n" not in str(caught.value)


def test_the_size_limit_holds() -> None:
    with pytest.raises(LimitError, match="more than 10 bytes"):
        read_document(SCORE.encode(), Limits(max_bytes=10))


# --- compressed files ---------------------------------------------------------------------


def container(*paths: str) -> str:
    files = "".join(f'<rootfile full-path="{path}"/>' for path in paths)
    return f'<?xml version="1.0"?><container><rootfiles>{files}</rootfiles></container>'


def archive(files: dict[str, str | bytes], method: int = zipfile.ZIP_DEFLATED) -> bytes:
    target = BytesIO()
    with zipfile.ZipFile(target, "w", method) as zipped:
        for name, content in files.items():
            zipped.writestr(name, content)
    return target.getvalue()


def titled(title: str) -> str:
    return f"<score-partwise><part-name>{title}</part-name></score-partwise>"


def test_the_first_rootfile_is_the_score() -> None:
    data = archive(
        {
            "mimetype": "application/vnd.recordare.musicxml",
            "__MACOSX/._right.xml": b"\0\5\x16\7",
            "decoy.xml": titled("wrong"),
            CONTAINER: container("sub/right.musicxml", "decoy.xml"),
            "sub/right.musicxml": titled("right"),
        }
    )
    document = read_document(data, Limits())
    assert document.root.findtext("part-name") == "right"
    assert not document.findings


def test_a_container_in_a_namespace_is_read_too() -> None:
    spaced = container("right.xml").replace("<container>", '<container xmlns="urn:x">')
    data = archive({CONTAINER: spaced, "right.xml": titled("right"), "a.xml": titled("wrong")})
    assert name_in(data) == "right"


@pytest.mark.parametrize(
    ("files", "words"),
    [
        ({}, "has no META-INF/container.xml"),
        ({CONTAINER: "<container/>"}, "names no score"),
        ({CONTAINER: container("gone.xml")}, "which is not there"),
    ],
)
def test_without_a_usable_container_the_likely_score_is_read_and_named(
    files: dict[str, str], words: str
) -> None:
    rest = {
        "__MACOSX/._a.xml": "x",
        "META-INF/other.xml": titled("wrong"),
        "cover.png": "x",
        "a.musicxml": titled("right"),
    }
    document = read_document(archive({**files, **rest}), Limits())
    assert document.root.findtext("part-name") == "right"
    assert words in document.findings[0].what


@pytest.mark.parametrize(
    "path", ["../right.xml", "a/../../right.xml", "/etc/passwd", "..\\right.xml"]
)
def test_paths_that_lead_out_are_refused(path: str) -> None:
    data = archive({CONTAINER: container(path), "right.xml": titled("right")})
    with pytest.raises(UnreadableError, match="outside the archive"):
        read_document(data, Limits())


def test_an_archive_without_a_score_is_refused() -> None:
    for files in ({}, {"a.txt": "x"}, {CONTAINER: container("a.xml")}):
        with pytest.raises(UnreadableError):
            read_document(archive(dict(files)), Limits())


def test_a_bomb_is_stopped_by_the_bytes_it_really_unpacks() -> None:
    bomb = archive({CONTAINER: container("a.xml"), "a.xml": b" " * 5_000_000})
    assert len(bomb) < 10_000
    with pytest.raises(LimitError, match="more than 1000000 bytes"):
        read_document(bomb, Limits(max_bytes=1_000_000))
    big_container = archive({CONTAINER: b" " * 5_000_000})
    with pytest.raises(RetuneError):
        read_document(big_container, Limits())


def test_an_archive_of_very_many_files_is_refused() -> None:
    with pytest.raises(UnreadableError, match="more than 10000 files"):
        read_document(archive({f"{n}.xml": "" for n in range(10_001)}), Limits())


def test_an_encrypted_archive_is_refused() -> None:
    data = bytearray(archive({"a.xml": SCORE}))
    data[6] |= 1  # general purpose flag, bit 0, of the local header (APPNOTE 4.4.4)
    data[data.index(b"PK\1\2") + 8] |= 1  # and of the central directory
    with pytest.raises(UnreadableError, match="cannot be unpacked"):
        read_document(bytes(data), Limits())


def test_an_unknown_compression_method_is_refused() -> None:
    data = bytearray(archive({"a.xml": SCORE}))
    data[8] = 99
    data[data.index(b"PK\1\2") + 10] = 99
    with pytest.raises(UnreadableError, match="cannot be unpacked"):
        read_document(bytes(data), Limits())


def test_damaged_archives_are_refused_wherever_they_are_cut_or_changed() -> None:
    whole = archive({CONTAINER: container("a.xml"), "a.xml": titled("right" * 50)})
    for cut in range(2, len(whole), 7):
        with pytest.raises(RetuneError):
            read_document(whole[:cut], Limits())
    for place in range(2, len(whole), 3):
        changed = bytearray(whole)
        changed[place] ^= 0xFF
        with suppress(RetuneError):
            read_document(bytes(changed), Limits())
