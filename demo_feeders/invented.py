"""Invented customers for the demo studies: one clock and one weather for all, habits and appliances for each.

Everything is drawn from a seeded generator: run it again and the same readings come out. Nothing here is a measurement.
"""

import csv
import datetime as dt
import gzip
import io
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
STEP_KWH = 0.01  # what the invented meters resolve


@dataclass(frozen=True, slots=True, kw_only=True)
class Clock:
    """Every demand interval of a year: its local time and where it lies in the day."""

    minutes: int
    local: list[dt.datetime]
    hour: Array  # hour of the day, with its fraction
    day: NDArray[np.int64]  # day of the year, from 0
    weekday: NDArray[np.int64]  # of each day, Monday 0
    first: NDArray[np.int64]  # index of the first interval of each day

    @property
    def days(self) -> int:
        """Days of the year."""
        return self.weekday.size


def year_of(year: int, zone: str, minutes: int) -> Clock:
    """The clock of a calendar year in a time zone."""
    place = ZoneInfo(zone)
    start, end = dt.datetime(year, 1, 1, tzinfo=place), dt.datetime(year + 1, 1, 1, tzinfo=place)
    steps = int((end - start).total_seconds()) // (60 * minutes)
    origin = start.astimezone(dt.UTC)
    local = [(origin + dt.timedelta(minutes=minutes * n)).astimezone(place) for n in range(steps)]
    day = np.array([t.timetuple().tm_yday - 1 for t in local])
    first = np.searchsorted(day, np.arange(day[-1] + 1))
    return Clock(
        minutes=minutes,
        local=local,
        hour=np.array([t.hour + t.minute / 60 for t in local]),
        day=day,
        weekday=np.array([local[n].weekday() for n in first]),
        first=first,
    )


def outdoor_c(clock: Clock, mean: float, swing: float, rng: np.random.Generator, *, south: bool = False) -> Array:
    """Outdoor temperature: season, time of day, and fronts that last some days. [°C]"""
    coldest = 200 if south else 18
    season = mean - swing * np.cos(2 * np.pi * (clock.day - coldest) / 365.0)
    daily = 3.8 * np.cos(2 * np.pi * (clock.hour - 15.5) / 24)
    shocks, fronts = rng.normal(0.0, 2.6, clock.days + 1), np.zeros(clock.days + 1)
    for day in range(1, fronts.size):
        fronts[day] = 0.72 * fronts[day - 1] + shocks[day]
    return season + daily + np.interp(clock.day + clock.hour / 24, np.arange(fronts.size), fronts)


def use(kw: Array, clock: Clock, day: int, at_hour: float, hours: float, power_kw: float) -> None:
    """Add an appliance that runs for some hours, to the fraction of an interval."""
    step = clock.minutes / 60
    begin = clock.first[day] + at_hour / step
    end = begin + hours / step
    for n in range(int(begin), min(int(np.ceil(end)), kw.size)):
        kw[n] += power_kw * (min(end, n + 1) - max(begin, n))


@dataclass(frozen=True, slots=True, kw_only=True)
class Household:
    """Habits and appliances of one home."""

    base_kw: float
    evening_hour: float
    meals: float  # cooked meals a day
    cooker_kw: float
    washes: float  # a day
    busy: float  # how far one day differs from the next
    heat_kw_per_c: float = 0.0  # electric heating below 15 °C
    cool_kw_per_c: float = 0.0  # air conditioning above 23 °C
    charger_kw: float = 0.0
    charges: float = 0.0  # evenings on which the car is plugged in, of one
    timer: bool = False  # charges after midnight
    solar_kw: float = 0.0


def household(rng: np.random.Generator, size: float, **more: float | bool) -> Household:
    """A home drawn at random about a size."""
    return Household(
        base_kw=size * rng.gamma(5.0, 0.045),
        evening_hour=rng.normal(18.3, 0.9),
        meals=rng.uniform(0.5, 1.5),
        cooker_kw=rng.uniform(1.4, 3.4),
        washes=rng.uniform(0.2, 0.8) * size,
        busy=rng.uniform(0.2, 0.45),
        **more,  # type: ignore[arg-type]
    )


def home_kw(of: Household, clock: Clock, outdoor: Array, mood: Array, rng: np.random.Generator) -> Array:
    """Demand of one home in every interval, negative where it exports. [kW]

    ``mood`` is the part of a day's busyness that the whole street shares, one number a day.
    """
    n = outdoor.size
    day = clock.day
    whim = np.exp(rng.normal(0.0, of.busy, clock.days) + mood)[day]
    late = np.where(clock.weekday >= 5, 1.6, 0.0)[day]
    kw = of.base_kw * rng.gamma(5.0, 0.2, n)
    kw += 1.5 * of.base_kw * whim * np.exp(-0.5 * ((clock.hour - 7.2 - late) / 1.0) ** 2) * rng.gamma(1.5, 1 / 1.5, n)
    evening = np.exp(-0.5 * ((clock.hour - of.evening_hour - 1.2) / 2.0) ** 2)
    kw += 2.6 * of.base_kw * whim * evening * rng.gamma(1.8, 1 / 1.8, n)
    felt = _felt(outdoor, clock)
    night = np.where((clock.hour < 6) | (clock.hour >= 22.5), 0.75, 1.0)
    kw += of.heat_kw_per_c * np.maximum(15.0 - felt, 0.0) * night * rng.gamma(5.0, 0.2, n)
    kw += of.cool_kw_per_c * np.maximum(felt - 23.0, 0.0) * rng.gamma(4.0, 0.25, n)
    for date in range(clock.days):
        _appliances(kw, of, clock, date, float(late[clock.first[date]]), rng)
    away = np.zeros(clock.days, dtype=bool)
    for _ in range(int(rng.integers(1, 4))):
        start = int(rng.integers(0, clock.days - 12))
        away[start : start + int(rng.integers(3, 12))] = True
    gone = away[day]
    kw[gone] = of.base_kw * rng.uniform(0.4, 0.9, int(gone.sum()))
    if of.solar_kw:
        kw -= of.solar_kw * _sun(clock, rng)
    return kw


