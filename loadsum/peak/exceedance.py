"""Expected hours per year above each level, by class of days, season and month."""

import datetime as dt
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from loadsum.demand.hourly import Direction, GroupDemand
from loadsum.demand.probability import Probabilities, Probability
from loadsum.intake.hourclass import EPOCH, Calendar
from loadsum.intake.readings import read_only

FAR = 1e-9  # mean probability below which an absolute accuracy of 1e-15 does not do


@dataclass(frozen=True, slots=True, kw_only=True)
class Hours:
    """Expected hours above a level in one year, with all that is known about the figure.

    Parameters
    ----------
    period : str
        Part of the year: "year", the name of a season, or a month as "01" to "12".
    expected_h : float
        Expected hours, over the covered hours only. [h]
    lower_h, upper_h : float
        Arithmetic bracket. [h]
    low_h, high_h : float or None
        Interval for the long-run hours; None where any covered interval has none. [h]
    covered_h, period_h : float
        Hours with readings in the period, and all its hours. [h]
    """

    period: str
    expected_h: float
    lower_h: float
    upper_h: float
    low_h: float | None
    high_h: float | None
    covered_h: float
    period_h: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LevelExceedance:
    """How often one level is exceeded.

    Parameters
    ----------
    name : str
        What the level is, in words: a rating, or a rating with the loading allowed on it.
    level_kva : (B,) float64
        Level in each class of days. [kVA]
    probability, lower, upper : (B, I) float64
        Probability that the interval's demand is strictly above the level, and its arithmetic bracket; NaN where
        there are no readings. [-]
    low, high : (B, I) float64
        Interval for the long-run probability; NaN where there is none. [-]
    floor : (B, I) float64
        Smallest probability that the record supports. [-]
    year : Hours
        Expected hours in an average year.
    by_season, by_month : tuple of Hours
        The same by part of the year; months only where the calendar was given.
    largest_probability : Probability or None
        The largest of all; None where nothing is covered.
    largest_season, largest_day_type : str
        Class of days of the largest probability.
    largest_interval : int
        Interval of the day of the largest probability; -1 where nothing is covered. [-]
    """

    name: str
    level_kva: NDArray[np.float64]
    probability: NDArray[np.float64]
    lower: NDArray[np.float64]
    upper: NDArray[np.float64]
    low: NDArray[np.float64]
    high: NDArray[np.float64]
    floor: NDArray[np.float64]
    year: Hours
    by_season: tuple[Hours, ...]
    by_month: tuple[Hours, ...]
    largest_probability: Probability | None
    largest_season: str
    largest_day_type: str
    largest_interval: int

    def __post_init__(self) -> None:
        for array in (self.level_kva, self.probability, self.lower, self.upper, self.low, self.high, self.floor):
            read_only(array)


@dataclass(frozen=True, slots=True, kw_only=True)
class ExceedanceTable:
    """Expected exceedance hours of every level asked.

    Parameters
    ----------
    direction : str
        Direction of flow that counts.
    interval_min : int
        Demand interval. [min]
    covered_h, hours_in_year : float
        Hours of the average year that have readings, and all hours. [h]
    uncovered : tuple of str
        Intervals of each class of days without readings, named.
    levels : tuple of LevelExceedance
        One for each level, in the order asked.
    """

    direction: Direction
    interval_min: int
    covered_h: float
    hours_in_year: float
    uncovered: tuple[str, ...]
    levels: tuple[LevelExceedance, ...]

    def __getitem__(self, name: str) -> LevelExceedance:
        return next(level for level in self.levels if level.name == name)


def exceedance_hours(
    demand: GroupDemand,
    levels_kva: Mapping[str, ArrayLike],
    direction: Direction = "both",
    *,
    month_days: NDArray[np.float64] | None = None,
    far: bool = True,
) -> ExceedanceTable:
    """Expected hours per average year above each level.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    levels_kva : mapping of str to float or (B,) float64
        Levels by name; one figure, or one for each class of days where the limit differs by season. [kVA]
    direction : {"both", "delivered", "exported"}
        Direction of flow that counts.
    month_days : (12, B) float64 or None
        Days of each class in each month of an average year, from :func:`days_by_month`. [d]
    far : bool
        Whether probabilities that are rare throughout are computed at tilts of their own; without, all are accurate to
        1e-15 absolute.

    Raises
    ------
    ValueError
        A level has the wrong shape.

    Notes
    -----
    The expected number of hours is the sum of probability times length over the demand intervals of the year. It
    needs no assumption about how intervals depend on each other, because expectations add whatever the dependence.
    The ends of the interval are sums of the ends of each interval's interval: they are those of fully dependent
    errors and so, for the two-sided confidence stated, on the wide side.
    """
    hours, covered = demand.hours_in_year(), demand.covered()
    asked = {name: np.asarray(given, dtype=np.float64) for name, given in levels_kva.items()}
    for name, level in asked.items():
        if level.shape not in ((), (len(demand.blocks),)):
            raise ValueError(f"level {name!r} must be one figure or {len(demand.blocks)}, got shape {level.shape}")
    level_kva = np.array([np.broadcast_to(level, len(demand.blocks)) for level in asked.values()])
    found = [
        [None if hour is None else hour.exceedances_kva(level_kva[:, b], direction) for hour in row]
        for b, row in enumerate(demand.hours)
    ]
    levels = [
        _level(demand, found, n, name, level_kva[n].copy(), direction, month_days, far) for n, name in enumerate(asked)
    ]
    return ExceedanceTable(
        direction=direction,
        interval_min=demand.interval_min,
        covered_h=float(hours[covered].sum()),
        hours_in_year=float(hours.sum()),
        uncovered=uncovered_classes(demand),
        levels=tuple(levels),
    )


