"""Response of demand to the day's temperature: piecewise linear in heating and cooling degrees.

Given the temperature, the customers' responses add up, so the sum's response is found from the sum and each
customer's is taken out of its own readings; mixing over a record of temperatures is then one more term of the sum.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.degrees import degrees
from loadsum.demand.lattice import LatticeMass
from loadsum.demand.temperaturepool import PooledResponse, nothing_pooled

FEWEST_DAYS = 10  # of a class of days, below which it has no response
LEAST_DEGREES_K = 3.0  # spread of a column of degrees below which a class of days says nothing of its own
LEAST_LEVEL = 0.2  # share of the mean level below which the spread falls no further


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TemperatureResponse:
    """Response of a group in one demand interval of one class of days.

    Parameters
    ----------
    columns : tuple of int
        Which of heating and cooling degrees (0 and 1) vary enough on the metered days to be fitted.
    centre : (k,) float64
        Mean degrees on the metered days. [K]
    slope_kw_per_k : (k,) float64
        Response of the sum, after shrinking by its own uncertainty. [kW/K]
    covariance : (k, k) float64
        Covariance of the slopes. [kW²/K²]
    lowest_c, highest_c : float
        Metered range of the lagged daily mean. [°C]
    explained : float
        Share of the sum's variance that the response explains. [-]
    power : float
        Power of the level with which the spread grows; 0 for none. [-]
    level_kw : float
        Mean level that the power refers to. [kW]
    unit : float
        Root mean square, over the metered days, of the stretch before it is divided by this. [-]
    """

    columns: tuple[int, ...]
    centre: NDArray[np.float64]
    slope_kw_per_k: NDArray[np.float64]
    covariance: NDArray[np.float64]
    lowest_c: float
    highest_c: float
    explained: float
    power: float = 0.0
    level_kw: float = 1.0
    unit: float = 1.0

    def stretch(self, temperature_c: NDArray[np.float64]) -> NDArray[np.float64]:
        """Spread at each temperature relative to that over the metered days, (n,) float64. [-]"""
        level = np.clip(1.0 + self.shift_kw(temperature_c) / self.level_kw, LEAST_LEVEL, None)
        return np.asarray(level**self.power / self.unit, dtype=np.float64)

    def shift_kw(self, temperature_c: NDArray[np.float64]) -> NDArray[np.float64]:
        """Shift of the sum's mean at each temperature, (n,) float64. [kW]"""
        away = degrees(temperature_c)[:, list(self.columns)] - self.centre
        return np.asarray(away @ self.slope_kw_per_k, dtype=np.float64)

    def shift_variance_kw2(self, temperature_c: NDArray[np.float64]) -> NDArray[np.float64]:
        """Variance of that shift from the uncertainty of the slopes, (n,) float64. [kW²]"""
        away = degrees(temperature_c)[:, list(self.columns)] - self.centre
        return np.asarray(np.einsum("nk,kl,nl->n", away, self.covariance, away), dtype=np.float64)


def stretched_mass(law: LatticeMass, stretch: float, shift_kw: float) -> LatticeMass:
    """A law stretched about its mean and shifted, stated to the lattice with mean kept.

    Parameters
    ----------
    law : LatticeMass
        The law.
    stretch : float
        Factor on its distances from the mean, above 0. [-]
    shift_kw : float
        Shift of its mean. [kW]
    """
    mean = law.mean_kw()
    place = (mean + shift_kw + stretch * (law.points_kw - mean)) / law.step_kw
    first = np.floor(place).astype(np.int64)
    share = place - first
    low = int(first[0])
    mass = np.zeros(int(first[-1]) - low + 2)
    np.add.at(mass, first - low, law.mass * (1.0 - share))
    np.add.at(mass, first + 1 - low, law.mass * share)
    return LatticeMass(
        step_kw=law.step_kw,
        offset=low,
        mass=mass,
        beyond_below=law.beyond_below,
        beyond_above=law.beyond_above,
    )


