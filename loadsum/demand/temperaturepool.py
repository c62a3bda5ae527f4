"""Response to temperature over all classes of days together: what a class whose own days say little falls back on.

The kelvin that heat a house in March heat it in January too. So the slopes of one interval of the day are found from
all classes, each with a level of its own; a class of days departs from them only as far as its own days show.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.degrees import degrees
from loadsum.intake.hourclass import DayBlock
from loadsum.intake.readings import read_only

FEWEST_DAYS = 20  # days of all classes together below which nothing is pooled
LEAST_DEGREES_K = 3.0  # spread of a column of degrees below which it says nothing
FEWEST_WARM_OR_COLD = 5  # days on which a column of degrees is above nothing


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PooledResponse:
    """Slopes of one interval of the day over all classes of days; zero where nothing could be said.

    Parameters
    ----------
    group_kw_per_k : (2,) float64
        Slopes of the group on heating and cooling degrees, shrunk by their own uncertainty. [kW/K]
    covariance : (2, 2) float64
        Covariance of those slopes. [kW²/K²]
    customer_kw_per_k : (C, 2) float64
        Slopes of each customer, shrunk alike. [kW/K]
    """

    group_kw_per_k: NDArray[np.float64]
    covariance: NDArray[np.float64]
    customer_kw_per_k: NDArray[np.float64]

    def __post_init__(self) -> None:
        for array in (self.group_kw_per_k, self.covariance, self.customer_kw_per_k):
            read_only(array)


def nothing_pooled(customers: int) -> PooledResponse:
    """No response, for classes that stand alone."""
    return PooledResponse(
        group_kw_per_k=np.zeros(2), covariance=np.zeros((2, 2)), customer_kw_per_k=np.zeros((customers, 2))
    )


def pooled_over(blocks: Sequence[DayBlock], weight: NDArray[np.float64]) -> list[PooledResponse | None]:
    """Slopes of every interval of the day over all classes of days; None where fewer than two have temperatures.

    Parameters
    ----------
    blocks : sequence of DayBlock
        Readings by class of days.
    weight : (C,) float64
        How many times each customer counts in the group. [-]
    """
    intervals = blocks[0].kw.shape[2]
    given = [(block.kw, block.temperature_c) for block in blocks if block.temperature_c is not None]
    if len(given) < 2:
        return [None] * intervals
    warmth = [temperature for _, temperature in given]
    return [pooled_response([kw[:, :, i] for kw, _ in given], warmth, weight) for i in range(intervals)]


def pooled_response(
    kw: Sequence[NDArray[np.float64]], temperature_c: Sequence[NDArray[np.float64]], weight: NDArray[np.float64]
) -> PooledResponse:
    """Slopes of one interval of the day over all classes of days.

    Parameters
    ----------
    kw : sequence of (C, D) float64
        Readings of the interval by class of days; NaN where missing. [kW]
    temperature_c : sequence of (D,) float64
        Lagged daily mean temperature of the same days; NaN where unknown. [°C]
    weight : (C,) float64
        How many times each customer counts in the group. [-]
    """
    counted = weight > 0.0
    total = [weight[counted] @ part[counted] for part in kw]
    pairs = [_centred(sums[None, :], warmth) for sums, warmth in zip(total, temperature_c, strict=True)]
    away, moved = np.concatenate([p[0][0] for p in pairs]), np.concatenate([p[1][0] for p in pairs])
    above = sum((degrees(t[np.isfinite(t)]) > 0.0).sum(axis=0) for t in temperature_c)
    columns = [k for k in (0, 1) if np.ptp(away[:, k], axis=0) > LEAST_DEGREES_K and above[k] >= FEWEST_WARM_OR_COLD]
    found = nothing_pooled(weight.size)
    if moved.size < FEWEST_DAYS or not columns:
        return found
    x = away[:, columns]
    inverse = np.linalg.pinv(x.T @ x)
    slope = inverse @ (x.T @ moved)
    left = moved - x @ slope
    variance = float(left @ left) / max(moved.size - len(kw) - len(columns), 1)
    gained = float(moved @ moved - left @ left) / len(columns)
    keep = max(0.0, 1.0 - variance / gained) if gained > 0.0 else 0.0
    group, covariance, customers = np.zeros(2), np.zeros((2, 2)), np.zeros((weight.size, 2))
    group[columns] = slope * keep
    covariance[np.ix_(columns, columns)] = variance * inverse * keep
    products, squares = np.zeros((weight.size, 2)), np.zeros((weight.size, 2, 2))
    for part, warmth in zip(kw, temperature_c, strict=True):
        for c, (own_away, own_moved) in enumerate(zip(*_centred(part, warmth), strict=True)):
            products[c] += own_away.T @ own_moved
            squares[c] += own_away.T @ own_away
    for c in range(weight.size):
        if np.all(np.diag(squares[c])[columns] > 0.0):
            customers[c, columns] = np.linalg.pinv(squares[c][np.ix_(columns, columns)]) @ products[c, columns] * keep
    return PooledResponse(group_kw_per_k=group, covariance=covariance, customer_kw_per_k=customers)


def _centred(
    rows: NDArray[np.float64], temperature_c: NDArray[np.float64]
) -> tuple[list[NDArray[np.float64]], list[NDArray[np.float64]]]:
    """Degrees and demand of each row's known days, each less its mean, lists of (n, 2) and (n,)."""
    need = degrees(np.where(np.isfinite(temperature_c), temperature_c, 0.0))
    away, moved = [], []
    for row in rows:
        known = np.isfinite(row) & np.isfinite(temperature_c)
        own = need[known]
        away.append(own - own.mean(axis=0) if known.any() else own)
        moved.append(row[known] - row[known].mean() if known.any() else row[known])
    return away, moved
