"""Parquet tables, a file or a partitioned folder, read a row group at a time, needed columns only."""

import importlib
import importlib.util
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError, MissingExtraError
from loadsum.intake.readers.columns import CUSTOMER_WORDS, TIME_WORDS, VALUE_WORDS, column_named, guessed_layout
from loadsum.intake.readers.delimited import customer_of_file
from loadsum.intake.readers.raw import RawReadings
from loadsum.study.tables import MeterFiles

LARGEST = 1e12


def read_parquet(path: Path, name: str, source: MeterFiles) -> Iterator[RawReadings]:
    """Readings of one Parquet file, a row group at a time.

    Stamps may be text or timestamps; a timestamp with a time zone is an instant. The partition key of a folder such as
    ``customer=007`` counts as a column.

    Raises
    ------
    MissingExtraError
        pyarrow is not installed.
    InputError
        The file is no Parquet, or a column named in the study file is not there.
    """
    if importlib.util.find_spec("pyarrow") is None:
        raise MissingExtraError(f"reading {name}", "parquet")
    pa, pq = importlib.import_module("pyarrow"), importlib.import_module("pyarrow.parquet")
    try:
        file = pq.ParquetFile(path)
        keys = dict(part.split("=", 1) for part in path.parts[:-1] if part.count("=") == 1)
        columns = [*file.schema_arrow.names, *(key for key in keys if key not in file.schema_arrow.names)]
        said: list[str] = []
        layout = source.layout or guessed_layout(columns)
        said.append(f"layout: {layout}" + ("" if source.layout else ", guessed"))
        time = column_named(columns, source.time_column, TIME_WORDS, "time_column", name, said) or columns[0]
        rest = [column for column in columns if column != time]
        who = None
        if layout == "one row a reading":
            who = column_named(rest, source.customer_column, CUSTOMER_WORDS, "customer_column", name, said)
            rest = [column for column in rest if column != who]
            value = column_named(rest, source.value_column, VALUE_WORDS, "value_column", name, said)
            rest = [value] if value else rest[:1]
        elif source.value_column:
            rest = [source.value_column]
        if (
            layout == "one row a day"
            or not rest
            or any(column not in file.schema_arrow.names for column in [time, *rest])
        ):
            raise InputError(
                name, [Fault(name, "needs a column of stamps and one of values; name them under [[readings]]")]
            )
        wanted = [time, *rest, *([who] if who in file.schema_arrow.names else [])]
        extra = [c for c in (source.kvar_column, source.export_column, source.flag_column) if c]
        coded = [
            c
            for c in (time, who)
            if c in file.schema_arrow.names and pa.types.is_string(file.schema_arrow.field(c).type)
        ]
        file = pq.ParquetFile(path, read_dictionary=coded)  # stamps and identifiers stay codes, as they are stored
        first = 1
        for group in range(file.num_row_groups):
            table = file.read_row_group(group, columns=[*wanted, *extra])
            if table.num_rows:
                yield _raw(pa, table, name, source, time, who, rest, keys, first, layout, said)
            first += table.num_rows
    except (pa.ArrowInvalid, pa.ArrowKeyError, OSError) as error:
        raise InputError(name, [Fault(name, f"cannot be read as Parquet: {str(error)[:100]}")]) from error


def _raw(
    pa: Any,
    table: Any,
    name: str,
    source: MeterFiles,
    time: str,
    who: str | None,
    values: list[str],
    keys: dict[str, str],
    first: int,
    layout: str,
    said: list[str],
) -> RawReadings:
    rows, count = table.num_rows, len(values)
    stamps, stamp = _codes(pa, table.column(time))
    value = np.concatenate([_numbers(pa, table.column(column), name, column) for column in values])
    line = np.arange(first, first + rows, dtype=np.int64)
    if who is not None and who in table.column_names:
        customers, customer = _codes(pa, table.column(who))
    elif who is not None:
        customers, customer = [keys[who]], np.zeros(rows, dtype=np.int32)
    else:
        fixed = customer_of_file(name, source) if count == 1 else ""
        customers = [fixed] if fixed else values
        customer = np.repeat(np.arange(count, dtype=np.int32), rows)
        stamp, line = np.tile(stamp, count), np.tile(line, count)
    with np.errstate(invalid="ignore"):
        bad = np.flatnonzero(np.abs(value) >= LARGEST)
    value[bad] = np.nan

    def more(column: str) -> NDArray[np.float64] | None:
        return _numbers(pa, table.column(column), name, column) if column and count == 1 else None

    flagged = np.zeros(value.size, bool)
    if source.flag_column and count == 1:
        marks = table.column(source.flag_column).to_pylist()
        flagged = np.array([str(mark) in source.estimated_flags for mark in marks], bool)
    return RawReadings(
        name=name,
        customers=tuple(str(c).strip() for c in customers),
        stamps=tuple(stamps),
        customer=customer,
        stamp=stamp,
        value=value,
        kvar=more(source.kvar_column),
        exported=more(source.export_column),
        flagged=flagged,
        line=line,
        unreadable=tuple((int(n), "inf or too large") for n in bad),
        layout=layout,
        choices=tuple(said),
    )


def _numbers(pa: Any, column: Any, name: str, header: str) -> NDArray[np.float64]:
    try:
        return np.array(column.cast(pa.float64()).to_numpy(), dtype=np.float64)
    except (pa.ArrowInvalid, pa.ArrowNotImplementedError) as error:
        raise InputError(name, [Fault(name, f"column {header!r} holds no numbers: {str(error)[:80]}")]) from error


def _codes(pa: Any, column: Any) -> tuple[list[str], NDArray[np.int32]]:
    """Distinct entries as text, and which of them each row has."""
    coded = column if pa.types.is_dictionary(column.type) else column.dictionary_encode()
    whole = coded.unify_dictionaries().combine_chunks()
    kind = whole.dictionary.type
    entries = whole.dictionary.to_pylist()
    if pa.types.is_timestamp(kind):
        naive = whole.dictionary.cast(pa.timestamp("s", tz=kind.tz), safe=False).cast(pa.int64()).to_numpy()
        texts = np.datetime_as_string(naive.astype("datetime64[s]"))
        entries = [f"{text}+00:00" if kind.tz else str(text) for text in texts]
    codes = np.asarray(whole.indices.fill_null(len(entries)).to_numpy(), dtype=np.int32)
    texts = ["" if entry is None else str(entry) for entry in entries]
    return [*texts, ""] if (codes == len(entries)).any() else texts, codes
