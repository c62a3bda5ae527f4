"""Tables of the results that are read off the demand model: coverage, customers, hours, the exceedance curve."""

import datetime as dt
from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand, HourDemand
from loadsum.intake.hourclass import EPOCH
from loadsum.intake.readings import Readings
from loadsum.peak.exceedance import ExceedanceTable
from loadsum.report.results import Coverage, Curve, CustomerRow, ExceedanceRow, HourRow, Place
from loadsum.study.tables import Customer

CURVE_POINTS = 120
RARE_SHARE = 0.01  # intervals whose clustering says how many independent ones a record holds


def clock_text(interval: int, interval_min: int) -> str:
    """Start of a demand interval on the local clock, ``18:30``."""
    minutes = interval * interval_min
    return f"{minutes // 60:02d}:{minutes % 60:02d}"


def coverage(demand: GroupDemand, readings: Readings) -> Coverage:
    """What part of the year the readings speak for."""
    hours, covered = demand.hours_in_year(), demand.covered()
    uncovered = []
    for block, row in zip(demand.blocks, covered, strict=True):
        if block.days_per_year == 0.0 or row.all():
            continue
        if not row.any():
            uncovered.append(f"{block.season}, {block.day_type}: all hours")
        else:
            missing = [clock_text(int(i), demand.interval_min) for i in np.flatnonzero(~row)]
            uncovered.append(f"{block.season}, {block.day_type}: intervals starting {', '.join(missing)}")
    with_data = np.unique(readings.local_day[np.isfinite(readings.kw).any(axis=0)])
    dates = (
        [(EPOCH + dt.timedelta(days=int(d))).isoformat() for d in with_data[[0, -1]]] if with_data.size else ["", ""]
    )
    return Coverage(
        first_day=dates[0],
        last_day=dates[1],
        days=int(with_data.size),
        hours_in_year=float(hours.sum()),
        covered_hours=float(hours[covered].sum()),
        uncovered=tuple(uncovered),
        whole_year=not uncovered,
    )


def customer_rows(readings: Readings, customers: Sequence[Customer]) -> tuple[CustomerRow, ...]:
    """One row for each customer of the study, metered or not; what is estimated counts as no reading."""
    place = {name: index for index, name in enumerate(readings.customers)}
    rows = []
    for customer in customers:
        index = place.get(customer.id)
        kw = readings.kw[index] if index is not None else np.empty(0)
        known = np.isfinite(kw) & ~readings.estimated[index] if index is not None else np.empty(0, bool)
        mean = float(kw[known].mean()) if known.any() else float("nan")
        rows.append(
            CustomerRow(
                id=customer.id,
                customer_class=customer.customer_class,
                role=customer.role,
                readings=int(known.sum()),
                days=int(np.unique(readings.local_day[known]).size) if known.any() else 0,
                mean_kw=mean,
                max_kw=float(kw[known].max()) if known.any() else float("nan"),
                annual_kwh=customer.annual_kwh or mean * 8760.0,
            )
        )
    return tuple(rows)


def hour_rows(demand: GroupDemand) -> tuple[HourRow, ...]:
    """Every demand interval of every season and day type that has readings."""
    hours = demand.hours_in_year()
    rows = []
    for b, row in enumerate(demand.hours):
        for i, hour in enumerate(row):
            if hour is None:
                continue
            rows.append(
                HourRow(
                    season=hour.season,
                    day_type=hour.day_type,
                    interval=i,
                    starts=clock_text(i, demand.interval_min),
                    hours_per_year=float(hours[b, i]),
                    n_days=hour.n_days,
                    mean_kw=hour.mean_kw(),
                    sd_kw=float(np.sqrt(hour.variance_kw2())),
                    skewness=hour.skewness(),
                    q50_kw=hour.quantile_kw(0.5),
                    q90_kw=hour.quantile_kw(0.1),
                    q99_kw=hour.quantile_kw(0.01),
                    q999_kw=hour.quantile_kw(0.001),
                    floor=hour.exceedance(0.0).floor,
                )
            )
    return tuple(rows)