def take_out_temperature(
    kw: NDArray[np.float64],
    temperature_c: NDArray[np.float64],
    weight: NDArray[np.float64],
    pooled: PooledResponse | None = None,
) -> tuple[NDArray[np.float64], TemperatureResponse | None]:
    """Readings of one demand interval with each customer's temperature response taken out, and the group's response.

    Parameters
    ----------
    kw : (C, D) float64
        Readings; NaN where missing. [kW]
    temperature_c : (D,) float64
        Lagged daily mean temperature; NaN where unknown. [°C]
    weight : (C,) float64
        How many times each customer counts in the group. [-]
    pooled : PooledResponse or None
        Response over all classes of days, from which this one departs as far as its own days show; None for none.

    Returns
    -------
    (C, D) float64
        Readings as they would have been at the mean of the metered degrees, scattered about it as if the slopes had
        been known. Readings on days of unknown temperature are NaN. [kW]
    TemperatureResponse or None
        None where there are too few days or the temperature does not move.
    """
    pooled = pooled or nothing_pooled(kw.shape[0])
    known = np.isfinite(temperature_c)
    counted = weight > 0.0
    total = weight[counted] @ kw[counted]
    used = known & np.isfinite(total)
    if used.sum() < FEWEST_DAYS:
        return kw, None
    need = degrees(np.where(known, temperature_c, 0.0))
    own = [k for k in (0, 1) if np.ptp(need[known, k]) > LEAST_DEGREES_K and (need[known, k] > 0.0).mean() > 0.15]
    columns = [k for k in (0, 1) if k in own or (pooled.group_kw_per_k[k] != 0.0 and np.ptp(need[known, k]) > 0.0)]
    if not columns:
        return kw, None
    centre = need[known].mean(axis=0)
    away = np.where(known[:, None], need - centre, 0.0)
    slope, covariance = np.array(pooled.group_kw_per_k), np.array(pooled.covariance)
    left = total - away @ slope
    keep = 0.0
    if own:
        more, of_more, keep = _fit(away[used][:, own], left[used])
        slope[own] += more * keep
        covariance[np.ix_(own, own)] = (1.0 - keep) * covariance[np.ix_(own, own)] + of_more
    adjusted = np.where(known, kw, np.nan)
    for c in range(kw.shape[0]):
        mine = known & np.isfinite(kw[c])
        adjusted[c] -= away @ pooled.customer_kw_per_k[c]
        if keep > 0.0 and mine.sum() >= FEWEST_DAYS:
            x, y = away[mine][:, own], adjusted[c, mine]
            departure = np.linalg.lstsq(x - x.mean(axis=0), y - y.mean(), rcond=None)[0] * keep
            rest = adjusted[c] - away[:, own] @ departure
            own_mean, free = float(rest[mine].mean()), mine.sum() - 1.0
            adjusted[c] = own_mean + (rest - own_mean) * (free / max(free - keep * len(own), 1.0)) ** 0.5
    return adjusted, TemperatureResponse(
        columns=tuple(columns),
        centre=centre[columns].copy(),
        slope_kw_per_k=slope[columns].copy(),
        covariance=covariance[np.ix_(columns, columns)].copy(),
        lowest_c=float(temperature_c[known].min()),
        highest_c=float(temperature_c[known].max()),
        explained=_explained(total[used], away[used] @ slope),
    )


def _explained(total: NDArray[np.float64], by_temperature: NDArray[np.float64]) -> float:
    """Share of the sum's variance that a response explains. [-]"""
    moved = total - total.mean()
    left = moved - (by_temperature - by_temperature.mean())
    whole = float(moved @ moved)
    return max(1.0 - float(left @ left) / whole, 0.0) if whole > 0.0 else 0.0


def _fit(
    away: NDArray[np.float64], total: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64], float]:
    """Slopes, their covariance after shrinking, and the factor by which they are shrunk (1 - 1/F, at least 0)."""
    centred = away - away.mean(axis=0)
    moved = total - total.mean()
    slope = np.linalg.lstsq(centred, moved, rcond=None)[0]
    left = moved - centred @ slope
    free = max(total.size - away.shape[1] - 1, 1)
    variance = float(left @ left) / free
    covariance = variance * np.linalg.pinv(centred.T @ centred)
    gained = float(moved @ moved - left @ left) / away.shape[1]
    keep = max(0.0, 1.0 - variance / gained) if gained > 0.0 else 0.0
    return slope, covariance * keep, keep
