"""Delimited text: one row a reading, one column a customer, or one row a day."""

import csv
import dataclasses
import datetime as dt
import io
import re
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError
from loadsum.study.tables import MeterFiles

DELIMITERS = (",", ";", "\t", "|")
MOST_COLUMNS = 20_000
MADE_STAMPS = "made stamps"
# Words by which a header is guessed, most telling first; what is guessed is said.
TIME_WORDS = ("timestamp", "datetime", "stamp", "time", "read_at", "start", "date")
CUSTOMER_WORDS = ("customer", "meter", "identifier", "account", "premise", "id")
VALUE_WORDS = ("kwh", "kw", "wh", "value", "energy", "power", "demand", "consumption", "reading")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RawReadings:
    """Readings of one file as it gives them.

    Parameters
    ----------
    name : str
        Name by which faults call the file.
    customers, stamps : tuple of str
        Distinct identifiers and distinct stamps.
    customer, stamp : (n,) int64
        Which of them each reading has. [-]
    value : (n,) float64
        Value as written; NaN where the field is empty. [unit of the file]
    kvar : (n,) float64 or None
        Reactive value as written. [unit of the file]
    exported : (n,) float64 or None
        Exported value as written. [unit of the file]
    flagged : (n,) bool
        Readings that the file flags as estimated.
    line : (n,) int64
        Line of the file. [-]
    unreadable : tuple of (line, text)
        Fields that are no number.
    layout : str
        Layout it was read as.
    choices : tuple of str
        What was guessed or mapped.
    """

    name: str
    customers: tuple[str, ...]
    stamps: tuple[str, ...]
    customer: NDArray[np.int64]
    stamp: NDArray[np.int64]
    value: NDArray[np.float64]
    kvar: NDArray[np.float64] | None
    exported: NDArray[np.float64] | None
    flagged: NDArray[np.bool_]
    line: NDArray[np.int64]
    unreadable: tuple[tuple[int, str], ...]
    layout: str
    choices: tuple[str, ...]


def read_delimited(content: bytes, name: str, source: MeterFiles) -> RawReadings:
    """Readings of one delimited text file.

    Raises
    ------
    InputError
        The file is no delimited text, or a column named in the study file is not there.
    """
    text, said = decoded(content, name, source.encoding)
    if source.named_by_file:
        source = dataclasses.replace(source, customer=_called(name))
        said.append(f"customer: {source.customer}, from the name of the file")
    delimiter = source.delimiter or guessed_delimiter(text)
    said.append(f"delimiter {delimiter!r}" + ("" if source.delimiter else ", guessed"))
    frame = table_of(text, name, delimiter, source.header)
    if source.first_stamp:
        frame = _stamped(frame, name, source, said)
        source = dataclasses.replace(source, time_column=MADE_STAMPS)
    columns = [str(column) for column in frame.columns]
    layout = source.layout or ("one column a customer" if source.named_by_file else _guessed_layout(columns))
    said.append(f"layout: {layout}" + ("" if source.layout else ", guessed"))
    time = _column(columns, source.time_column, TIME_WORDS, "time_column", name, said) or columns[0]
    if layout == "one row a reading":
        picked = _long(frame, columns, time, name, source, said)
    elif layout == "one column a customer":
        picked = _wide(frame, columns, time, name, source)
    else:
        picked = _days(frame, columns, time, name, source, said)
    decimal = source.decimal or _guessed_decimal(picked["value"], delimiter)
    if decimal == ",":
        said.append("decimal comma" + ("" if source.decimal else ", guessed"))
    return _raw(picked, name, decimal, source, layout, said)


def decoded(content: bytes, name: str, encoding: str) -> tuple[str, list[str]]:
    marks = ((b"\xef\xbb\xbf", "utf-8-sig"), (b"\xff\xfe", "utf-16"), (b"\xfe\xff", "utf-16"))
    wanted = encoding or next((code for mark, code in marks if content.startswith(mark)), "utf-8")
    try:
        text = content.decode(wanted)
    except (UnicodeDecodeError, LookupError) as error:
        advice = 'state its encoding (for example encoding = "latin-1") under [[readings]]'
        raise InputError(name, [Fault(name, f"cannot be read as {wanted} text: {error}; {advice}")]) from error
    if "\x00" in text:
        raise InputError(name, [Fault(name, "is not text: it holds zero bytes")])
    return text, [f"encoding {wanted}"] if wanted != "utf-8" else []


def guessed_delimiter(text: str) -> str:
    head = text[:4096].splitlines()[:20]
    return max(DELIMITERS, key=lambda mark: min((line.count(mark) for line in head if line), default=0))


def _called(name: str) -> str:
    """Name of a file without its folder and endings."""
    return name.rsplit("/", 1)[-1].split(".", 1)[0]


