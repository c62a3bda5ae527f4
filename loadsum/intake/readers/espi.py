"""ESPI XML (NAESB REQ.21): the entries of a feed, by a careful parser with a fast way through uniform readings."""

import re
import warnings
from dataclasses import dataclass, field
from xml.parsers import expat

import numpy as np
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError

DIGITS = b"-0123456789"
TO_BLANKS = bytes(c if c in DIGITS else 32 for c in range(256))
KINDS = ("UsagePoint", "MeterReading", "ReadingType", "IntervalBlock", "LocalTimeParameters")
DEEPEST = 50


@dataclass(slots=True, kw_only=True, eq=False)
class Block:
    """Readings of one IntervalBlock; NaN where an element is absent.

    Parameters
    ----------
    start_s, duration_s, value, quality : (n,) float64
        Of each reading; the worst quality where there are several. [s, s, raw, code]
    first : int
        Position of the first reading in the file, from 1. [-]
    begin_s : float
        Start of the block. [s]
    """

    start_s: NDArray[np.float64]
    duration_s: NDArray[np.float64]
    value: NDArray[np.float64]
    quality: NDArray[np.float64]
    first: int
    begin_s: float


@dataclass(slots=True, kw_only=True)
class Entry:
    """One entry of the feed: what it is, its links, its leaf elements, its blocks."""

    kind: str = ""
    own: str = ""
    up: str = ""
    related: list[str] = field(default_factory=list)
    fields: dict[str, str] = field(default_factory=dict)
    blocks: list[Block] = field(default_factory=list)


class _RefusedError(Exception):
    """The document declares entities or a document type."""


def parse_espi(content: bytes, name: str) -> list[Entry]:
    """Entries of an ESPI feed.

    Raises
    ------
    InputError
        The file is no XML, declares a document type or entities, or holds a reading that is no number.
    """
    skeleton, blocks = _uniform_blocks(content)
    parser = _Parser(blocks)
    try:
        parser.expat.Parse(skeleton, True)
    except expat.ExpatError as error:
        raise InputError(
            name, [Fault(f"{name}:{error.lineno}", f"is not complete XML: {expat.ErrorString(error.code)}")]
        ) from error
    except _RefusedError as error:
        raise InputError(
            name, [Fault(f"{name}:{parser.expat.CurrentLineNumber}", f"{error}; ask for the feed without it")]
        ) from error
    except ValueError as error:
        raise InputError(name, [Fault(f"{name}:{parser.expat.CurrentLineNumber}", str(error)[:120])]) from error
    return parser.entries


def _uniform_blocks(content: bytes) -> tuple[bytes, list[Block]]:
    """The document with the readings of uniform blocks cut out, and those blocks in order.

    A block is uniform when its readings differ in nothing but digits. Anything else stays in the document, for the
    careful parser; so does everything where markup could hide text (comments, CDATA, document types).
    """
    found = re.search(rb"<((?:[A-Za-z_][\w.-]*:)?)IntervalBlock[\s>]", content)
    if found is None or b"<!" in content or content.startswith((b"\xff\xfe", b"\xfe\xff")):
        return content, []
    prefix = found[1]
    head, tail = b"<" + prefix + b"IntervalReading>", b"</" + prefix + b"IntervalReading>"
    stop = b"</" + prefix + b"IntervalBlock>"
    pieces, blocks, at, first = [], [], 0, 1
    while True:
        begin = content.find(head, at)
        if begin < 0:
            break
        end = content.find(stop, begin)
        if end < 0:
            return content, []
        body = content[begin:end]
        block = _uniform(body.replace(prefix, b"") if prefix else body, b"<IntervalReading>", b"</IntervalReading>")
        if block is None:
            return content, []
        block.first = first
        first += block.value.size
        pieces.append(content[at:begin])
        pieces.append(b"<readings-cut-out/>")
        blocks.append(block)
        at = end
    del tail
    pieces.append(content[at:])
    return b"".join(pieces), blocks


def _uniform(body: bytes, head: bytes, tail: bytes) -> Block | None:
    close = body.find(tail)
    follows = body.find(head, close)
    one = body[: follows if follows > 0 else len(body)]
    leaves = re.findall(rb"<(\w+)>-?\d+</", one)
    number = body.count(head)
    if b"=" in one or b"&" in one or re.search(rb"<[^>]*\d[^>]*>", one) or b"value" not in leaves:
        return None
    mould = one.translate(None, DIGITS)
    rest = body.translate(None, DIGITS)
    if follows > 0 and rest.rstrip() != (mould * number).rstrip():
        return None
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        try:
            numbers = np.fromstring(body.translate(TO_BLANKS), dtype=np.int64, sep=" ")
        except (DeprecationWarning, ValueError):
            return None
    if numbers.size != number * len(leaves):
        return None
    table = numbers.reshape(number, len(leaves)).astype(np.float64)
    if np.abs(table).max() >= 2**53:
        return None

    def column(leaf: bytes) -> NDArray[np.float64]:
        places = [n for n, found in enumerate(leaves) if found == leaf]
        return table[:, places].max(axis=1) if places else np.full(number, np.nan)

    return Block(
        start_s=column(b"start"),
        duration_s=column(b"duration"),
        value=column(b"value"),
        quality=column(b"quality"),
        first=1,
        begin_s=float("nan"),
    )


