"""Days of a temperature record sorted into classes of days: the weather that peaks and paths run over."""

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.hourclass import EPOCH, Calendar, lagged_daily_mean
from loadsum.intake.readings import TemperatureRecord, read_only

DAYS = 365


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
        Years of the record left out because a day of theirs has no temperature.
    """

    year: NDArray[np.int64]
    block: NDArray[np.int64]
    daily_c: NDArray[np.float64] | None
    by_interval_c: NDArray[np.float64] | None
    left_out: tuple[int, ...] = ()

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


def record_years(calendar: Calendar, record: TemperatureRecord) -> YearsOfDays:
    """The whole years of a temperature record.

    A record that starts in mid-year is cut into years of 365 days from its first day, turned so that each starts on
    1 January; so one metered year from July to July is one year. Years with a missing day are left out and named.
    """
    warmth = lagged_daily_mean(record)
    row_of = {int(day): row for row, day in enumerate(record.day)}
    dates = [EPOCH + dt.timedelta(days=day) for day in sorted(warmth)]
    if not dates:
        raise ValueError("the temperature record has no day whose eve is known")
    years, blocks, daily, fine, left_out = [], [], [], [], []
    start = dates[0]
    for turn in range(dates[-1].year - start.year + 1):
        days: list[int] = []
        for place in range(DAYS):
            day = dt.date(start.year + turn, 1, 1) + dt.timedelta(days=place)
            if (day.month, day.day) < (start.month, start.day):
                day = dt.date(start.year + turn + 1, 1, 1) + dt.timedelta(days=place)
            days.append((day - EPOCH).days)
        if any(day not in warmth for day in days):
            left_out.append(start.year + turn)
            continue
        years.append(start.year + turn)
        blocks.append([_class(calendar, day) for day in days])
        daily.append([warmth[day] for day in days])
        if record.by_interval_c is not None:
            fine.append(record.by_interval_c[[row_of[day] for day in days]])
    return YearsOfDays(
        year=np.array(years, dtype=np.int64),
        block=np.array(blocks, dtype=np.int64).reshape(-1, DAYS),
        daily_c=np.array(daily).reshape(-1, DAYS),
        by_interval_c=np.array(fine) if fine else None,
        left_out=tuple(left_out),
    )


def _class(calendar: Calendar, day: int) -> int:
    season, kind = calendar.place(day)
    return season * len(calendar.day_types) + kind


def _classes(calendar: Calendar, year: int) -> list[int]:
    first = (dt.date(year, 1, 1) - EPOCH).days
    return [_class(calendar, first + place) for place in range(DAYS)]