def uncovered_classes(demand: GroupDemand) -> tuple[str, ...]:
    """Intervals of each class of days that have no readings, in words; runs of intervals are one entry."""
    named = []
    for block, row in zip(demand.blocks, demand.covered(), strict=True):
        if not row.any():
            named.append(f"{block.season}, {block.day_type}: all day")
            continue
        edge = np.flatnonzero(np.diff(np.concatenate(([True], row, [True])).astype(int)))
        for first, end in zip(edge[::2].tolist(), edge[1::2].tolist(), strict=True):
            start, stop = (
                f"{n * demand.interval_min // 60:02d}:{n * demand.interval_min % 60:02d}" for n in (first, end)
            )
            named.append(f"{block.season}, {block.day_type}: {start} to {stop}")
    return tuple(named)


def days_by_month(calendar: Calendar, years: Sequence[int]) -> NDArray[np.float64]:
    """Days of each class, seasons outermost, in each month of an average year of those given, (12, B) float64. [d]"""
    kinds = len(calendar.day_types)
    count = np.zeros((12, len(calendar.season_names) * kinds))
    for year in years:
        for day in range((dt.date(year, 1, 1) - EPOCH).days, (dt.date(year + 1, 1, 1) - EPOCH).days):
            season, kind = calendar.place(day)
            count[(EPOCH + dt.timedelta(days=day)).month - 1, season * kinds + kind] += 1.0
    return count / max(len(years), 1)


def _level(
    demand: GroupDemand,
    found: Sequence[Sequence[Probabilities | None]],
    n: int,
    name: str,
    level_kva: NDArray[np.float64],
    direction: Direction,
    month_days: NDArray[np.float64] | None,
    far: bool,
) -> LevelExceedance:
    """One level, the n-th of those found.

    Where the hours together are so rare that the absolute accuracy of :meth:`HourDemand.exceedances_kva` shows, each
    is asked for again at its own tilt.
    """
    covered = demand.covered()
    parts = {part: np.full(covered.shape, np.nan) for part in ("value", "lower", "upper", "low", "high", "floor")}
    for b, row in enumerate(demand.hours):
        for i, hour in enumerate(row):
            given = found[b][i]
            if hour is None or given is None:
                continue
            for part in ("value", "lower", "upper", "low", "high"):
                parts[part][b, i] = getattr(given, part)[n]
            parts["floor"][b, i] = hour.floor
    if far and np.nansum(parts["upper"]) < FAR * covered.sum():
        for b, i in np.argwhere(covered).tolist():
            hour = demand.hours[b][i]
            assert hour is not None
            exact = hour.exceedance_kva(float(level_kva[b]), direction)
            for part in ("value", "lower", "upper"):
                parts[part][b, i] = getattr(exact, part)
    largest, where = None, (-1, -1)
    if covered.any():
        where = divmod(int(np.nanargmax(parts["value"])), covered.shape[1])
        at = {part: float(array[where]) for part, array in parts.items()}
        largest = Probability(
            value=at["value"],
            lower=at["lower"],
            upper=at["upper"],
            low=None if np.isnan(at["low"]) else at["low"],
            high=None if np.isnan(at["high"]) else at["high"],
            floor=at["floor"],
        )
    per_day = demand.interval_min / 60.0

    def hours(period: str, days: NDArray[np.float64]) -> Hours:
        weight = np.where(covered, days[:, None] * per_day, 0.0)
        ends = [parts[end][weight > 0.0] for end in ("low", "high")]
        known = all(end.size > 0 and bool(np.isfinite(end).all()) for end in ends)

        def total(part: str) -> float:
            return float((weight * np.nan_to_num(parts[part])).sum())

        return Hours(
            period=period,
            expected_h=total("value"),
            lower_h=total("lower"),
            upper_h=total("upper"),
            low_h=total("low") if known else None,
            high_h=total("high") if known else None,
            covered_h=float(weight.sum()),
            period_h=float(days.sum() * per_day * covered.shape[1]),
        )

    days = np.array([block.days_per_year for block in demand.blocks])
    names = [block.season for block in demand.blocks]
    in_season = {season: np.array([season == own for own in names]) for season in dict.fromkeys(names)}
    block = demand.blocks[where[0]] if largest is not None else None
    return LevelExceedance(
        name=name,
        level_kva=level_kva,
        probability=parts["value"],
        lower=parts["lower"],
        upper=parts["upper"],
        low=parts["low"],
        high=parts["high"],
        floor=parts["floor"],
        year=hours("year", days),
        by_season=tuple(hours(season, np.where(own, days, 0.0)) for season, own in in_season.items()),
        by_month=()
        if month_days is None
        else tuple(hours(f"{month + 1:02d}", month_days[month]) for month in range(12)),
        largest_probability=largest,
        largest_season=block.season if block is not None else "",
        largest_day_type=block.day_type if block is not None else "",
        largest_interval=where[1],
    )
