"""A look at meter files nobody has described yet: what can be told from them, and what cannot."""

import dataclasses
import datetime as dt
import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from loadsum.errors import InputError
from loadsum.intake.inputs import unpacked
from loadsum.intake.readers.columns import TIME_WORDS, matching_header
from loadsum.intake.readers.delimited import decoded, guessed_delimiter, read_delimited, table_of
from loadsum.intake.readers.raw import RawReadings
from loadsum.study.tables import MeterFiles

# Forms of stamps that are tried in turn where they are not ISO 8601, strptime notation.
DATES = ("%d/%m/%Y", "%m/%d/%Y", "%d.%m.%Y", "%d-%m-%Y", "%Y/%m/%d", "%Y%m%d")
TIMES = ("%H:%M", "%H:%M:%S", "%I:%M %p", "%I:%M:%S %p")
FORMS = (*(f"{date} {time}" for date in DATES for time in TIMES), "%Y%m%d%H%M")
TEMPERATURE = re.compile(r"temp|outdoor|ambient|drybulb|degc|°c|_c$|_f$", re.IGNORECASE)
UNITS = (("mwh", "energy", "MWh"), ("kwh", "energy", "kWh"), ("wh", "energy", "Wh"), ("mw", "power", "MW"),
         ("kw", "power", "kW"))  # fmt: skip


# What is said of a file that nobody has described: nothing.
_UNDESCRIBED = MeterFiles(files="", unit="kWh", stamp="start")


@dataclass(frozen=True, slots=True, kw_only=True)
class Look:
    """What a look at one file told.

    Parameters
    ----------
    name : str
        Path relative to the folder.
    kind : str
        "readings", "temperature" or "not understood".
    keys : tuple of (key, TOML value, why)
        What goes into the study file, with what it was told by.
    questions : tuple of (key, TOML value, what to ask)
        What only the user knows, with a value that is likely.
    customers : tuple of str
        Identifiers found.
    remarks : tuple of str
        Span, interval, and what was odd.
    interval_min : int
        Interval; 0 where it cannot be told. [min]
    """

    name: str
    kind: str
    keys: tuple[tuple[str, str, str], ...] = ()
    questions: tuple[tuple[str, str, str], ...] = ()
    customers: tuple[str, ...] = ()
    remarks: tuple[str, ...] = ()
    interval_min: int = 0


def look_at(path: Path, folder: Path) -> Look:
    """What can be told about one file; a file that cannot be read says why."""
    name = path.relative_to(folder).as_posix()
    try:
        content = next(iter(unpacked(path)))[1]
    except InputError as error:
        return Look(name=name, kind="not understood", remarks=(error.faults[0].message,))
    other = _other_format(path, content)
    if other:
        return Look(
            name=name,
            kind="readings",
            keys=(("format", f'"{other}"', "told by its first bytes or its ending"),),
            questions=(_ask_unit(("", "", "")), _ask_stamp("start", "nothing tells")),
        )
    try:
        return _delimited(name, content)
    except InputError as error:
        return Look(name=name, kind="not understood", remarks=(error.faults[0].message,))


def _other_format(path: Path, content: bytes) -> str:
    """Format of a file that is not delimited text; empty where it is."""
    if content.startswith(b"PAR1"):
        return "parquet"
    if path.suffix.lower() == ".xlsx":
        return "workbook"
    if content.lstrip().startswith(b"100,NEM12"):
        return "nem12"
    return "espi" if b"espi" in content[:4096].lower() and content.lstrip().startswith(b"<") else ""


def _delimited(name: str, content: bytes) -> Look:
    text, _ = decoded(content, name, "")
    delimiter = guessed_delimiter(text)
    frame = table_of(text, name, delimiter, _UNDESCRIBED)
    columns = [str(column) for column in frame.columns]
    if all(re.fullmatch(r"-?[\d.,]+|", column) for column in columns):
        return _bare(name, len(columns), len(frame) + 1)
    time = _time_column(frame)
    rest = [column for column in columns if column != time]
    if len(rest) <= 2 and any(TEMPERATURE.search(column) for column in rest) and time:
        return _temperature(name, time, rest)
    if not time:
        return _stampless(name, rest, len(frame))
    form, sure = _form(frame[time])
    who, flag = _text_columns(frame, rest)
    # Unit and stamp must be given to the reader; a look does not use them.
    source = MeterFiles(
        files=name,
        unit="kWh",
        stamp="start",
        time_column=time,
        time_format=form,
        customer_column=who,
        layout="one row a reading" if who else "",
    )
    raw = read_delimited(content, name, source)
    keys = [("customer_column", f'"{who}"', "told by its entries")] if who else []
    look = _timed(name, raw, time, form, sure, rest, delimiter, keys)
    if not flag:
        return look
    marks = ", ".join(sorted(frame[flag].unique())[:6])
    asked = ("flag_column", f'"{flag}"', f"it holds {marks}; name those that mean estimated under estimated_flags")
    return dataclasses.replace(look, questions=(*look.questions, asked))