def _stamped(frame: pd.DataFrame, name: str, source: MeterFiles, said: list[str]) -> pd.DataFrame:
    """A table without stamps, with those that follow from the first one."""
    if source.interval_min == 0:
        raise InputError(name, [Fault("readings.interval_min", "missing; a file without stamps needs it")])
    try:
        first = dt.datetime.fromisoformat(source.first_stamp)
    except ValueError as error:
        raise InputError(
            name, [Fault("readings.first_stamp", f"must be an ISO 8601 stamp, got {source.first_stamp!r}")]
        ) from error
    said.append(f"no stamps: {source.interval_min} min readings follow one another from {source.first_stamp}")
    step = dt.timedelta(minutes=source.interval_min)
    stamps = pd.Series([(first + n * step).isoformat() for n in range(len(frame))], index=frame.index)
    return frame.assign(**{MADE_STAMPS: stamps})


def table_of(text: str, name: str, delimiter: str, header: bool = True) -> pd.DataFrame:
    if text.split("\n", 1)[0].count(delimiter) > MOST_COLUMNS:
        raise InputError(name, [Fault(f"{name}:1", f"has more than {MOST_COLUMNS} columns; is the delimiter right?")])
    try:
        frame = pd.read_csv(
            io.StringIO(text),
            sep=delimiter,
            dtype=str,
            header="infer" if header else None,
            keep_default_na=False,
            skip_blank_lines=False,
            index_col=False,
            quoting=csv.QUOTE_MINIMAL,
        )
    except (pd.errors.ParserError, pd.errors.EmptyDataError, csv.Error, ValueError) as error:
        raise InputError(name, [Fault(name, f"is not delimited text: {str(error).strip()}")]) from error
    frame.columns = [str(column).strip() if header else str(n) for n, column in enumerate(frame.columns, start=1)]
    if not header:
        frame.index = frame.index - 1  # row -1 is the first line, as row 0 is the second where there is a header
    if frame.empty or frame.shape[1] < 2:
        raise InputError(
            name, [Fault(name, "holds no table of readings: need a header, a column of stamps and one of values")]
        )
    if frame.columns.duplicated().any():
        twice = frame.columns[frame.columns.duplicated()][0]
        raise InputError(name, [Fault(f"{name}:1", f"two columns are called {twice!r}")])
    return frame


def _guessed_layout(columns: list[str]) -> str:
    named = [matching_column([column], CUSTOMER_WORDS) is not None for column in columns]
    valued = [matching_column([column], VALUE_WORDS) is not None for column in columns]
    clocks = sum(bool(re.fullmatch(r"\d{1,2}:\d\d(:\d\d)?", column)) for column in columns)
    if clocks >= 24:
        return "one row a day"
    return "one row a reading" if len(columns) <= 6 and any(named) and any(valued) else "one column a customer"


def matching_column(columns: list[str], words: tuple[str, ...]) -> str | None:
    for word in words:
        for column in columns:
            if re.search(rf"(^|[^a-z]){word}([^a-z]|$)", column.lower()):
                return column
    return None


def _column(
    columns: list[str], wanted: str, words: tuple[str, ...], key: str, name: str, said: list[str]
) -> str | None:
    """The column that the study file names, or a guess, which is said."""
    if wanted:
        if wanted not in columns:
            known = ", ".join(columns[:12])
            raise InputError(name, [Fault(f"readings.{key}", f"{name} has no column {wanted!r}; it has: {known}")])
        return wanted
    found = matching_column(columns, words)
    if found is not None:
        said.append(f"{key}: {found}, guessed")
    return found


def _long(
    frame: pd.DataFrame, columns: list[str], time: str, name: str, source: MeterFiles, said: list[str]
) -> dict[str, pd.Series]:
    rest = [column for column in columns if column != time]
    who = _column(rest, source.customer_column, CUSTOMER_WORDS, "customer_column", name, said)
    rest = [column for column in rest if column != who]
    value = _column(rest, source.value_column, VALUE_WORDS, "value_column", name, said) or (rest[0] if rest else None)
    if value is None:
        raise InputError(name, [Fault("readings.value_column", f"{name} has no column left for the reading")])
    if who is None and not source.customer:
        advice = "name its column, or the customer of the file under readings.customer"
        raise InputError(
            name, [Fault("readings.customer_column", f"no column of {name} holds an identifier; {advice}")]
        )
    picked = {
        "customer": frame[who] if who is not None else pd.Series(source.customer, index=frame.index),
        "stamp": frame[time],
        "value": frame[value],
        "line": pd.Series(frame.index + 2, index=frame.index),
    }
    for key in ("kvar_column", "export_column", "flag_column"):
        column = getattr(source, key)
        if column:
            picked[key] = frame[_column(columns, column, (), key, name, said) or column]
    return picked


