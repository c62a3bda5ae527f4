"""Readings of a group of customers -> its demand model, hour by hour."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.convolution import BracketedSum, DemandSum
from loadsum.demand.customerclass import borrowed, relative_readings, weighted_variance
from loadsum.demand.dependence import (
    CommonComponent,
    common_component,
    group_movement,
    kernel_bandwidth,
    smoothing_weights,
)
from loadsum.demand.hourly import GroupDemand, HourDemand, with_normal, with_term
from loadsum.demand.lattice import LatticeMass, lattice_mass
from loadsum.demand.samplingerror import Resamples, resample_weeks
from loadsum.demand.settings import ModelSettings
from loadsum.demand.temperature import TemperatureResponse, take_out_temperature
from loadsum.intake.hourclass import DayBlock

FEWEST_DAYS = 2


def group_demand(
    blocks: Sequence[DayBlock],
    *,
    interval_min: int,
    power_factor: float,
    settings: ModelSettings,
    resolution_kw: float = 0.0,
    record_c: Mapping[tuple[str, str], NDArray[np.float64]] | None = None,
    reference: Sequence[NDArray[np.float64]] | None = None,
    rng: np.random.Generator | None = None,
) -> GroupDemand:
    """Demand model of a group of metered customers.

    Parameters
    ----------
    blocks : sequence of DayBlock
        Readings of the group's customers.
    interval_min : int
        Demand interval. [min]
    power_factor : float
        Power factor of the group. [-]
    settings : ModelSettings
        Parts of the model that are on.
    resolution_kw : float
        Resolution that all meters share, as demand; 0 where unknown. [kW]
    record_c : mapping of (season, day type) to (n,) float64 or None
        Lagged daily means of the temperature record over which the year is mixed; the metered days when None. [°C]
    reference : sequence of (R, D, I) float64 or None
        Readings of further customers of the class that are not served, one array a block. [kW]
    rng : numpy.random.Generator or None
        Source of randomness of the intervals; needed where the settings ask for resamples.
    """
    if settings.resamples and rng is None:
        raise ValueError(f"{settings.resamples} resamples need a random generator")
    hours, sums = [], []
    for b, block in enumerate(blocks):
        others = None if reference is None else reference[b]
        record = None if record_c is None else record_c.get((block.season, block.day_type))
        made, observed = _block(block, others, record, interval_min, power_factor, settings, resolution_kw, rng)
        hours.append(made)
        sums.append(observed)
    return GroupDemand(
        interval_min=interval_min, blocks=tuple(blocks), hours=tuple(hours), sums_kw=tuple(sums), settings=settings
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Adjusted:
    """Readings of one block with the temperature response taken out, and the responses by interval."""

    kw: NDArray[np.float64]
    responses: tuple[TemperatureResponse | None, ...]


def _block(
    block: DayBlock,
    others: NDArray[np.float64] | None,
    record_c: NDArray[np.float64] | None,
    interval_min: int,
    power_factor: float,
    settings: ModelSettings,
    resolution_kw: float,
    rng: np.random.Generator | None,
) -> tuple[tuple[HourDemand | None, ...], NDArray[np.float64]]:
    """Every interval of one class of days, and the observed sums."""
    intervals = block.kw.shape[2]
    observed = block.kw.sum(axis=0)
    observed.flags.writeable = False
    enough = (np.isfinite(block.kw).sum(axis=1) >= FEWEST_DAYS).all(axis=0)
    if not enough.any():
        return (None,) * intervals, observed
    adjusted = _without_temperature(block, settings)
    common = common_component(adjusted.kw, settings.smoothing_h * 60.0 / interval_min)
    raw = common_component(block.kw, settings.smoothing_h * 60.0 / interval_min)
    target = _target_variance(common)
    target_raw = _target_variance(raw)
    week = _mean_variance(adjusted.kw.sum(axis=0), block.day)
    record = block.temperature_c if record_c is None else record_c
    sums = adjusted.kw.sum(axis=0)
    resamples: tuple[Resamples | None, ...] = (None,) * intervals
    if rng is not None:
        resamples = resample_weeks(observed, block.day, settings.resamples, rng)
    return tuple(
        _hour(
            block,
            adjusted,
            others,
            sums,
            i,
            float(target[i]),
            float(target_raw[i]),
            float(week[i]),
            record,
            interval_min,
            power_factor,
            settings,
            resolution_kw,
            resamples[i],
        )
        if enough[i]
        else None
        for i in range(intervals)
    ), observed


def _without_temperature(block: DayBlock, settings: ModelSettings) -> _Adjusted:
    intervals = block.kw.shape[2]
    if not settings.temperature or block.temperature_c is None:
        return _Adjusted(kw=block.kw, responses=(None,) * intervals)
    kw = np.array(block.kw)
    responses = []
    for i in range(intervals):
        kw[:, :, i], response = take_out_temperature(block.kw[:, :, i], block.temperature_c)
        responses.append(response)
    return _Adjusted(kw=kw, responses=tuple(responses))


def _target_variance(common: CommonComponent) -> NDArray[np.float64]:
    """Variance that the model must have: the customers' own plus the smoothed covariance, which is not negative."""
    single = common.independent_variance_kw2
    # pairs of standard deviations that the mean correlation multiplies, from the interval's own variances
    pairs = common.pairs_kw2
    return np.asarray(single + np.maximum(common.correlation, 0.0) * pairs, dtype=np.float64)


