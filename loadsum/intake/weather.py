"""Temperature series -> daily means and temperatures by demand interval, local time."""

import datetime as dt
from pathlib import Path

import numpy as np
import pandas as pd

from loadsum.errors import Fault, InputError
from loadsum.intake.clock import NAT, AmbiguousDatesError, local_calendar, read_stamps
from loadsum.intake.inputs import InputFile, digest, unpacked
from loadsum.intake.instants import counted
from loadsum.intake.readers.delimited import read_delimited
from loadsum.intake.readings import TemperatureRecord
from loadsum.study.tables import MeterFiles, Weather

FEWEST_A_DAY = 4  # readings; a daily mean from fewer is no mean


def read_temperature(
    path: Path, keys: Weather, place: dt.tzinfo, interval_min: int
) -> tuple[TemperatureRecord, InputFile]:
    """Temperature by local day and demand interval.

    Raises
    ------
    InputError
        The file cannot be read, or its stamps cannot be understood.
    """
    source = MeterFiles(
        files=path.name,
        layout="one column a customer",
        time_column=keys.time_column,
        value_column=keys.temperature_column,
        unit="kW",
        stamp="start",
        quantity="power",
        clock=keys.clock,
        first_stamp=keys.first_stamp,
        interval_min=keys.interval_min,
    )
    stamps, values = [], []
    choices: tuple[str, ...] = ()
    for name, content in unpacked(path):
        raw = read_delimited(content, name, source)
        choices = raw.choices
        if keys.first_stamp:
            said: list[str] = []
            start, _ = counted(raw, source, place, said)
            choices = (*choices, *said)
            stamps.append(start)
            values.append(raw.value)
            continue
        try:
            read = read_stamps(pd.Series(list(raw.stamps), dtype=str), keys.time_format, keys.clock, place)
        except AmbiguousDatesError as error:
            raise InputError(name, [Fault(name, f"{error}; state weather.time_format")]) from error
        if read.unread.any():
            bad = int(np.flatnonzero(read.unread)[0])
            line = int(raw.line[raw.stamp == bad][0])
            raise InputError(
                name, [Fault(f"{name}:{line}", f"{raw.stamps[bad]!r} is no stamp; state weather.time_format")]
            )
        stamps.append(read.first[raw.stamp])
        values.append(raw.value)
    start, value = np.concatenate(stamps), np.concatenate(values)
    used = (start != NAT) & np.isfinite(value)
    start, value = start[used], value[used]
    if keys.unit == "F":
        value = (value - 32.0) / 1.8
    day, interval = local_calendar(start, place, interval_min)
    days, row = np.unique(day, return_inverse=True)
    per_day = 1440 // interval_min
    total, count = np.zeros((days.size, per_day)), np.zeros((days.size, per_day))
    np.add.at(total, (row, interval), value)
    np.add.at(count, (row, interval), 1.0)
    enough = np.bincount(row) >= FEWEST_A_DAY if (np.bincount(row) > 1).any() else np.ones(days.size, bool)
    mean = np.bincount(row, weights=value) / np.bincount(row)
    by_interval = np.divide(total, count, out=np.full_like(total, np.nan), where=count > 0.0)
    by_interval = pd.DataFrame(by_interval).ffill(axis=1).bfill(axis=1).to_numpy()
    sha256, size = digest(path)
    record = TemperatureRecord(day=days[enough], daily_mean_c=mean[enough], by_interval_c=np.array(by_interval[enough]))
    return record, InputFile(
        name=path.name, sha256=sha256, bytes=size, format="delimited text", layout="temperature series", choices=choices
    )
