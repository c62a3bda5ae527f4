"""A report that came back from outside: read as hostile, with bounds on size, and nothing in it is ever run."""

import functools
import io
import json
import re
import zlib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from loadsum.errors import Fault, InputError, MissingExtraError
from loadsum.report.archive import RESULTS_FILE, Attachment, Relationship
from loadsum.report.results import SCHEMA_VERSION

LARGEST_FILE = 256 * 2**20
LARGEST_STREAM = 128 * 2**20
LARGEST_ALL = 512 * 2**20
ACTIVE = ("/JavaScript", "/JS", "/Launch", "/RichMedia", "/XFA", "/OpenAction", "/AA")
RELATIONSHIPS: Mapping[str, Relationship] = {"/Source": "Source", "/Data": "Data", "/Supplement": "Supplement"}
_STREAM = re.compile(rb"stream\r?\n")
_ESCAPE = re.compile(rb"#([0-9A-Fa-f]{2})")


@dataclass(frozen=True, slots=True, kw_only=True)
class Received:
    """A report read back.

    Parameters
    ----------
    content : bytes
        The whole file.
    attachments : mapping of str to Attachment
        Files inside it.
    fields : tuple of str
        Names of its signature fields.
    active : tuple of str
        Kinds of active content found, none of which is ever run.
    """

    content: bytes
    attachments: Mapping[str, Attachment]
    fields: tuple[str, ...]
    active: tuple[str, ...]

    def json(self, name: str) -> Any:
        """An attachment as JSON; None where it is missing or no JSON object."""
        try:
            value = json.loads(self.attachments[name].content) if name in self.attachments else None
        except (ValueError, RecursionError):
            return None
        return value if isinstance(value, dict) else None

    @property
    def results(self) -> dict[str, Any] | None:
        """The attached results; None where there are none."""
        found = self.json(RESULTS_FILE)
        return dict(found) if found is not None else None


def read_results(path: Path) -> dict[str, Any]:
    """Results from a results.json on disk, for drawing the report again.

    Parameters
    ----------
    path : Path
        The file.

    Raises
    ------
    InputError
        The file cannot be read, is no results.json, or is of another schema version.
    """
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise InputError(str(path), [Fault("file", f"larger than {LARGEST_FILE // 2**20} MiB")])
        found = json.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(str(path), [Fault("file", f"cannot be read: {error.strerror}")]) from error
    except (ValueError, RecursionError) as error:
        raise InputError(str(path), [Fault("file", "is not JSON in UTF-8")]) from error
    if not isinstance(found, dict) or "schema_version" not in found or "study" not in found:
        raise InputError(str(path), [Fault("file", "is no results.json of this program")])
    if found["schema_version"] != SCHEMA_VERSION:
        told = f"is {found['schema_version']!r}; this version reads {SCHEMA_VERSION}; draw it with the one that made it"
        raise InputError(str(path), [Fault("schema_version", told)])
    return found


def read_report(content: bytes, source: str = "report") -> Received:
    """A report's attachments and fields.

    Parameters
    ----------
    content : bytes
        The file.
    source : str
        Its name, for messages.

    Raises
    ------
    InputError
        It is no PDF, damaged, encrypted, or larger than the bounds allow.
    MissingExtraError
        The package that reads PDF is not installed.
    """
    if b"%PDF-" not in content[:1024]:
        raise InputError(source, [Fault("file", "this is not a PDF file")])
    _within_bounds(content, source)
    reader = open_pdf(content, source)
    faults = reading_faults()
    try:
        root = reader.root
        return Received(
            content=content,
            attachments=_attachments(reader, root),
            fields=tuple(_field_names(root)),
            active=_active(content),
        )
    except faults as error:
        raise InputError(source, [Fault("file", f"the PDF is damaged: {_short(error)}")]) from error


def open_pdf(content: bytes, source: str) -> Any:
    """The PDF reader on a file.

    Raises
    ------
    InputError
        The file is damaged or encrypted.
    MissingExtraError
        The package that reads PDF is not installed.
    """
    try:
        kind = _reader_kind()
    except ImportError as error:
        raise MissingExtraError("reading a report back", "sign") from error
    try:
        reader = kind(io.BytesIO(content), strict=True)
    except reading_faults() as error:
        raise InputError(source, [Fault("file", f"the PDF is damaged: {_short(error)}")]) from error
    if reader.encrypted:
        raise InputError(source, [Fault("file", "the PDF is encrypted, which no report of this program is")])
    return reader


