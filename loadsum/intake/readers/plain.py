"""Plain delimited text, read fast: no quotes, decimal points, only numbers; all else goes to the careful reader."""

import importlib
import importlib.util
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.readers.raw import RawReadings

BLOCK_BYTES = 2**23
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
    pa, pacsv = importlib.import_module("pyarrow"), importlib.import_module("pyarrow.csv")
    coded = pa.dictionary(pa.int32(), pa.string())
    keys = [wanted.time] if wanted.who is None else [wanted.time, wanted.who]
    try:
        table = pacsv.read_csv(
            pa.BufferReader(content),
            read_options=pacsv.ReadOptions(block_size=BLOCK_BYTES, column_names=wanted.columns, skip_rows=1),
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
    if table.num_rows == 0:
        return None
    stamps, stamp = _codes(table.column(wanted.time))
    blank = [n for n, text in enumerate(stamps) if not text.strip()]
    if blank:
        return None  # rows without a stamp are for the careful reader to name
    rows = table.num_rows
    count = len(wanted.values)
    value = np.empty(rows * count)
    for n, column in enumerate(wanted.values):
        value[n * rows : (n + 1) * rows] = table.column(column).to_numpy()
    empty = sum(table.column(column).null_count for column in wanted.values)
    table = table.select(keys)  # lets the parsed values go
    with np.errstate(invalid="ignore"):
        if int(np.count_nonzero(np.abs(value) < LARGEST)) != value.size - empty:
            return None
    line = np.arange(2, rows + 2, dtype=np.int32)
    if wanted.who is not None:
        customers, customer = _codes(table.column(wanted.who))
        customers, customer = _trimmed(customers, customer)
    else:
        customers = [wanted.fixed] if wanted.fixed and count == 1 else wanted.values
        customer = np.repeat(np.arange(count, dtype=np.int32), rows)
        stamp, line = np.tile(stamp, count), np.tile(line, count)
    return RawReadings(
        name=name,
        customers=tuple(customers),
        stamps=tuple(stamps),
        customer=customer,
        stamp=stamp,
        value=value,
        kvar=None,
        exported=None,
        flagged=np.broadcast_to(np.zeros(1, bool), value.shape),
        line=line,
        unreadable=(),
        layout=layout,
        choices=tuple(said),
    )


def _codes(column: object) -> tuple[list[str], NDArray[np.integer]]:
    whole = column.unify_dictionaries().combine_chunks()  # type: ignore[attr-defined]  # pyarrow carries no types
    return whole.dictionary.to_pylist(), whole.indices.to_numpy()


def _trimmed(names: list[str], codes: NDArray[np.integer]) -> tuple[list[str], NDArray[np.integer]]:
    """Identifiers without surrounding blanks; those that become equal are one."""
    trimmed = [name.strip() for name in names]
    if trimmed == names:
        return names, codes
    distinct = list(dict.fromkeys(trimmed))
    place = {name: n for n, name in enumerate(distinct)}
    return distinct, np.array([place[name] for name in trimmed], dtype=np.int32)[codes]