def _felt(outdoor: Array, clock: Clock) -> Array:
    """Temperature that a building feels: the mean of the last 12 hours. [°C]"""
    width = 12 * 60 // clock.minutes
    return np.convolve(np.pad(outdoor, (width - 1, 0), mode="edge"), np.full(width, 1 / width), mode="valid")


def _appliances(kw: Array, of: Household, clock: Clock, date: int, late: float, rng: np.random.Generator) -> None:
    if rng.random() < of.meals:
        use(kw, clock, date, rng.normal(of.evening_hour, 0.6) % 23, rng.uniform(0.4, 1.1), of.cooker_kw)
    if rng.random() < of.meals - 0.7:
        use(kw, clock, date, rng.normal(12.2 + late / 2, 0.5), rng.uniform(0.3, 0.7), of.cooker_kw)
    if rng.random() < of.washes:
        use(kw, clock, date, rng.uniform(8.5, 20.0), rng.uniform(0.5, 1.4), rng.uniform(1.2, 2.4))
    if rng.random() < of.charges:
        at = 23.9 if of.timer else min(max(rng.normal(of.evening_hour, 1.3), 12.0), 23.5)
        use(kw, clock, date, at, rng.gamma(2.2, 4.0) / of.charger_kw, of.charger_kw)


def _sun(clock: Clock, rng: np.random.Generator) -> Array:
    """Solar production per unit of rating: season, time of day, clouds that last a day and clouds that pass."""
    height = 0.55 - 0.35 * np.cos(2 * np.pi * (clock.day - 172 + 182.5) / 365.0)
    arc = np.maximum(np.cos(np.pi * (clock.hour - 12.7) / (9.0 + 6.0 * height)), 0.0)
    clear = rng.beta(2.2, 1.2, clock.days)[clock.day]
    return 0.9 * height**0.5 * arc**1.3 * clear * rng.beta(8.0, 2.0, clock.hour.size)


def business_kw(peak_kw: float, opens: float, closes: float, days: Sequence[int], clock: Clock, outdoor: Array,
                rng: np.random.Generator, *, closed: Sequence[range] = (), cooling: float = 0.01) -> Array:  # fmt: skip
    """Demand of a shop, an office or a school: open hours, closed days, cooling. [kW]"""
    open_day = np.isin(clock.weekday, days)
    for span in closed:
        open_day[span.start : span.stop] = False
    inside = open_day[clock.day] & (clock.hour >= opens) & (clock.hour < closes)
    edge = np.clip(np.minimum(clock.hour - opens, closes - clock.hour) + 0.35, 0.0, 1.0)
    level = np.where(inside, 0.3 + 0.45 * edge, 0.14)
    kw = peak_kw * level * rng.gamma(40.0, 1 / 40.0, level.size)
    kw += peak_kw * cooling * np.maximum(_felt(outdoor, clock) - 19.0, 0.0) * np.where(inside, 1.0, 0.2)
    return kw


def pump_kw(rating_kw: float, clock: Clock, rng: np.random.Generator) -> Array:
    """Demand of a pump station: whole pumps on or off, more of them by day and in the dry season. [kW]"""
    wet = (
        0.25
        + 0.30 * np.exp(-0.5 * ((clock.hour - 7.5) / 2.0) ** 2)
        + 0.2 * np.exp(-0.5 * ((clock.hour - 19.0) / 2.5) ** 2)
    )
    dry = 0.15 * np.sin(np.pi * clock.day / 365.0) ** 2
    return rating_kw / 3 * rng.binomial(3, np.clip(wet + dry, 0.0, 1.0)).astype(np.float64) + 0.4


def read_kwh(kw: Array, minutes: int) -> Array:
    """Energy that a meter of limited resolution shows in each interval; what it holds back comes later. [kWh]"""
    register = np.floor(np.cumsum(kw) * minutes / 60 / STEP_KWH + 0.5)
    return np.diff(register, prepend=0.0) * STEP_KWH


def write(path: Path, rows: Sequence[Sequence[str]]) -> None:
    """Write rows as delimited text, gzipped where the name says so; the bytes do not depend on the time of day."""
    text = io.StringIO()
    csv.writer(text, lineterminator="\n").writerows(rows)
    content = text.getvalue().encode("utf-8")
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes(gzip.compress(content, 6, mtime=0) if path.suffix == ".gz" else content)


def texts(values: Array) -> list[str]:
    """Readings with two decimals; where there is none, nothing."""
    return ["" if value != value else f"{value:.2f}" for value in values.tolist()]
