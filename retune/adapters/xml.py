"""XML and compressed MusicXML (.mxl), read so that no file can do harm.

Nothing is fetched, no document type is loaded, no entity of the file's own is expanded, and the
bytes really unpacked are counted. A tree handed out holds elements only, named without their
namespace: no comments, no processing instructions, no entity nodes.
"""

from __future__ import annotations

import html
import lzma
import re
import struct
import zipfile
import zlib
from collections.abc import Iterator
from dataclasses import dataclass
from io import BytesIO
from itertools import islice
from pathlib import PurePosixPath
from typing import Protocol

from lxml import etree

from retune.errors import Finding, LimitError, UnreadableError, Weight
from retune.limits import Limits

ARCHIVE = b"PK"
"""What compressed MusicXML, as every zip archive, begins with."""
CONTAINER = "META-INF/container.xml"
_MAX_CONTAINER_BYTES = 1 << 20
_MAX_MEMBERS = 10_000
_MAX_ENTITIES = 10_000
_SCORE_SUFFIXES = (".musicxml", ".xml")

_EXPORT_AGAIN = "Export the score again as MusicXML from the notation program"

# What a file is that is neither XML nor a zip archive, by its first bytes.
_SIGNATURES = {
    b"MThd": "a MIDI file",
    b"%PDF": "a PDF",
    b"\x1f\x8b": "a gzip archive",
    b"\x89PNG": "a picture",
    b"\xff\xd8\xff": "a picture",
}

# Everything zipfile lets through on a damaged, encrypted or unknown archive.
ZIP_FAULTS = (
    zipfile.BadZipFile,
    zlib.error,
    lzma.LZMAError,
    struct.error,
    NotImplementedError,
    RuntimeError,
    EOFError,
    OSError,
    ValueError,
)

_WIDE_CLAIM = re.compile(rb"""<\?xml[^>]{0,200}encoding\s*=\s*["'](?:utf-?(?:16|32)|ucs-)""", re.I)


class Element(Protocol):
    """What this project uses of an element of a parsed tree."""

    tag: str
    text: str | None

    def get(self, name: str) -> str | None: ...
    def find(self, path: str) -> Element | None: ...
    def findtext(self, path: str) -> str | None: ...
    def findall(self, path: str) -> list[Element]: ...
    def iterfind(self, path: str) -> Iterator[Element]: ...
    def iterchildren(self, tag: str) -> Iterator[Element]: ...
    def __iter__(self) -> Iterator[Element]: ...


@dataclass(frozen=True, slots=True)
class Document:
    """A parsed document: its root, and what opening it left in doubt."""

    root: Element
    findings: tuple[Finding, ...] = ()


def read_document(data: bytes, limits: Limits) -> Document:
    """Parse XML, or the score inside a compressed MusicXML archive.

    Raises `UnreadableError` for anything that is not well-formed XML or that declares entities
    of its own, `LimitError` for more bytes than `limits.max_bytes`.
    """
    _check_size(len(data), limits)
    if data.startswith(ARCHIVE):
        _, inner, findings = score_in_archive(data, limits)
        document = _parse(inner)
        return Document(document.root, findings + document.findings)
    return _parse(data)


def _check_size(size: int, limits: Limits) -> None:
    if size > limits.max_bytes:
        raise LimitError(
            f"the file holds more than {limits.max_bytes} bytes",
            hint="Raise the size limit if the file is really a score",
        )


# --- XML ---------------------------------------------------------------------------------


def _parse(data: bytes) -> Document:
    text = data.lstrip(b" \t\r\n")
    if not text:
        raise UnreadableError("the file is empty", hint=_EXPORT_AGAIN)
    for signature, what in _SIGNATURES.items():
        if text.startswith(signature):
            raise UnreadableError(f"the file is {what}, not MusicXML", hint=_EXPORT_AGAIN)
    root, findings = _tree(text)
    _refuse_own_entities(root)
    _settle_foreign_entities(root)
    _drop_namespaces(root)
    return Document(root, findings)


def _tree(text: bytes) -> tuple[etree._Element, tuple[Finding, ...]]:
    """The root as parsed; a wrong or unknown declared encoding is replaced and reported."""
    if _WIDE_CLAIM.match(text):
        return _root(text, "utf-8"), (_encoding_doubt("UTF-8"),)
    try:
        return _root(text, None), ()
    except etree.XMLSyntaxError as fault:
        if not _is_encoding_fault(fault):
            raise _not_well_formed(fault) from None
    try:
        return _root(text, "windows-1252"), (_encoding_doubt("Windows Latin (windows-1252)"),)
    except etree.XMLSyntaxError as fault:
        raise _not_well_formed(fault) from None


def _root(text: bytes, encoding: str | None) -> etree._Element:
    parser = etree.XMLParser(
        encoding=encoding,
        resolve_entities=False,
        no_network=True,
        load_dtd=False,
        dtd_validation=False,
        attribute_defaults=False,
        huge_tree=False,
        recover=False,
        remove_comments=True,
        remove_pis=True,
        remove_blank_text=True,
    )
    return etree.fromstring(text, parser)


