"""Response of demand to the day's temperature: piecewise linear in heating and cooling degrees.

Given the temperature, the customers' responses add up, so the sum's response is found from the sum and each
customer's is taken out of its own readings; mixing over a record of temperatures is then one more term of the sum.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.lattice import LatticeMass

HEATING_BASE_C = 15.0  # common practice without a source; the fit only needs the kink to lie near the true ones
COOLING_BASE_C = 20.0  # common practice without a source
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


def degrees(temperature_c: NDArray[np.float64]) -> NDArray[np.float64]:
    """Heating and cooling degrees of a temperature, (n, 2) float64. [K]"""
    return np.stack(
        [np.maximum(HEATING_BASE_C - temperature_c, 0.0), np.maximum(temperature_c - COOLING_BASE_C, 0.0)], axis=1
    )


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
    kw: NDArray[np.float64], temperature_c: NDArray[np.float64], weight: NDArray[np.float64]
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

    Returns
    -------
    (C, D) float64
        Readings as they would have been at the mean of the metered degrees. Readings on days of unknown temperature
        are NaN. [kW]
    TemperatureResponse or None
        None where there are too few days or the temperature does not move.
    """
    known = np.isfinite(temperature_c)
    if known.sum() < 10:
        return kw, None
    away_all = degrees(np.where(known, temperature_c, 0.0))
    columns = tuple(k for k in (0, 1) if np.ptp(away_all[known, k]) > 3.0 and (away_all[known, k] > 0.0).mean() > 0.15)
    if not columns:
        return kw, None
    design = away_all[:, list(columns)]
    centre = design[known].mean(axis=0)
    away = np.where(known[:, None], design - centre, 0.0)
    counted = weight > 0.0
    total = weight[counted] @ kw[counted]
    used = known & np.isfinite(total)
    if used.sum() < 10:
        return kw, None
    slope, covariance, keep, explained = _fit(away[used], total[used])
    adjusted = np.where(known, kw, np.nan)
    for c in range(kw.shape[0]):
        own = known & np.isfinite(kw[c])
        if own.sum() >= 10:
            own_slope = np.linalg.lstsq(away[own] - away[own].mean(axis=0), kw[c, own] - kw[c, own].mean(), rcond=None)[
                0
            ]
            adjusted[c] = adjusted[c] - away @ (own_slope * keep)
    return adjusted, TemperatureResponse(
        columns=columns,
        centre=centre,
        slope_kw_per_k=slope * keep,
        covariance=covariance,
        lowest_c=float(temperature_c[known].min()),
        highest_c=float(temperature_c[known].max()),
        explained=explained,
    )


def _fit(
    away: NDArray[np.float64], total: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64], float, float]:
    """Slopes, their covariance, the factor by which they are shrunk (1 - 1/F, at least 0) and the share explained."""
    centred = away - away.mean(axis=0)
    moved = total - total.mean()
    slope = np.linalg.lstsq(centred, moved, rcond=None)[0]
    left = moved - centred @ slope
    free = max(total.size - away.shape[1] - 1, 1)
    variance = float(left @ left) / free
    covariance = variance * np.linalg.pinv(centred.T @ centred)
    gained = float(moved @ moved - left @ left) / away.shape[1]
    keep = max(0.0, 1.0 - variance / gained) if gained > 0.0 else 0.0
    explained = 1.0 - float(left @ left) / float(moved @ moved) if float(moved @ moved) > 0.0 else 0.0
    return slope, covariance * keep, keep, explained * keep