def _text_columns(frame: pd.DataFrame, rest: list[str]) -> tuple[str, str]:
    """Columns of a narrow table that hold identifiers and flags, told by their entries; empty where there is none."""
    who = flag = ""
    if len(rest) > 5:
        return who, flag
    for column in rest:
        entries = frame[column].str.strip()
        distinct = entries.nunique()
        words = entries.str.contains(r"[A-Za-z]", regex=True).mean() > 0.9
        if words and entries.str.len().max() <= 2:
            flag = flag or column
        elif words and distinct < 0.1 * len(entries):
            who = who or column
    return who, flag


def _time_column(frame: pd.DataFrame) -> str:
    """Column whose entries are stamps with a time of day; empty where there is none."""
    columns = [str(column) for column in frame.columns]
    named = matching_header(columns, TIME_WORDS)
    for column in dict.fromkeys([*([named] if named else []), *columns]):
        head = frame[column].head(200)
        looks = head.str.contains(r"\d[T :]|^\d{12}$", regex=True).mean() > 0.9
        dates = head.str.fullmatch(r"\d{4}-\d\d-\d\d|\d{1,2}[/.]\d{1,2}[/.]\d{4}").mean() > 0.9
        if looks or (dates and len(columns) >= 24):
            return column
    return ""


def _form(stamps: pd.Series) -> tuple[str, bool]:
    """Form of stamps in strptime notation, empty for ISO 8601, and whether no other form fits."""
    head = stamps.drop_duplicates().str.strip()
    if pd.to_datetime(head, format="ISO8601", errors="coerce", utc=True).notna().mean() > 0.99:
        return "", True
    fitting = []
    for form in FORMS:
        parsed = pd.to_datetime(head, format=form, errors="coerce")
        if parsed.notna().mean() > 0.99:
            steps = np.diff(parsed.dropna().sort_values().to_numpy().astype("datetime64[s]").astype(np.int64))
            regular = (
                float(np.bincount(np.unique(steps, return_inverse=True)[1]).max() / steps.size) if steps.size else 0
            )
            fitting.append((regular, form))
    if not fitting:
        return "", False
    best = max(fitting, key=lambda pair: pair[0])
    return best[1], sum(regular > best[0] - 0.02 for regular, _ in fitting) == 1


def _timed(
    name: str,
    raw: RawReadings,
    time: str,
    form: str,
    sure: bool,
    rest: list[str],
    delimiter: str,
    found: list[tuple[str, str, str]],
) -> Look:
    """What the readings of one table with stamps tell."""
    how = "told by the columns"
    keys = [("layout", f'"{raw.layout}"', how), ("time_column", f'"{time}"', "told by its entries"), *found]
    if delimiter != ",":
        keys.append(("delimiter", '"\\t"' if delimiter == "\t" else f'"{delimiter}"', "told by the first lines"))
    if form:
        keys.append(("time_format", f'"{form}"', "told by the stamps" if sure else "LIKELY; another order fits too"))
    for choice in raw.choices:
        if match := re.fullmatch(r"(customer_column|value_column): (.*), guessed", choice):
            keys.append((match[1], f'"{match[2]}"', "told by the header"))
        if choice.startswith("decimal comma"):
            keys.append(("decimal", '","', "told by the readings"))
    unit = _unit(rest)
    if unit[2]:
        keys += [("quantity", f'"{unit[0]}"', f"the header says {unit[2]}"), ("unit", f'"{unit[1]}"', "so does it")]
    offset = bool(re.search(r"(Z|[+-]\d\d:?\d\d)$", raw.stamps[0].strip()))
    local = _instants(raw.stamps, form)
    minutes = _interval(local)
    remarks = [
        f"{len(raw.customers)} customer(s), {raw.value.size} readings, {_day(local.min())} to {_day(local.max())}",
        f"interval {minutes} min" if minutes else "interval not told",
        "stamps carry their own offset" if offset else _clock(raw, local, minutes),
    ]
    likely, why = _stamp(local, minutes)
    questions = [_ask_stamp(likely, why)]
    if not unit[2]:
        questions.append(_ask_unit(unit))
    if not offset:
        questions.append(("clock", '"local"', f'"local", "utc" or "standard"? {remarks[2]}'))
    return Look(
        name=name,
        kind="readings",
        keys=tuple(keys),
        questions=tuple(questions),
        customers=raw.customers,
        remarks=tuple(remarks),
        interval_min=minutes,
    )


def _instants(stamps: tuple[str, ...], form: str) -> NDArray[np.int64]:
    """Distinct stamps as the clock of the file shows them, in order, without their offset. [s]"""
    plain = pd.Series(stamps).str.strip()
    bare = plain.str.replace(r"(Z|[+-]\d\d:?\d\d)$", "", regex=True) if not form else plain
    parsed = pd.to_datetime(bare, format=form or "ISO8601", errors="coerce").dropna()
    return np.unique(parsed.to_numpy().astype("datetime64[s]").astype(np.int64))


def _interval(local: NDArray[np.int64]) -> int:
    """Commonest step between stamps. [min]"""
    if local.size < 2:
        return 0
    steps, count = np.unique(np.diff(local), return_counts=True)
    return int(steps[np.argmax(count)]) // 60


