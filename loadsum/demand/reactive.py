"""Reactive power of a group: as metered where everyone's is, else as stated.

Active and reactive demand are summed separately over the customers, and the apparent power is the magnitude of the
two sums. In one demand interval of a class of days the reactive sum is taken to follow the active one in proportion,
by least squares through the origin, so that days of high demand count most; its scatter about that is left out.
"""

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand

FEWEST_DAYS = 10  # with both sums, below which the stated power factor stands


def power_factors(kw: NDArray[np.float64], kvar: NDArray[np.float64] | None, stated: float) -> NDArray[np.float64]:
    """Power factor of a group in each interval of the day, (I,) float64. [-]

    Parameters
    ----------
    kw : (D, I) float64
        Active sums of the customers served; NaN where one is missing. [kW]
    kvar : (D, I) float64 or None
        Reactive sums of the same; NaN where one is missing or has no reactive meter, None where nobody has. [kvar]
    stated : float
        Power factor of the study file. [-]
    """
    found = np.full(kw.shape[1], stated)
    if kvar is None:
        return found
    known = np.isfinite(kw) & np.isfinite(kvar)
    active, reactive = np.where(known, kw, 0.0), np.where(known, kvar, 0.0)
    square = (active * active).sum(axis=0)
    metered = (known.sum(axis=0) >= FEWEST_DAYS) & (square > 0.0)
    slope = np.divide((active * reactive).sum(axis=0), square, out=np.zeros(square.size), where=metered)
    found[metered] = 1.0 / np.hypot(1.0, slope[metered])
    return found


def metered_power_factors(demand: GroupDemand, stated: float) -> tuple[float, float] | None:
    """Lowest and highest power factor of the covered intervals; None where none departs from the stated one. [-]"""
    found = [hour.power_factor for row in demand.hours for hour in row if hour is not None]
    return (min(found), max(found)) if any(factor != stated for factor in found) else None


def power_factor_when_high(demand: GroupDemand) -> float:
    """Power factor in the demand interval with the highest 99 % level. [-]"""
    present = [hour for row in demand.hours for hour in row if hour is not None]
    return max(present, key=lambda hour: hour.quantile_kw(0.01)).power_factor
