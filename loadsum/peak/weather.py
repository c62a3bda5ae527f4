"""Days of a temperature record sorted into classes of days: the weather that peaks and paths run over."""

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.hourclass import EPOCH, Calendar, lagged_daily_mean
from loadsum.intake.readings import TemperatureRecord, read_only

DAYS = 365
MOST_STAND_INS = 10  # days without temperature that a year may have


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class YearsOfDays:
    """Calendar years day by day: the class of each day and, where a record is given, its temperature.

    Parameters
    ----------
    year : (Y,) int64
        Calendar years. [-]
    block : (Y, 365) int64
        Class of each day; 31 December of a leap year is left out. [-]
    daily_c : (Y, 365) float64 or None
        Daily mean weighted 0.7 that day and 0.3 the day before. [°C]
    by_interval_c : (Y, 365, I) float64 or None
        Temperature in each demand interval. [°C]
    left_out : tuple of int
        Years of the record left out because more than `MOST_STAND_INS` of their days have no temperature.
    stand_ins : int
        Days without temperature in the years kept, for which the nearest day of the same year stands in. [d]
    """

    year: NDArray[np.int64]
    block: NDArray[np.int64]
    daily_c: NDArray[np.float64] | None
    by_interval_c: NDArray[np.float64] | None
    left_out: tuple[int, ...] = ()
    stand_ins: int = 0

    def __post_init__(self) -> None:
        if self.year.size == 0 or self.block.shape != (self.year.size, DAYS):
            raise ValueError(f"need at least one whole year of {DAYS} days, got {self.block.shape}")
        for array in (self.year, self.block, self.daily_c, self.by_interval_c):
            if array is not None:
                read_only(array)

    def days_per_year(self, blocks: int) -> NDArray[np.float64]:
        """Days of each class in the mean year, (B,) float64. [d]"""
        return np.bincount(self.block.ravel(), minlength=blocks) / self.year.size


def calendar_years(calendar: Calendar, years: Sequence[int]) -> YearsOfDays:
    """Calendar years without temperature."""
    return YearsOfDays(
        year=np.array(years, dtype=np.int64),
        block=np.array([_classes(calendar, year) for year in years], dtype=np.int64).reshape(-1, DAYS),
        daily_c=None,
        by_interval_c=None,
    )


def record_years(calendar: Calendar, record: TemperatureRecord) -> YearsOfDays | None:
    """The whole years of a temperature record; None where it has none.

    A record that starts in mid-year is cut into years of 365 days from its first day, turned so that each starts on
    1 January; so one metered year from July to July is one year. The first day counts with its own mean. For a few
    days without temperature the nearest day of the same year stands in, and they are counted; years with more are
    left out and named.
    """
    warmth = lagged_daily_mean(record)
    if record.day.size:
        warmth.setdefault(int(record.day[0]), float(record.daily_mean_c[0]))
    row_of = {int(day): row for row, day in enumerate(record.day)}
    if not warmth:
        return None
    start, end = (EPOCH + dt.timedelta(days=day) for day in (min(warmth), max(warmth)))
    years, blocks, daily, fine, left_out, stand_ins = [], [], [], [], [], 0
    for first_year in range(start.year, end.year + 1):
        days = _turned(first_year, start)
        known = np.array([day for day in days if day in warmth])
        missing = DAYS - known.size
        if missing > MOST_STAND_INS:
            left_out.append(first_year)
            continue
        stand_ins += missing
        used = [day if day in warmth else int(known[np.argmin(np.abs(known - day))]) for day in days]
        years.append(first_year)
        blocks.append([_class(calendar, day) for day in days])
        daily.append([warmth[day] for day in used])
        if record.by_interval_c is not None:
            fine.append(record.by_interval_c[[row_of[day] for day in used]])
    if not years:
        return None
    return YearsOfDays(
        year=np.array(years, dtype=np.int64),
        block=np.array(blocks, dtype=np.int64),
        daily_c=np.array(daily),
        by_interval_c=np.array(fine) if fine else None,
        left_out=tuple(left_out),
        stand_ins=stand_ins,
    )


def _turned(first_year: int, start: dt.date) -> list[int]:
    """Days of one year from a date on, turned so that 1 January comes first, since 1970-01-01. [d]"""
    days = []
    for place in range(DAYS):
        day = dt.date(first_year, 1, 1) + dt.timedelta(days=place)
        if (day.month, day.day) < (start.month, start.day):
            day = dt.date(first_year + 1, 1, 1) + dt.timedelta(days=place)
        days.append((day - EPOCH).days)
    return days


def _class(calendar: Calendar, day: int) -> int:
    season, kind = calendar.place(day)
    return season * len(calendar.day_types) + kind


def _classes(calendar: Calendar, year: int) -> list[int]:
    first = (dt.date(year, 1, 1) - EPOCH).days
    return [_class(calendar, first + place) for place in range(DAYS)]