class _Parser:
    """Walks a feed with expat and gathers its entries."""

    def __init__(self, cut_out: list[Block]) -> None:
        self.entries: list[Entry] = []
        self.cut_out = iter(cut_out)
        self.cut_any = bool(cut_out)
        self.path: list[str] = []
        self.text: list[str] = []
        self.entry: Entry | None = None
        self.readings: list[dict[str, float]] = []
        self.reading: dict[str, float] | None = None
        self.ready: list[Block] = []
        self.begin_s = float("nan")
        self.count = 0
        self.expat = expat.ParserCreate()
        self.expat.buffer_text = True
        self.expat.StartElementHandler = self.start
        self.expat.EndElementHandler = self.end
        self.expat.CharacterDataHandler = self.text.append
        self.expat.StartDoctypeDeclHandler = self.refuse
        self.expat.EntityDeclHandler = self.refuse

    def refuse(self, *_: object) -> None:
        raise _RefusedError("declares a document type or entities, which meter data never needs")

    def start(self, tag: str, attributes: dict[str, str]) -> None:
        local = tag.rpartition(":")[2]
        self.path.append(local)
        self.text.clear()
        if len(self.path) > DEEPEST:
            raise ValueError("is nested deeper than any feed")
        if local == "entry":
            self.entry = Entry()
        elif local == "link" and self.entry is not None:
            self.link(attributes.get("rel", ""), attributes.get("href", ""))
        elif local in KINDS:
            if self.entry is None:
                self.entry = Entry()
            self.entry.kind = local
            if local == "IntervalBlock":
                self.readings, self.ready, self.begin_s = [], [], float("nan")
        elif local == "IntervalReading":
            self.reading = {}
        elif local == "readings-cut-out":
            block = next(self.cut_out)
            self.count += block.value.size
            self.ready.append(block)

    def link(self, rel: str, href: str) -> None:
        assert self.entry is not None
        href = href.strip().rstrip("/")
        if rel == "self":
            self.entry.own = href
        elif rel == "up":
            self.entry.up = href
        elif rel == "related":
            self.entry.related.append(href)

    def end(self, tag: str) -> None:
        local = self.path.pop()
        text = "".join(self.text).strip()
        self.text.clear()
        parent = self.path[-1] if self.path else ""
        if self.reading is not None:
            self.in_reading(local, text)
        elif local == "start" and parent == "interval":
            self.begin_s = _number(local, text)
        elif local == "IntervalBlock" and self.entry is not None:
            self.close_block()
        elif local == "entry" and self.entry is not None:
            self.entries.append(self.entry)
            self.entry = None
        elif self.entry is not None and text:
            self.entry.fields.setdefault(local if parent != "ServiceCategory" else "serviceCategory", text)
        del tag

    def in_reading(self, local: str, text: str) -> None:
        assert self.reading is not None
        if local == "IntervalReading":
            self.readings.append(self.reading)
            self.reading = None
        elif local in ("start", "duration", "value"):
            self.reading[local] = _number(local, text)
        elif local == "quality":
            self.reading[local] = max(_number(local, text), self.reading.get(local, -1.0))

    def close_block(self) -> None:
        assert self.entry is not None
        for block in self.ready:
            block.begin_s = self.begin_s
            self.entry.blocks.append(block)
        if self.readings:
            start, duration, value, quality = (
                np.array([reading.get(key, np.nan) for reading in self.readings])
                for key in ("start", "duration", "value", "quality")
            )
            self.entry.blocks.append(
                Block(
                    start_s=start,
                    duration_s=duration,
                    value=value,
                    quality=quality,
                    first=self.count + 1,
                    begin_s=self.begin_s,
                )
            )
            self.count += len(self.readings)
        if self.path and "entry" not in self.path:  # a block that stands by itself
            self.entries.append(self.entry)
            self.entry = None


def _number(local: str, text: str) -> float:
    if not re.fullmatch(r"[+-]?\d{1,15}", text):
        raise ValueError(f"{local} is {text[:30]!r}, not a whole number")
    return float(text)