def curve(demand: GroupDemand, levels_kw: NDArray[np.float64]) -> Curve:
    """Exceedance averaged over the covered hours of the year, three models side by side and the observed sums.

    Parameters
    ----------
    demand : GroupDemand
        Demand model.
    levels_kw : (L,) float64
        Levels. [kW]
    """
    hours = demand.hours_in_year()
    present = [(b, i, hour) for b, row in enumerate(demand.hours) for i, hour in enumerate(row) if hour is not None]
    weight = np.array([hours[b, i] for b, i, _ in present])
    weight = weight / weight.sum()

    bracket = [hour.exceedances(levels_kw) for _, _, hour in present]
    lower, upper = (np.array([pair[end] for pair in bracket]).T @ weight for end in (0, 1))
    independent = np.array([hour.independent.above_many(levels_kw) for _, _, hour in present]).T @ weight

    def normal(one: Callable[[HourDemand, float], float]) -> NDArray[np.float64]:
        by_hour = np.array([[one(hour, float(level)) for level in levels_kw] for _, _, hour in present])
        return np.asarray(by_hour.T @ weight, dtype=np.float64)

    observed = np.zeros(levels_kw.size)
    for share, (b, i, _) in zip(weight, present, strict=True):
        sums = demand.sums_kw[b][:, i]
        sums = sums[np.isfinite(sums)]
        if sums.size:
            observed += share * (sums[:, None] > levels_kw).mean(axis=0)
    return Curve(
        levels_kw=levels_kw,
        adopted=0.5 * (lower + upper),
        lower=lower,
        upper=upper,
        independent=independent,
        normal=normal(lambda hour, level: hour.normal_exceedance(level)),
        normal_independent=normal(lambda hour, level: hour.normal_independent_exceedance(level)),
        observed=observed,
        floor=pooled_floor(demand),
    )


def pooled_floor(demand: GroupDemand) -> float:
    """Smallest share of all demand intervals that the record supports: one week in which such demand occurs. [-]

    Notes
    -----
    One day is the least that a class and interval can show, hence ``1 / (days + 1)`` there. Intervals of all classes
    together are not so many independent days: high demand comes in clusters. The cluster is the number of intervals
    above the level passed by one interval in a hundred, for each week that holds any; the floor is
    ``1 / (intervals / cluster + 1)``. Where the customers were never metered together, the mean floor of the hours
    stands.
    """
    known = [np.isfinite(sums) for sums in demand.sums_kw]
    count = sum(int(part.sum()) for part in known)
    if count == 0:
        hours = demand.hours_in_year()
        pairs = [
            (hour.floor, hours[b, i])
            for b, row in enumerate(demand.hours)
            for i, hour in enumerate(row)
            if hour is not None
        ]
        return float(np.average([floor for floor, _ in pairs], weights=[weight for _, weight in pairs]))
    pooled = np.concatenate([sums[part] for sums, part in zip(demand.sums_kw, known, strict=True)])
    level = np.quantile(pooled, 1.0 - RARE_SHARE, method="lower")
    above = [np.where(part, sums, -np.inf) > level for sums, part in zip(demand.sums_kw, known, strict=True)]
    weeks = {
        (int(day) + 3) // 7  # 1970-01-01 was a Thursday: weeks begin on Monday
        for block, rows in zip(demand.blocks, above, strict=True)
        for day in np.asarray(block.day)[rows.any(axis=1)]
    }
    cluster = sum(int(rows.sum()) for rows in above) / max(len(weeks), 1)
    return 1.0 / (count / max(cluster, 1.0) + 1.0)


def curve_levels(demand: GroupDemand, highest_kw: float) -> NDArray[np.float64]:
    """Levels from the lowest median to well past the highest rating or the 1-in-10 000 level, equally spaced. [kW]"""
    present = [hour for row in demand.hours for hour in row if hour is not None]
    low = min(hour.quantile_kw(0.5) for hour in present)
    high = max(max(hour.quantile_kw(1e-4) for hour in present), 1.05 * highest_kw)
    return np.linspace(low, high, CURVE_POINTS)


def exceedance_rows(
    demand: GroupDemand, found: ExceedanceTable, ratings_kva: Sequence[float], of: str
) -> tuple[ExceedanceRow, ...]:
    """One row for each rating, from the exceedance of its level in ``found.levels``."""
    hours = demand.hours_in_year()
    rows = []
    for rating, level in zip(ratings_kva, found.levels, strict=True):
        normal = sum(
            hours[b, i] * hour.normal_exceedance(float(level.level_kva[b]) * hour.power_factor)
            for b, row in enumerate(demand.hours)
            for i, hour in enumerate(row)
            if hour is not None
        )
        largest = level.largest_probability
        rows.append(
            ExceedanceRow(
                rating_kva=rating,
                of=of,
                level_kva=float(level.level_kva.min()),
                hours_per_year=level.year.expected_h,
                hours_low=_or_nan(level.year.low_h),
                hours_high=_or_nan(level.year.high_h),
                hours_lower=level.year.lower_h,
                hours_upper=level.year.upper_h,
                highest_probability=_or_nan(largest.value if largest else None),
                highest_low=_or_nan(largest.low if largest else None),
                highest_high=_or_nan(largest.high if largest else None),
                floor=_or_nan(largest.floor if largest else None),
                highest_at=Place(
                    season=level.largest_season,
                    day_type=level.largest_day_type,
                    interval=level.largest_interval,
                    starts=clock_text(level.largest_interval, demand.interval_min),
                )
                if largest
                else None,
                normal_factor=normal / level.year.expected_h if level.year.expected_h > 0.0 else float("nan"),
            )
        )
    return tuple(rows)


def _or_nan(value: float | None) -> float:
    return float("nan") if value is None else value