def _stamp(local: NDArray[np.int64], minutes: int) -> tuple[str, str]:
    """Whether stamps likely mark the start or the end of their interval, and why."""
    if local.size and local[0] % 86400 == minutes * 60 and local[-1] % 86400 == 0:
        return "end", "the file begins one interval after midnight and ends at midnight"
    if local.size and local[0] % 86400 == 0 and (local[-1] + minutes * 60) % 86400 == 0:
        return "start", "the file begins at midnight and ends one interval before midnight"
    return "start", "nothing tells: ask whoever exported the file"


def _clock(raw: RawReadings, local: NDArray[np.int64], minutes: int) -> str:
    """What the stamps tell about daylight saving."""
    first = int(raw.customer[0])
    of_one = raw.stamp[raw.customer == first]
    repeated = of_one.size - np.unique(of_one).size
    span = int(local.max() - local.min()) // 60 // max(minutes, 1) + 1
    missing = span - local.size
    if span * minutes < 240 * 1440:
        return "the record is too short to tell how the clock changes"
    per_hour = 60 // max(minutes, 1)
    if repeated == per_hour and missing:
        return "an hour is repeated and another skipped: local time with daylight saving"
    if repeated == 0 and missing == 0:
        return "no hour is repeated or skipped: standard time, UTC, or a place without daylight saving"
    if repeated == 0 and missing == per_hour:
        return "an hour is skipped and none repeated: local time whose repeated hour was lost or added up"
    return f"{repeated} stamp(s) repeated, {missing} missing: how the clock changes cannot be told"


def _bare(name: str, columns: int, rows: int) -> Look:
    """A table of numbers without header or stamps."""
    return Look(
        name=name,
        kind="readings",
        keys=(("header", '"no"', "the first row holds numbers"), ("layout", '"one column a customer"', "so it seems")),
        questions=(*_ask_first(), _ask_unit(("", "", "")), _ask_stamp("start", "the first stamp is yours to state")),
        customers=tuple(f"column {n}" for n in range(1, columns + 1)),
        remarks=(f"{columns} columns, {rows} rows, neither header nor stamps",),
    )


def _stampless(name: str, columns: list[str], rows: int) -> Look:
    """A table with a header and without stamps: one customer a file."""
    likely = [column for column in columns if re.search(r"kwh|kw|power|energy|demand", column, re.IGNORECASE)]
    value = next((c for c in likely if re.search(r"electric", c, re.IGNORECASE)), likely[0] if likely else "")
    unit = _unit([value])
    keys = [
        ("customer", '"file name"', "no column holds an identifier"),
        ("layout", '"one column a customer"', "so it seems"),
    ]
    return Look(
        name=name,
        kind="readings" if value else "not understood",
        keys=tuple(keys),
        questions=(
            ("value_column", f'"{value}"', f"which column is it? {', '.join(columns[:12])}"),
            *_ask_first(),
            _ask_unit(unit),
            _ask_stamp("start", "the first stamp is yours to state"),
        ),
        customers=(name.rsplit("/", 1)[-1].split(".", 1)[0],),
        remarks=(f"{rows} rows, {len(columns)} columns, no column holds stamps",),
    )


def _temperature(name: str, time: str, rest: list[str]) -> Look:
    column = next(column for column in rest if TEMPERATURE.search(column))
    unit = "F" if re.search(r"_f$|°f|\bf\b|fahrenheit", column, re.IGNORECASE) else "C"
    return Look(
        name=name,
        kind="temperature",
        keys=(
            ("time_column", f'"{time}"', "told by its entries"),
            ("temperature_column", f'"{column}"', "told by the header"),
        ),
        questions=(("unit", f'"{unit}"', '"C" or "F"?'),),
        remarks=("looks like a temperature series",),
    )


def _unit(columns: list[str]) -> tuple[str, str, str]:
    """Quantity, unit, and the header that tells them; three empty texts where none does."""
    for word, quantity, unit in UNITS:
        for column in columns:
            if re.search(rf"(^|[^a-z]){word}([^a-z]|$)", column.lower()):
                return quantity, unit, column
    return "", "", ""


def _ask_unit(unit: tuple[str, str, str]) -> tuple[str, str, str]:
    return "unit", f'"{unit[1] or "kWh"}"', 'Wh, kWh or MWh (energy); with quantity = "power": W, kW or MW'


def _ask_stamp(likely: str, why: str) -> tuple[str, str, str]:
    return "stamp", f'"{likely}"', f'"start" or "end" of the interval? {why}'


def _ask_first() -> tuple[tuple[str, str, str], ...]:
    return (
        ("first_stamp", "2031-01-01T00:00:00", "the instant at which the first reading begins"),
        ("interval_min", "60", "minutes from one reading to the next"),
        ("clock", '"standard"', '"local", "utc" or "standard"? readings without a gap or a repeated hour: not "local"'),
    )


def _day(second: int) -> str:
    return dt.datetime.fromtimestamp(int(second), tz=dt.UTC).strftime("%Y-%m-%d %H:%M")