def _wide(frame: pd.DataFrame, columns: list[str], time: str, name: str, source: MeterFiles) -> dict[str, pd.Series]:
    rest = [column for column in columns if column != time]
    if source.value_column:
        if source.value_column not in rest:
            raise InputError(name, [Fault("readings.value_column", f"{name} has no column {source.value_column!r}")])
        rest = [source.value_column]
    count = len(frame)
    who = [source.customer] if source.customer and len(rest) == 1 else rest
    return {
        "customer": pd.Series(np.repeat(np.array(who, dtype=object), count)),
        "stamp": pd.Series(np.tile(frame[time].to_numpy(dtype=object), len(rest))),
        "value": pd.Series(np.concatenate([frame[column].to_numpy(dtype=object) for column in rest])),
        "line": pd.Series(np.tile(frame.index.to_numpy() + 2, len(rest))),
    }


def _days(
    frame: pd.DataFrame, columns: list[str], time: str, name: str, source: MeterFiles, said: list[str]
) -> dict[str, pd.Series]:
    """One row a day: a date, perhaps an identifier, and 24, 48, 96 or 288 readings in order of time."""
    rest = [column for column in columns if column != time]
    who = _column(rest, source.customer_column, CUSTOMER_WORDS, "customer_column", name, said)
    clocks = [column for column in rest if re.fullmatch(r"\d{1,2}:\d\d(:\d\d)?", column)]
    slots = clocks or [column for column in rest if re.fullmatch(r"[A-Za-z_ ]*\d+", column) and column != who]
    if len(slots) not in (24, 48, 96, 288):
        raise InputError(
            name, [Fault(f"{name}:1", f"a row a day needs 24, 48, 96 or 288 readings, found {len(slots)}")]
        )
    if who is None and not source.customer:
        raise InputError(name, [Fault("readings.customer_column", f"no column of {name} holds an identifier")])
    minutes = 1440 // len(slots)
    count = len(frame)
    parts = []
    for n in range(len(slots)):
        past = n + 1 if source.stamp == "end" else n
        day_later, minute = divmod(past * minutes, 1440)
        dates = pd.to_datetime(frame[time], format=source.time_format or "ISO8601", errors="coerce")
        moved = (dates + pd.Timedelta(days=day_later)).dt.strftime("%Y-%m-%d").fillna("unreadable")
        parts.append((moved + f"T{minute // 60:02d}:{minute % 60:02d}").to_numpy(dtype=object))
    owner = frame[who].to_numpy(dtype=object) if who is not None else np.full(count, source.customer, dtype=object)
    return {
        "customer": pd.Series(np.tile(owner, len(slots))),
        "stamp": pd.Series(np.concatenate(parts)),
        "value": pd.Series(np.concatenate([frame[column].to_numpy(dtype=object) for column in slots])),
        "line": pd.Series(np.tile(frame.index.to_numpy() + 2, len(slots))),
    }


def _guessed_decimal(values: pd.Series, delimiter: str) -> str:
    head = values[values != ""].head(500)
    comma = head.str.fullmatch(r"-?\d+,\d+").mean() if len(head) else 0.0
    return "," if comma > 0.5 and delimiter != "," else "."


def _numbers(texts: pd.Series, decimal: str) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
    """Numbers, NaN where empty, and which fields are neither empty nor a finite number."""
    trimmed = texts.str.strip()
    plain = trimmed.str.replace(".", "", regex=False).str.replace(",", ".", regex=False) if decimal == "," else trimmed
    numbers = pd.to_numeric(plain, errors="coerce").to_numpy(dtype=np.float64, copy=True)
    empty = (trimmed == "").to_numpy()
    bad = ~empty & ~(np.isfinite(numbers) & (np.abs(numbers) < 1e12))
    numbers[bad] = np.nan
    return numbers, bad


def _raw(
    picked: dict[str, pd.Series], name: str, decimal: str, source: MeterFiles, layout: str, said: list[str]
) -> RawReadings:
    filled = (picked["stamp"].str.strip() != "") | (picked["value"].str.strip() != "")
    picked = {key: part[filled].reset_index(drop=True) for key, part in picked.items()}
    customer, customers = pd.factorize(picked["customer"].str.strip())
    stamp, stamps = pd.factorize(picked["stamp"])
    value, bad = _numbers(picked["value"], decimal)
    lines = picked["line"].to_numpy(dtype=np.int64)
    reactive = _numbers(picked["kvar_column"], decimal)[0] if "kvar_column" in picked else None
    exported = _numbers(picked["export_column"], decimal)[0] if "export_column" in picked else None
    flags = picked.get("flag_column")
    flagged = np.zeros(value.size, bool) if flags is None else flags.str.strip().isin(source.estimated_flags).to_numpy()
    return RawReadings(
        name=name,
        customers=tuple(str(c) for c in customers),
        stamps=tuple(str(s) for s in stamps),
        customer=customer.astype(np.int64),
        stamp=stamp.astype(np.int64),
        value=value,
        kvar=reactive,
        exported=exported,
        flagged=flagged,
        line=lines,
        unreadable=tuple((int(lines[i]), str(picked["value"][i])[:40]) for i in np.flatnonzero(bad)),
        layout=layout,
        choices=tuple(said),
    )
