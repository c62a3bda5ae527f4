"""Spread that grows with the level: cold or hot days move demand, and scatter it more.

Given the temperature, the group's demand is a shifted law stretched by a power of its level, s(T) = (m(T) / m)^p: p = 0
is no stretching, p = 1/2 what independent switching makes, p = 1 a spread in proportion. One power serves a class of
days; it is found from the squares of what temperature leaves unexplained, and shrunk by its own uncertainty.
"""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.convolution import BracketedSum, DemandSum, plain_distributions
from loadsum.demand.hourly import with_term
from loadsum.demand.lattice import LatticeMass, mixture
from loadsum.demand.temperature import TemperatureResponse, stretched_mass

CAUTION = 2.0  # standard errors that the power is shrunk by
CLASSES = 16  # classes of temperature over which stretched laws are mixed


def spread_taken_out(
    adjusted: NDArray[np.float64],
    temperature_c: NDArray[np.float64],
    weight: NDArray[np.float64],
    responses: Sequence[TemperatureResponse | None],
) -> tuple[NDArray[np.float64], tuple[TemperatureResponse | None, ...]]:
    """Readings with the effect of temperature on their spread taken out as well, and the responses that carry it.

    Parameters
    ----------
    adjusted : (C, D, I) float64
        Readings with each customer's shift by temperature taken out. [kW]
    temperature_c : (D,) float64
        Lagged daily mean temperature; NaN where unknown. [°C]
    weight : (C,) float64
        How many times each customer counts in the group. [-]
    responses : sequence of I TemperatureResponse or None
        Shift of the group in each interval.
    """
    counted = weight > 0.0
    total = np.einsum("c,cdi->di", weight[counted], adjusted[counted])
    known = np.isfinite(temperature_c)
    warmth = np.where(known, temperature_c, 0.0)
    logs, squares, days, given = [], [], [], []
    for i, response in enumerate(responses):
        used = known & np.isfinite(total[:, i])
        if response is None or used.sum() < 10:
            continue
        mean = float(total[used, i].mean())
        away = total[used, i] - mean
        spread = float(away.std())
        if mean <= 0.0 or spread == 0.0:
            continue
        given.append((i, mean))
        level = np.log(replace(response, power=1.0, level_kw=mean).stretch(warmth[used]))
        logs.append(level - level.mean())
        square = np.log(away**2 + (0.05 * spread) ** 2)
        squares.append(square - square.mean())
        days.append(np.flatnonzero(used))
    power = _power(logs, squares, days, temperature_c.size)
    if power == 0.0:
        return adjusted, tuple(responses)
    found, out = list(responses), np.array(adjusted)
    for i, mean in given:
        before = responses[i]
        assert before is not None
        made = replace(before, power=power, level_kw=mean)
        used = known & np.isfinite(total[:, i])
        made = replace(made, unit=float((made.stretch(warmth[used]) ** 2).mean()) ** 0.5)
        found[i] = made
        there = np.isfinite(out[:, :, i]) & known
        centre = np.where(there, out[:, :, i], 0.0).sum(axis=1, keepdims=True)
        centre = centre / np.maximum(there.sum(axis=1, keepdims=True), 1)
        out[:, :, i] = centre + (out[:, :, i] - centre) / made.stretch(warmth)
    return out, tuple(found)


def _power(
    logs: list[NDArray[np.float64]], squares: list[NDArray[np.float64]], days: list[NDArray[np.int64]], count: int
) -> float:
    """Half the slope of the log square on the log level, shrunk by its uncertainty (days as clusters), 0 to 1. [-]"""
    if not logs:
        return 0.0
    x, y, day = np.concatenate(logs), np.concatenate(squares), np.concatenate(days)
    if not x @ x > 0.0:
        return 0.0
    slope = float(x @ y) / float(x @ x)
    by_day = np.bincount(day, weights=x * (y - slope * x), minlength=count)
    error = CAUTION * float(by_day @ by_day) ** 0.5 / float(x @ x)
    if slope <= error:
        return 0.0
    return float(min(0.5 * slope * (1.0 - (error / slope) ** 2), 1.0))


def mixed_over(still: BracketedSum, response: TemperatureResponse, days_c: NDArray[np.float64]) -> BracketedSum:
    """The law of a day of any temperature: shifted and stretched laws mixed over days of a record.

    Parameters
    ----------
    still : BracketedSum
        The law without temperature.
    response : TemperatureResponse
        Shift and stretch.
    days_c : (n,) float64
        Lagged daily means. [°C]
    """
    shift = response.shift_kw(days_c)
    spread = float(response.shift_variance_kw2(days_c).mean()) ** 0.5
    if response.power == 0.0:
        return with_term(still, shift, np.full(days_c.size, 1.0 / days_c.size), spread)
    order = np.argsort(shift)
    parts = np.array_split(order, min(CLASSES, days_c.size))
    stretch = response.stretch(days_c)
    left = shift.copy()
    sides: list[LatticeMass] = []
    for law in plain_distributions(still):
        laws = []
        for part in parts:
            middle = float(shift[part].mean())
            left[part] = shift[part] - middle
            laws.append(stretched_mass(law, float((stretch[part] ** 2).mean()) ** 0.5, middle))
        sides.append(mixture(laws, [float(part.size) for part in parts]))
    down, up = (DemandSum(terms=(law,), counts=(1,)) for law in sides)
    return with_term(BracketedSum(down=down, up=up), left, np.full(days_c.size, 1.0 / days_c.size), spread)
