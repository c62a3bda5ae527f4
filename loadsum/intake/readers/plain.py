"""Plain delimited text, read fast: no quotes, decimal points, only numbers; all else goes to the careful reader."""

import importlib
import importlib.util
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.readers.raw import RawReadings

BLOCK_BYTES = 2**23
SECTION_BYTES = 2**25
LARGEST = 1e12  # a reading beyond this, in any unit, is no reading


@dataclass(frozen=True, slots=True, kw_only=True)
class Wanted:
    """Columns of a plain file: all of them, the one of stamps, of identifiers (or None), and those of values."""

    columns: list[str]
    time: str
    who: str | None
    values: list[str]
    fixed: str
    delimiter: str


def read_plain(content: bytes, name: str, wanted: Wanted, layout: str, said: list[str]) -> RawReadings | None:
    """Readings of a plain file; None where it is not plain in every row, or pyarrow is not installed.

    Stamps and identifiers become integer codes as the file is parsed, so that only distinct ones are looked at.
    """
    if (
        importlib.util.find_spec("pyarrow") is None
        or content.find(b'"', content.find(b"\n")) >= 0
        or b"\x00" in content
    ):
        return None
    body = content.find(b"\n") + 1
    rows = content.count(b"\n", body) + (0 if content.endswith(b"\n") else 1)
    count = len(wanted.values)
    if rows == 0:
        return None
    value, believable, empty = np.empty((count, rows)), 0, 0
    stamp: NDArray[np.integer] = np.empty(rows, np.int32)
    customer: NDArray[np.integer] = np.empty(rows if wanted.who is not None else 0, np.int32)
    stamp_codes: dict[str, int] = {}
    customer_codes: dict[str, int] = {}
    done = 0
    for begin, end in _sections(content, body):
        table = _parsed(memoryview(content)[begin:end], wanted)
        if table is None or done + table.num_rows > rows:
            return None
        place = slice(done, done + table.num_rows)
        done += table.num_rows
        for n, column in enumerate(wanted.values):
            value[n, place] = table.column(column).to_numpy()
            with np.errstate(invalid="ignore"):
                believable += int(np.count_nonzero(np.abs(value[n, place]) < LARGEST))
            empty += table.column(column).null_count
        stamp[place] = _codes(table.column(wanted.time), stamp_codes)
        if wanted.who is not None:
            customer[place] = _codes(table.column(wanted.who), customer_codes)
    # a row without a stamp, or a value that is no believable number, is for the careful reader to name
    if done != rows or believable != value.size - empty or any(not text.strip() for text in stamp_codes):
        return None
    line = np.arange(2, rows + 2, dtype=np.int32)
    if wanted.who is not None:
        customers, customer = _trimmed(list(customer_codes), customer)
    else:
        customers = [wanted.fixed] if wanted.fixed and count == 1 else wanted.values
        customer = np.repeat(np.arange(count, dtype=np.int32), rows)
        stamp, line = np.tile(stamp, count), np.tile(line, count)
    return RawReadings(
        name=name,
        customers=tuple(customers),
        stamps=tuple(stamp_codes),
        customer=customer,
        stamp=stamp,
        value=value.reshape(-1),
        kvar=None,
        exported=None,
        flagged=np.broadcast_to(np.zeros(1, bool), value.size),
        line=line,
        unreadable=(),
        layout=layout,
        choices=tuple(said),
    )


def _sections(content: bytes, begin: int) -> Iterator[tuple[int, int]]:
    """Ends of stretches of whole lines that are parsed one after the other, so that their text is held once only."""
    while begin < len(content):
        end = len(content)
        if end - begin > SECTION_BYTES:
            end = content.rfind(b"\n", begin, begin + SECTION_BYTES) + 1
            if end == 0:  # a line longer than a section
                end = content.find(b"\n", begin) + 1 or len(content)
        yield begin, end
        begin = end


def _parsed(text: memoryview, wanted: Wanted) -> Any:
    """Table of a stretch of lines, stamps and identifiers as codes; None where it is not plain."""
    pa, pacsv = importlib.import_module("pyarrow"), importlib.import_module("pyarrow.csv")
    coded = pa.dictionary(pa.int32(), pa.string())
    keys = [wanted.time] if wanted.who is None else [wanted.time, wanted.who]
    try:
        return pacsv.read_csv(
            pa.BufferReader(pa.py_buffer(text)),
            read_options=pacsv.ReadOptions(block_size=BLOCK_BYTES, column_names=wanted.columns),
            parse_options=pacsv.ParseOptions(
                delimiter=wanted.delimiter, quote_char=False, ignore_empty_lines=False, newlines_in_values=False
            ),
            convert_options=pacsv.ConvertOptions(
                column_types={**dict.fromkeys(keys, coded), **{value: pa.float64() for value in wanted.values}},
                include_columns=[*keys, *wanted.values],
                null_values=[""],
                strings_can_be_null=False,
            ),
        )
    except pa.ArrowInvalid:
        return None


def _codes(column: Any, known: dict[str, int]) -> NDArray[np.integer]:
    """Codes of a column's entries; ``known`` has those met before, and receives the new ones."""
    whole = column.unify_dictionaries().combine_chunks()
    code = np.array([known.setdefault(entry, len(known)) for entry in whole.dictionary.to_pylist()], dtype=np.int32)
    return np.asarray(code[whole.indices.to_numpy()])


def _trimmed(names: list[str], codes: NDArray[np.integer]) -> tuple[list[str], NDArray[np.integer]]:
    """Identifiers without surrounding blanks; those that become equal are one."""
    trimmed = [name.strip() for name in names]
    if trimmed == names:
        return names, codes
    distinct = list(dict.fromkeys(trimmed))
    place = {name: n for n, name in enumerate(distinct)}
    return distinct, np.array([place[name] for name in trimmed], dtype=np.int32)[codes]
