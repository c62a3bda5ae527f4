"""Season x day type x interval of the day: which readings are alike."""

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass

import holidays as public_holidays
import numpy as np
from numpy.typing import NDArray

from loadsum.intake.readings import Readings, TemperatureRecord, read_only
from loadsum.study.tables import DayTypes, Season

EPOCH = dt.date(1970, 1, 1)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DayBlock:
    """Readings of all customers on the days of one season and day type.

    Parameters
    ----------
    season, day_type : str
        Names of the class of days.
    days_per_year : float
        Days of the class in an average calendar year. [d]
    day : (D,) int64
        Local calendar day, days since 1970-01-01, not decreasing. A day with a repeated hour has a second row
        that holds only that hour. [d]
    kw : (C, D, I) float64
        Average demand; NaN where there is no usable reading. [kW]
    kvar : (C, D, I) float64 or None
        Average reactive demand. [kvar]
    temperature_c : (D,) float64 or None
        Daily mean outdoor temperature weighted 0.7 that day and 0.3 the day before. [°C]
    """

    season: str
    day_type: str
    days_per_year: float
    day: NDArray[np.int64]
    kw: NDArray[np.float64]
    kvar: NDArray[np.float64] | None = None
    temperature_c: NDArray[np.float64] | None = None

    def __post_init__(self) -> None:
        if self.kw.ndim != 3 or self.kw.shape[1] != self.day.size:
            raise ValueError(f"kw must be (C, {self.day.size}, I), got {self.kw.shape}")
        for array in (self.day, self.kw, self.kvar, self.temperature_c):
            if array is not None:
                read_only(array)


@dataclass(frozen=True, slots=True, kw_only=True)
class Calendar:
    """Sorts days into seasons and day types.

    Parameters
    ----------
    season_names : tuple of str
        Seasons in the order of the study file.
    season_of_month : tuple of int
        Index of the season of each of the 12 months.
    day_types : tuple of str
        Names of the day types.
    split : str
        How days are grouped, as in the study file.
    holidays : frozenset of datetime.date
        Days that count as other days.
    """

    season_names: tuple[str, ...]
    season_of_month: tuple[int, ...]
    day_types: tuple[str, ...]
    split: str
    holidays: frozenset[dt.date]

    def place(self, day: int) -> tuple[int, int]:
        """Season and day type, as indices, of a day counted from 1970-01-01."""
        date = EPOCH + dt.timedelta(days=day)
        weekday = date.weekday()
        other = date in self.holidays
        if self.split == "all days alike":
            kind = 0
        elif self.split == "workday and other":
            kind = 1 if weekday >= 5 or other else 0
        else:
            kind = 2 if weekday == 6 or other else 1 if weekday == 5 else 0
        return self.season_of_month[date.month - 1], kind

    def days_per_year(self, years: Sequence[int]) -> NDArray[np.float64]:
        """Days of each season and day type in an average year of those given, (S, K) float64. [d]"""
        count = np.zeros((len(self.season_names), len(self.day_types)))
        for year in years:
            first, last = (dt.date(year, 1, 1) - EPOCH).days, (dt.date(year, 12, 31) - EPOCH).days
            for day in range(first, last + 1):
                count[self.place(day)] += 1.0
        return count / max(len(years), 1)


DAY_TYPE_NAMES = {
    "workday and other": ("workday", "weekend or holiday"),
    "workday, saturday and sunday": ("workday", "Saturday", "Sunday or holiday"),
    "all days alike": ("all days",),
}


def calendar(seasons: Sequence[Season], day_types: DayTypes, years: Sequence[int]) -> Calendar:
    """The calendar that the study file describes, with public holidays of the years given."""
    names = tuple(season.name for season in seasons) or ("all year",)
    of_month = [0] * 12
    for index, season in enumerate(seasons):
        for month in season.months:
            of_month[month - 1] = index
    days = {dt.date.fromisoformat(text) for text in day_types.holidays}
    if day_types.holidays_country:
        days |= set(
            public_holidays.country_holidays(
                day_types.holidays_country, subdiv=day_types.holidays_subdivision or None, years=list(years)
            )
        )
    return Calendar(
        season_names=names,
        season_of_month=tuple(of_month),
        day_types=DAY_TYPE_NAMES[day_types.split],
        split=day_types.split,
        holidays=frozenset(days),
    )


def lagged_daily_mean(record: TemperatureRecord) -> dict[int, float]:
    """Daily mean weighted 0.7 that day and 0.3 the day before, by day; days whose eve is missing are left out. [°C]"""
    mean = dict(zip(record.day.tolist(), record.daily_mean_c.tolist(), strict=True))
    return {day: 0.7 * value + 0.3 * mean[day - 1] for day, value in mean.items() if day - 1 in mean}


def day_blocks(
    readings: Readings,
    calendar: Calendar,
    years: Sequence[int],
    temperature: TemperatureRecord | None = None,
    *,
    estimated_too: bool = False,
) -> tuple[DayBlock, ...]:
    """Readings sorted into one block for each season and day type, in calendar order; blocks without days included.

    Readings flagged as estimated are left out, since they are never counted as observed, unless they are asked for so
    that what they would do can be told.
    """
    per_day = readings.intervals_per_day
    left_out = np.zeros_like(readings.estimated) if estimated_too else readings.estimated
    kw = np.where(left_out, np.nan, readings.kw)
    # A repeated hour goes to a second row of its day, so that no reading is lost and no two are averaged.
    key = readings.local_day * per_day + readings.interval_of_day
    order = np.argsort(key, kind="stable")
    repeat = np.zeros(key.size, dtype=np.int64)
    repeat[order[1:]] = key[order[1:]] == key[order[:-1]]
    row_key = readings.local_day * 2 + repeat
    rows, row = np.unique(row_key, return_inverse=True)
    full = np.full((len(readings.customers), rows.size, per_day), np.nan)
    full[:, row, readings.interval_of_day] = kw
    reactive = None
    if readings.kvar is not None:
        reactive = np.full_like(full, np.nan)
        reactive[:, row, readings.interval_of_day] = np.where(left_out, np.nan, readings.kvar)
    day = rows // 2
    placed = [calendar.place(d) for d in day.tolist()]
    warmth = lagged_daily_mean(temperature) if temperature is not None else None
    per_year = calendar.days_per_year(years)
    blocks = []
    for s, season in enumerate(calendar.season_names):
        for k, day_type in enumerate(calendar.day_types):
            pick = np.array([i for i, where in enumerate(placed) if where == (s, k)], dtype=np.int64)
            blocks.append(
                DayBlock(
                    season=season,
                    day_type=day_type,
                    days_per_year=float(per_year[s, k]),
                    day=day[pick],
                    kw=full[:, pick],
                    kvar=None if reactive is None else reactive[:, pick],
                    temperature_c=None
                    if warmth is None
                    else np.array([warmth.get(d, np.nan) for d in day[pick].tolist()]),
                )
            )
    return tuple(blocks)


def metered_years(readings: Readings) -> tuple[int, ...]:
    """Calendar years with a reading, in order."""
    days = readings.local_day[np.isfinite(readings.kw).any(axis=0)]
    return tuple(sorted({(EPOCH + dt.timedelta(days=day)).year for day in np.unique(days).tolist()}))
