"""Delimited text: one row a reading, one column a customer, or one row a day."""

import csv
import io
import re
from pathlib import PurePath

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from loadsum.errors import Fault, InputError
from loadsum.intake.readers.columns import CUSTOMER_WORDS, TIME_WORDS, VALUE_WORDS, column_named, guessed_layout
from loadsum.intake.readers.plain import Wanted, read_plain
from loadsum.intake.readers.raw import RawReadings
from loadsum.study.tables import MeterFiles

DELIMITERS = (",", ";", "\t", "|")
MOST_COLUMNS = 20_000
HEAD_BYTES = 2**16


def read_delimited(content: bytes, name: str, source: MeterFiles) -> RawReadings:
    """Readings of one delimited text file.

    Raises
    ------
    InputError
        The file is no delimited text, or a column named in the study file is not there.
    """
    quick = _quickly(content, name, source)
    if quick is not None:
        return quick
    text, said = decoded(content, name, source.encoding)
    delimiter = source.delimiter or guessed_delimiter(text)
    said.append(_delimiter_said(delimiter, source))
    frame = table_of(text, name, delimiter, source)
    return read_table(frame, name, source, said, delimiter)


def read_table(frame: pd.DataFrame, name: str, source: MeterFiles, said: list[str], delimiter: str = "") -> RawReadings:
    """Readings of a table whose cells are all text.

    Parameters
    ----------
    frame : DataFrame of str
        The table; row 0 stands on line 2, or on line 1 where the table has no header.
    name : str
        Name by which faults call the file.
    source : MeterFiles
        What the study file says about the file.
    said : list of str
        Receives the choices made.
    delimiter : str
        Field separator, by which a decimal comma is told apart.
    """
    frame = _with_whole_stamps(frame, name, source, said)
    columns = [str(column) for column in frame.columns]
    layout = _layout(columns, source, said)
    first_line = 1 if source.header == "no" else 2
    time = "" if source.first_stamp else _time_column(columns, name, source, said)
    if layout == "one row a reading":
        picked = _long(frame, columns, time, name, source, said)
    elif layout == "one column a customer":
        picked = _wide(frame, columns, time, name, source)
    else:
        picked = _days(frame, columns, time, name, source, said)
    picked["line"] += first_line
    decimal = source.decimal or _guessed_decimal(picked["value"], delimiter)
    if decimal == ",":
        said.append("decimal comma" + ("" if source.decimal else ", guessed"))
    return _raw(picked, name, decimal, source, layout, said)


def _with_whole_stamps(frame: pd.DataFrame, name: str, source: MeterFiles, said: list[str]) -> pd.DataFrame:
    """A table whose dates carry the time of day that stood in a column of its own."""
    clock = source.time_of_day_column
    if not clock:
        return frame
    columns = [str(column) for column in frame.columns]
    column_named(columns, clock, (), "time_of_day_column", name, said)
    date = _time_column([column for column in columns if column != clock], name, source, said)
    whole = frame[date].str.strip() + " " + frame[clock].str.strip()
    said.append(f"stamps are {date} and {clock} together")
    return frame.assign(**{date: whole.str.strip()}).drop(columns=clock)


def customer_of_file(name: str, source: MeterFiles) -> str:
    """Customer of a file that holds one customer: stated, or the file's own name."""
    return PurePath(name).name.split(".")[0] if source.customer == "file name" else source.customer


def _quickly(content: bytes, name: str, source: MeterFiles) -> RawReadings | None:
    """Readings of a plain file by the fast reader; None where the file is not plain, or the reader not installed."""
    head = content[:HEAD_BYTES]
    if (
        source.time_of_day_column
        or source.encoding
        or source.header == "no"
        or source.decimal == ","
        or source.first_stamp
        or b"\n" not in head
    ):
        return None
    try:
        text = head[: head.rindex(b"\n")].decode("ascii")
    except UnicodeDecodeError:
        return None
    delimiter = source.delimiter or guessed_delimiter(text)
    columns = [column.strip() for column in next(csv.reader([text.split("\n", 1)[0]], delimiter=delimiter), [])]
    if "" in columns or len(set(columns)) != len(columns) or not 2 <= len(columns) <= MOST_COLUMNS:
        return None
    said = [_delimiter_said(delimiter, source)]
    layout = _layout(columns, source, said)
    if layout == "one row a day" or source.kvar_column or source.export_column or source.flag_column:
        return None
    time = _time_column(columns, name, source, said)
    if layout == "one row a reading":
        who, value = _long_columns(columns, time, name, source, said)
        values = [value]
    else:
        who, values = None, _wide_columns(columns, time, name, source)
    fixed = customer_of_file(name, source) if len(values) == 1 else ""
    if layout == "one row a reading" and who is None and not fixed:
        return None
    wanted = Wanted(columns=columns, time=time, who=who, values=values, fixed=fixed, delimiter=delimiter)
    return read_plain(content, name, wanted, layout, said)


