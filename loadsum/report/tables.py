"""Tables of the results that are read off the demand model: coverage, customers, hours, the exceedance curve."""

import datetime as dt
from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand, HourDemand
from loadsum.intake.hourclass import EPOCH
from loadsum.intake.readings import Readings
from loadsum.peak.exceedance import exceedance_hours
from loadsum.report.results import Coverage, Curve, CustomerRow, ExceedanceRow, HourRow, Place
from loadsum.study.tables import Customer

CURVE_POINTS = 120


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
    """One row for each customer of the study, metered or not."""
    place = {name: index for index, name in enumerate(readings.customers)}
    rows = []
    for customer in customers:
        index = place.get(customer.id)
        kw = readings.kw[index] if index is not None else np.empty(0)
        known = np.isfinite(kw)
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

    def averaged(one: Callable[[HourDemand, float], float]) -> NDArray[np.float64]:
        by_hour = np.array([[one(hour, float(level)) for level in levels_kw] for _, _, hour in present])
        return np.asarray(by_hour.T @ weight, dtype=np.float64)

    observed = np.zeros(levels_kw.size)
    for share, (b, i, _) in zip(weight, present, strict=True):
        sums = demand.sums_kw[b][:, i]
        sums = sums[np.isfinite(sums)]
        if sums.size:
            observed += share * (sums[:, None] > levels_kw).mean(axis=0)
    probabilities = [[hour.exceedance(float(level)) for level in levels_kw] for _, _, hour in present]
    return Curve(
        levels_kw=levels_kw,
        adopted=np.array([[p.value for p in row] for row in probabilities]).T @ weight,
        lower=np.array([[p.lower for p in row] for row in probabilities]).T @ weight,
        upper=np.array([[p.upper for p in row] for row in probabilities]).T @ weight,
        independent=averaged(lambda hour, level: hour.independent_exceedance(level)),
        normal=averaged(lambda hour, level: hour.normal_exceedance(level)),
        normal_independent=averaged(lambda hour, level: hour.normal_independent_exceedance(level)),
        observed=observed,
        floor=float(np.array([hour.exceedance(0.0).floor for _, _, hour in present]) @ weight),
    )


def curve_levels(demand: GroupDemand, highest_kw: float) -> NDArray[np.float64]:
    """Levels from the lowest median to well past the highest rating or the 1-in-10 000 level, equally spaced. [kW]"""
    present = [hour for row in demand.hours for hour in row if hour is not None]
    low = min(hour.quantile_kw(0.5) for hour in present)
    high = max(max(hour.quantile_kw(1e-4) for hour in present), 1.05 * highest_kw)
    return np.linspace(low, high, CURVE_POINTS)


def exceedance_rows(demand: GroupDemand, ratings_kva: Sequence[float]) -> tuple[ExceedanceRow, ...]:
    """Exceedance of each rating's nameplate over the covered hours of the year."""
    hours = demand.hours_in_year()
    rows = []
    for rating in ratings_kva:
        found = exceedance_hours(demand, {"nameplate": rating})["nameplate"]
        b, i = np.unravel_index(int(np.nanargmax(found.probability)), found.probability.shape)
        year = found.year
        normal = 0.0
        for bb, row in enumerate(demand.hours):
            for ii, hour in enumerate(row):
                if hour is not None:
                    normal += hours[bb, ii] * hour.normal_exceedance(rating * hour.power_factor)
        rows.append(
            ExceedanceRow(
                rating_kva=rating,
                of="nameplate",
                level_kva=rating,
                hours_per_year=year.expected_h,
                hours_low=float("nan") if year.low_h is None else year.low_h,
                hours_high=float("nan") if year.high_h is None else year.high_h,
                highest_probability=float(found.probability[b, i]),
                highest_low=float(found.low[b, i]),
                highest_high=float(found.high[b, i]),
                floor=float(found.floor[b, i]),
                highest_at=Place(
                    season=demand.blocks[b].season,
                    day_type=demand.blocks[b].day_type,
                    interval=int(i),
                    starts=clock_text(int(i), demand.interval_min),
                ),
                normal_factor=normal / year.expected_h if year.expected_h > 0.0 else float("nan"),
            )
        )
    return tuple(rows)