def _mean_variance(sums_kw: NDArray[np.float64], day: NDArray[np.int64]) -> NDArray[np.float64]:
    """Variance of the mean of the sum with weeks as blocks, at least that of independent days, smoothed, (I,). [kW²]"""
    intervals = sums_kw.shape[1]
    week = (day + 3) // 7  # 1970-01-01 was a Thursday: weeks begin on Monday
    found = np.zeros(intervals)
    for i in range(intervals):
        known = np.isfinite(sums_kw[:, i])
        if known.sum() < 2:
            continue
        values, weeks = sums_kw[known, i], week[known]
        away = values - values.mean()
        _, place = np.unique(weeks, return_inverse=True)
        blocks = np.bincount(place, weights=away)
        count = blocks.size
        by_week = float(blocks @ blocks) / values.size**2 * count / max(count - 1, 1)
        found[i] = max(by_week, float(away @ away) / values.size / max(values.size - 1, 1))
    return np.asarray(smoothing_weights(intervals, 1.5) @ found, dtype=np.float64)


def _hour(
    block: DayBlock,
    adjusted: _Adjusted,
    others: NDArray[np.float64] | None,
    sums_kw: NDArray[np.float64],
    i: int,
    target_kw2: float,
    target_raw_kw2: float,
    mean_variance_kw2: float,
    record_c: NDArray[np.float64] | None,
    interval_min: int,
    power_factor: float,
    settings: ModelSettings,
    resolution_kw: float,
    resamples: Resamples | None,
) -> HourDemand:
    own = [row[np.isfinite(row)] for row in adjusted.kw[:, :, i]]
    raw = [row[np.isfinite(row)] for row in block.kw[:, :, i]]
    spread = max(target_kw2, target_raw_kw2) ** 0.5
    step = settings.lattice_kw or lattice_step(raw, spread, resolution_kw)
    relative = relative_readings(adjusted.kw[:, :, i])
    if others is not None:
        relative = [*relative, *relative_readings(others[:, :, i])]
    down, up, variance = [], [], 0.0
    for c, values in enumerate(own):
        if adjusted.responses[i] is not None:
            values = np.rint(values / step) * step
        low, high, part = _customer(values, relative, c, settings, step)
        down.append(low)
        up.append(high)
        variance += part
    exact = all(a is b for a, b in zip(down, up, strict=True))
    lower = DemandSum(terms=tuple(down), counts=(1,) * len(down))
    still = BracketedSum(down=lower, up=lower if exact else DemandSum(terms=tuple(up), counts=(1,) * len(up)))
    if settings.common_component:
        left = max(target_kw2 - variance, 0.0)
        shape = group_movement(sums_kw, i, settings.neighbour_hours)
        width = kernel_bandwidth(shape)
        scale = left**0.5 / (1.0 + width**2) ** 0.5
        still = with_term(still, shape * scale, np.full(shape.size, 1.0 / shape.size), width * scale)
    if settings.mean_uncertainty:
        still = with_normal(still, mean_variance_kw2**0.5)
    response = adjusted.responses[i]
    total = still
    if response is not None and record_c is not None:
        days = record_c[np.isfinite(record_c)]
        shift, wide = response.shift_kw(days), float(response.shift_variance_kw2(days).mean()) ** 0.5
        total = with_term(still, shift, np.full(days.size, 1.0 / days.size), wide)
    nearest = DemandSum(terms=tuple(_nearest(values, step) for values in raw), counts=(1,) * len(raw))
    whole_down = total.down.plain_distribution()
    return HourDemand(
        season=block.season,
        day_type=block.day_type,
        interval=i,
        interval_min=interval_min,
        n_days=min(values.size for values in own),
        total=total,
        whole_down=whole_down,
        whole_up=whole_down if total.exact else total.up.plain_distribution(),
        still=still,
        response=response,
        independent=nearest.plain_distribution(),
        covariance_variance_kw2=target_raw_kw2,
        power_factor=power_factor,
        mean_variance_kw2=mean_variance_kw2 if settings.mean_uncertainty else 0.0,
        resamples=resamples,
    )


def _customer(
    values: NDArray[np.float64], relative: list[NDArray[np.float64]], c: int, settings: ModelSettings, step: float
) -> tuple[LatticeMass, LatticeMass, float]:
    """Predictive distribution of one customer rounded down and up (one object where exact), and its variance."""
    extra, share = borrowed(relative, c, float(values.mean())) if settings.shrinkage else (np.empty(0), np.empty(0))
    weight = settings.borrowed_days / (settings.borrowed_days + values.size) if extra.size else 0.0
    # a borrowed reading is stated to the lattice, as a meter would state it; only own readings are rounded outward
    points = np.concatenate([values, np.rint(extra / step) * step])
    weights = np.concatenate([np.full(values.size, (1.0 - weight) / values.size), share * weight])
    variance = weighted_variance(points, weights)
    down = lattice_mass(points, step, "down", weights)
    up = lattice_mass(points, step, "up", weights)
    if down.offset == up.offset and down.mass.size == up.mass.size and np.array_equal(down.mass, up.mass):
        up = down
    return down, up, variance


def _nearest(values: NDArray[np.float64], step: float) -> LatticeMass:
    return lattice_mass(np.rint(values / step) * step, step, "down")


MOST_POINTS = 2**14


def lattice_step(readings: Sequence[NDArray[np.float64]], spread_kw: float, resolution_kw: float) -> float:
    """Step of the lattice on which a group's demands are summed. [kW]

    A whole fraction of the meters' resolution, so that their readings need no rounding, or where they share none a
    step so fine that rounding every customer outward hardly moves the sum; either as far as the number of points
    stays affordable.
    """
    reach = sum(float(np.ptp(row)) for row in readings)
    coarsest = max(reach / MOST_POINTS, 1e-5)
    if resolution_kw > 0.0:
        fine = max(0.001 * spread_kw, coarsest)
        return resolution_kw / max(int(np.ceil(resolution_kw / fine)), 1) if fine < resolution_kw else resolution_kw
    return max(0.003 * spread_kw / len(readings), coarsest)