def _is_encoding_fault(fault: etree.XMLSyntaxError) -> bool:
    codes = etree.ErrorTypes
    return fault.code in (
        codes.ERR_INVALID_ENCODING,
        codes.ERR_UNKNOWN_ENCODING,
        codes.ERR_UNSUPPORTED_ENCODING,
        codes.I18N_CONV_FAILED,
    )


def _encoding_doubt(used: str) -> Finding:
    return Finding(
        Weight.DOUBT,
        f"the text is not in the encoding that the file declares; read as {used},"
        " so accented letters may be wrong",
    )


def _not_well_formed(fault: etree.XMLSyntaxError) -> UnreadableError:
    reason = (fault.msg or "unknown fault").split("\n")[0].split(", line ")[0]
    line = fault.lineno or 1
    return UnreadableError(
        f"the file is not well-formed XML (line {line}: {reason[:120]})",
        hint=f"It may be cut short or damaged. {_EXPORT_AGAIN}",
    )


def _refuse_own_entities(root: etree._Element) -> None:
    declared = root.getroottree().docinfo.internalDTD
    if declared is not None and any(True for _ in declared.iterentities()):
        raise UnreadableError(
            "the file declares entities of its own, which no score needs and which are not read",
            hint=_EXPORT_AGAIN,
        )


def _settle_foreign_entities(root: etree._Element) -> None:
    """Put named characters such as &nbsp; in place as text.

    They parse where a document type is named that could declare them; it is never loaded.
    """
    entities = list(islice(root.iter(etree.Entity), _MAX_ENTITIES + 1))
    if len(entities) > _MAX_ENTITIES:
        raise UnreadableError(
            "the file is full of characters that only a document type could explain",
            hint=_EXPORT_AGAIN,
        )
    for entity in entities:
        parent, before = entity.getparent(), entity.getprevious()
        text = html.unescape(entity.text) + (entity.tail or "")
        if before is None:
            parent.text = (parent.text or "") + text
        else:
            before.tail = (before.tail or "") + text
        entity.tail = None
        parent.remove(entity)


def _drop_namespaces(root: etree._Element) -> None:
    """Name elements locally where the whole score stands in a namespace."""
    if root.tag.startswith("{"):
        namespace = root.tag[: root.tag.index("}") + 1]
        for element in root.iter(f"{namespace}*"):
            element.tag = element.tag[len(namespace) :]


# --- compressed MusicXML -----------------------------------------------------------------


def score_in_archive(data: bytes, limits: Limits) -> tuple[str, bytes, tuple[Finding, ...]]:
    """Name and bytes of the score in an .mxl archive: the first rootfile of its container.

    Raises as `read_document` does.
    """
    if data.count(b"PK\1\2") > _MAX_MEMBERS:
        raise UnreadableError(
            f"the archive holds more than {_MAX_MEMBERS} files", hint=_EXPORT_AGAIN
        )
    try:
        with zipfile.ZipFile(BytesIO(data)) as archive:
            name, findings = _score_name(archive)
            return name, _member(archive, name, limits.max_bytes), findings
    except ZIP_FAULTS as fault:
        raise UnreadableError(
            f"the archive cannot be unpacked: {_reason(fault)}",
            hint=f"It may be damaged or encrypted. {_EXPORT_AGAIN}",
        ) from None


def _reason(fault: Exception) -> str:
    return (str(fault) or type(fault).__name__).split("\n")[0][:120]


def _member(archive: zipfile.ZipFile, name: str, most: int) -> bytes:
    """One file of the archive; the size it states is not believed."""
    with archive.open(name) as stream:
        data = stream.read(most + 1)
    _check_size(len(data), Limits(max_bytes=most))
    return data


def _score_name(archive: zipfile.ZipFile) -> tuple[str, tuple[Finding, ...]]:
    names = archive.namelist()
    if CONTAINER not in names:
        return _likely_score(names, f"the archive has no {CONTAINER}")
    wanted = _first_rootfile(_member(archive, CONTAINER, _MAX_CONTAINER_BYTES))
    if wanted is None:
        return _likely_score(names, f"{CONTAINER} names no score")
    if ".." in PurePosixPath(wanted).parts or wanted.startswith("/"):
        raise UnreadableError(
            f"{CONTAINER} names a file outside the archive ('{wanted[:80]}')", hint=_EXPORT_AGAIN
        )
    if wanted not in names:
        return _likely_score(names, f"{CONTAINER} names '{wanted[:80]}', which is not there")
    return wanted, ()


def _first_rootfile(container: bytes) -> str | None:
    root = _parse(container).root
    for rootfiles in root.iterchildren("rootfiles"):
        for rootfile in rootfiles.iterchildren("rootfile"):
            path = (rootfile.get("full-path") or "").strip().replace("\\", "/")
            return path.removeprefix("./") or None
    return None


def _likely_score(names: list[str], why: str) -> tuple[str, tuple[Finding, ...]]:
    """The first file that looks like a score, passing over a system's own side files."""
    for suffix in _SCORE_SUFFIXES:
        for name in names:
            path = PurePosixPath(name)
            aside = path.parts[:1] in (("META-INF",), ("__MACOSX",)) or path.name.startswith(".")
            if path.suffix.lower() == suffix and not aside:
                return name, (Finding(Weight.DOUBT, f"{why}; read '{name}'"),)
    raise UnreadableError(f"{why}, and no score was found in it", hint=_EXPORT_AGAIN)