def _delimiter_said(delimiter: str, source: MeterFiles) -> str:
    return f"delimiter {delimiter!r}" + ("" if source.delimiter else ", guessed")


def _layout(columns: list[str], source: MeterFiles, said: list[str]) -> str:
    layout = source.layout or guessed_layout(columns)
    said.append(f"layout: {layout}" + ("" if source.layout else ", guessed"))
    return layout


def _time_column(columns: list[str], name: str, source: MeterFiles, said: list[str]) -> str:
    return column_named(columns, source.time_column, TIME_WORDS, "time_column", name, said) or columns[0]


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


def table_of(text: str, name: str, delimiter: str, source: MeterFiles) -> pd.DataFrame:
    header = text.split("\n", 1)[0]
    if header.count(delimiter) > MOST_COLUMNS:
        raise InputError(name, [Fault(f"{name}:1", f"has more than {MOST_COLUMNS} columns; is the delimiter right?")])
    try:
        frame = pd.read_csv(
            io.StringIO(text),
            sep=delimiter,
            dtype=str,
            header=None,
            keep_default_na=False,
            skip_blank_lines=False,
            quoting=csv.QUOTE_MINIMAL,
        )
    except (pd.errors.ParserError, pd.errors.EmptyDataError, csv.Error, ValueError) as error:
        raise InputError(name, [_unparsed(name, str(error).strip())]) from error
    if source.header == "no":
        frame.columns = [f"column {n + 1}" for n in range(frame.shape[1])]
    else:
        names = [str(column).strip() for column in frame.iloc[0].fillna("")]
        frame = frame.iloc[1:].reset_index(drop=True)
        frame.columns = names
    frame = _without_empty_end(frame.fillna(""))  # fields that a short row lacks are empty
    if frame.empty or (frame.shape[1] < 2 and not source.first_stamp):
        raise InputError(
            name, [Fault(name, "holds no table of readings: need a header, a column of stamps and one of values")]
        )
    if frame.columns.duplicated().any():
        twice = frame.columns[frame.columns.duplicated()][0]
        raise InputError(name, [Fault(f"{name}:1", f"two columns are called {twice!r}")])
    return frame


def _unparsed(name: str, error: str) -> Fault:
    """Why a text is no table, with its line where that is told."""
    told = re.search(r"Expected (\d+) fields in line (\d+), saw (\d+)", error)
    if told is None:
        return Fault(name, f"is not delimited text: {error}")
    return Fault(
        f"{name}:{told[2]}",
        f"has {told[3]} fields where the lines before have {told[1]}; if the file begins with title lines, remove "
        "them, and check the delimiter",
    )


def _without_empty_end(frame: pd.DataFrame) -> pd.DataFrame:
    """A table without the columns at its end that have neither a name nor an entry."""
    count = frame.shape[1]
    while count > 1 and frame.columns[count - 1] == "" and not frame.iloc[:, count - 1].str.strip().any():
        count -= 1
    return frame.iloc[:, :count]


def _long_columns(
    columns: list[str], time: str, name: str, source: MeterFiles, said: list[str]
) -> tuple[str | None, str]:
    rest = [column for column in columns if column != time]
    who = column_named(rest, source.customer_column, CUSTOMER_WORDS, "customer_column", name, said)
    rest = [column for column in rest if column != who]
    value = column_named(rest, source.value_column, VALUE_WORDS, "value_column", name, said)
    if value is None and not rest:
        raise InputError(name, [Fault("readings.value_column", f"{name} has no column left for the reading")])
    return who, value or rest[0]


def _wide_columns(columns: list[str], time: str, name: str, source: MeterFiles) -> list[str]:
    rest = [column for column in columns if column != time]
    if source.value_column:
        if source.value_column not in rest:
            raise InputError(name, [Fault("readings.value_column", f"{name} has no column {source.value_column!r}")])
        return [source.value_column]
    return rest