@functools.cache
def _reader_kind() -> Any:
    """The library's reader, which keeps the index of an object stream instead of parsing it again for each object.

    A report has thousands of objects in one stream; without this, judging two signatures takes thirty times as long.
    """
    from pyhanko.pdf_utils import generic, misc
    from pyhanko.pdf_utils.reader import PdfFileReader

    class KeepingReader(PdfFileReader):
        def _get_object_from_stream(self, idnum: int, stmnum: int, idx: int) -> Any:
            kept = self.__dict__.setdefault("_kept_streams", {})
            if stmnum not in kept:
                stream = generic.Reference(stmnum, 0, self).get_object()
                if not isinstance(stream, generic.StreamObject) or stream["/Type"] != "/ObjStm":
                    raise misc.PdfReadError("an object stream is none")
                data = bytes(stream.data)
                first = int(stream["/First"])
                head = [int(part) for part in data[:first].split()]
                kept[stmnum] = (data, first, head[::2], head[1::2])
            data, first, numbers, offsets = kept[stmnum]
            if not 0 <= idx < len(numbers) or numbers[idx] != idnum:
                raise misc.PdfReadError("an object is in the wrong place of its stream")
            found = generic.read_object(io.BytesIO(data[first + offsets[idx] :]), generic.Reference(idnum, 0, self))
            if isinstance(found, generic.StreamObject | generic.IndirectObject):
                raise misc.PdfReadError("an object stream holds what it must not")
            return found

    return KeepingReader


def reading_faults() -> tuple[type[Exception], ...]:
    """What the library raises on a damaged or hostile file."""
    from pyhanko.pdf_utils.misc import PdfError

    shape = (ValueError, KeyError, IndexError, TypeError, AttributeError)
    return PdfError, *shape, RecursionError, NotImplementedError, zlib.error, OSError


def _short(error: Exception) -> str:
    return f"{type(error).__name__}: {str(error)[:160]}"


def _within_bounds(content: bytes, source: str) -> None:
    """Refuse a file whose streams unpack to more than the bounds, before anything unpacks them for real."""
    if len(content) > LARGEST_FILE:
        raise InputError(source, [Fault("file", f"larger than {LARGEST_FILE // 2**20} MiB")])
    total = 0
    for start in _STREAM.finditer(content):
        size, first = _unpacked(content, start.end())
        if first[:1] == b"\x78":
            size = max(size, _unpacked(first, 0)[0])
        total += size
        if size > LARGEST_STREAM or total > LARGEST_ALL:
            raise InputError(source, [Fault("file", "a stream unpacks to more than any report of this program holds")])


def _unpacked(content: bytes, start: int) -> tuple[int, bytes]:
    """Size of a packed stream once unpacked, counted in pieces and stopped at the bound, and its first piece."""
    machine = zlib.decompressobj()
    size, first = 0, b""
    piece = content[start : start + 65536]
    place = start + 65536
    try:
        while piece and not machine.eof and size <= LARGEST_STREAM:
            out = machine.decompress(piece, 2**20)
            first = first or out
            size += len(out)
            piece = machine.unconsumed_tail
            if not piece:
                piece = content[place : place + 65536]
                place += 65536
    except zlib.error:
        return size, first
    return size, first


def _attachments(reader: Any, root: Any) -> dict[str, Attachment]:
    found: dict[str, Attachment] = {}
    if "/Names" not in root or "/EmbeddedFiles" not in root["/Names"]:
        return found
    pairs = root["/Names"]["/EmbeddedFiles"]["/Names"]
    for index in range(0, len(pairs) - 1, 2):
        entry = pairs[index + 1]
        name = str(entry["/UF"])
        if name in found:
            raise ValueError(f"two attachments are called {name[:80]!r}")
        found[name] = Attachment(
            name=name,
            content=bytes(entry["/EF"]["/F"].data),
            description=str(entry["/Desc"]) if "/Desc" in entry else "",
            relationship=RELATIONSHIPS[str(entry["/AFRelationship"])],
        )
    return found


def _field_names(root: Any) -> list[str]:
    if "/AcroForm" not in root:
        return []
    fields = root["/AcroForm"]["/Fields"]
    found = [fields[index] for index in range(len(fields))]
    return [str(field["/T"]) for field in found if "/FT" in field and str(field["/FT"]) == "/Sig"]


def _active(content: bytes) -> tuple[str, ...]:
    """Names of active content in the objects of a file, those packed into object streams included."""
    pieces = []
    last = 0
    for start in _STREAM.finditer(content):
        if start.start() < last:
            continue
        head = content[last : start.start()]
        pieces.append(head)
        if b"ObjStm" in _plain(head[-600:]):
            pieces.append(_whole(content, start.end()))
        last = max(content.find(b"endstream", start.end()), start.end())
    pieces.append(content[last:])
    text = _plain(b"\n".join(pieces))
    return tuple(name for name in ACTIVE if re.search(name.encode() + rb"(?![A-Za-z])", text))


def _plain(text: bytes) -> bytes:
    """Names without their numeric escapes."""
    return _ESCAPE.sub(lambda code: bytes([int(code[1], 16)]), text)


def _whole(content: bytes, start: int) -> bytes:
    machine = zlib.decompressobj()
    try:
        return machine.decompress(content[start:], LARGEST_STREAM)
    except zlib.error:
        return b""