def _long(
    frame: pd.DataFrame, columns: list[str], time: str, name: str, source: MeterFiles, said: list[str]
) -> dict[str, pd.Series]:
    who, value = _long_columns(columns, time, name, source, said)
    fixed = customer_of_file(name, source)
    if who is None and not fixed:
        advice = "name its column, or the customer of the file under readings.customer"
        raise InputError(
            name, [Fault("readings.customer_column", f"no column of {name} holds an identifier; {advice}")]
        )
    picked = {
        "customer": frame[who] if who is not None else pd.Series(fixed, index=frame.index),
        "stamp": frame[time] if time else pd.Series([str(n) for n in range(len(frame))], index=frame.index),
        "value": frame[value],
        "line": pd.Series(np.arange(len(frame)), index=frame.index),
    }
    for key in ("kvar_column", "export_column", "flag_column"):
        column = getattr(source, key)
        if column:
            picked[key] = frame[column_named(columns, column, (), key, name, said) or column]
    return picked


def _wide(frame: pd.DataFrame, columns: list[str], time: str, name: str, source: MeterFiles) -> dict[str, pd.Series]:
    rest = _wide_columns(columns, time, name, source)
    count = len(frame)
    fixed = customer_of_file(name, source)
    who = [fixed] if fixed and len(rest) == 1 else rest
    stamps = frame[time].to_numpy(dtype=object) if time else np.array([str(n) for n in range(count)], dtype=object)
    picked = {
        "customer": pd.Series(np.repeat(np.array(who, dtype=object), count)),
        "stamp": pd.Series(np.tile(stamps, len(rest))),
        "value": pd.Series(np.concatenate([frame[column].to_numpy(dtype=object) for column in rest])),
        "line": pd.Series(np.tile(np.arange(count), len(rest))),
    }
    for key in ("kvar_column", "export_column", "flag_column"):
        column = getattr(source, key)
        if column and len(rest) == 1:
            if column not in columns:
                raise InputError(name, [Fault(f"readings.{key}", f"{name} has no column {column!r}")])
            picked[key] = frame[column].reset_index(drop=True)
        elif column:
            raise InputError(
                name, [Fault(f"readings.{key}", f"{name} has a column a customer; {key} needs value_column beside it")]
            )
    return picked


def _days(
    frame: pd.DataFrame, columns: list[str], time: str, name: str, source: MeterFiles, said: list[str]
) -> dict[str, pd.Series]:
    """One row a day: a date, perhaps an identifier, and 24, 48, 96 or 288 readings in order of time."""
    rest = [column for column in columns if column != time]
    who = column_named(rest, source.customer_column, CUSTOMER_WORDS, "customer_column", name, said)
    clocks = [column for column in rest if re.fullmatch(r"\d{1,2}:\d\d(:\d\d)?", column)]
    slots = clocks or [column for column in rest if re.fullmatch(r"[A-Za-z_ ]*\d+", column) and column != who]
    if len(slots) not in (24, 48, 96, 288):
        raise InputError(
            name, [Fault(f"{name}:1", f"a row a day needs 24, 48, 96 or 288 readings, found {len(slots)}")]
        )
    fixed = customer_of_file(name, source)
    if who is None and not fixed:
        raise InputError(name, [Fault("readings.customer_column", f"no column of {name} holds an identifier")])
    minutes = 1440 // len(slots)
    count = len(frame)
    parts = []
    form = source.time_format or ("%Y%m%d" if frame[time].str.fullmatch(r"\d{8}").all() else "ISO8601")
    dates = pd.to_datetime(frame[time], format=form, errors="coerce")
    for n in range(len(slots)):
        past = n + 1 if source.stamp == "end" else n
        day_later, minute = divmod(past * minutes, 1440)
        moved = (dates + pd.Timedelta(days=day_later)).dt.strftime("%Y-%m-%d").fillna("unreadable")
        parts.append((moved + f"T{minute // 60:02d}:{minute % 60:02d}").to_numpy(dtype=object))
    owner = frame[who].to_numpy(dtype=object) if who is not None else np.full(count, fixed, dtype=object)
    return {
        "customer": pd.Series(np.tile(owner, len(slots))),
        "stamp": pd.Series(np.concatenate(parts)),
        "value": pd.Series(np.concatenate([frame[column].to_numpy(dtype=object) for column in slots])),
        "line": pd.Series(np.tile(np.arange(count), len(slots))),
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
    stamp: NDArray[np.integer]
    stamp, stamps = pd.factorize(picked["stamp"])
    if source.first_stamp:
        stamp, stamps = picked["stamp"].astype(np.int64).to_numpy(), pd.Index([])
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
        unreadable=tuple((int(i), str(picked["value"][i])[:40]) for i in np.flatnonzero(bad)),
        layout=layout,
        choices=tuple(said),
    )
