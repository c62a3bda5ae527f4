"""Random days and years drawn from the demand model, with the temperature of the same day."""

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand
from loadsum.peak.copula import DayCopula
from loadsum.peak.margins import Margins
from loadsum.peak.paths import DemandPaths
from loadsum.peak.weather import DAYS, YearsOfDays

ROWS = 16384  # days drawn at a time


def draw_paths(
    demand: GroupDemand,
    *,
    copula: DayCopula,
    margins: Margins,
    years: YearsOfDays,
    count: int,
    rng: np.random.Generator,
) -> DemandPaths:
    """Random years of coincident demand.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    copula : DayCopula
        Dependence between the intervals of a day.
    margins : Margins
        Tables of :func:`loadsum.peak.margins.margins` for the same demand and copula.
    years : YearsOfDays
        Calendar years, with their temperatures where a record is given; each path is one of them at random.
    count : int
        Number of years to draw. [-]
    rng : numpy.random.Generator
        Source of randomness.

    Returns
    -------
    DemandPaths
        ``count`` times 365 days. Demand is NaN in intervals without readings, which
        :func:`loadsum.peak.exceedance.uncovered_classes` names.

    Notes
    -----
    Days are independent of each other given their class and temperature. That is an assumption: where days cluster
    beyond what the calendar and temperature explain, long hot spells are rarer in the paths than in life.
    """
    chosen = rng.integers(years.year.size, size=count)
    block = years.block[chosen].ravel()
    daily = None if years.daily_c is None else years.daily_c[chosen].ravel()
    kw = draw_days(block, copula=copula, margins=margins, temperature_c=daily, rng=rng)
    ambient = None
    if years.by_interval_c is not None:
        ambient = years.by_interval_c[chosen].reshape(block.size, -1)
    return DemandPaths(
        interval_min=demand.interval_min,
        block=block,
        day_of_year=np.tile(np.arange(DAYS, dtype=np.int64), count),
        kw=kw,
        kvar=kw * margins.kvar_per_kw[block] if np.any(margins.kvar_per_kw) else np.where(np.isnan(kw), np.nan, 0.0),
        ambient_c=ambient,
    )


def draw_days(
    block: NDArray[np.int64],
    *,
    copula: DayCopula,
    margins: Margins,
    temperature_c: NDArray[np.float64] | None,
    rng: np.random.Generator,
) -> NDArray[np.float64]:
    """Random days of coincident demand.

    Parameters
    ----------
    block : (P,) int64
        Class of each day. [-]
    copula, margins
        As for :func:`draw_paths`.
    temperature_c : (P,) float64 or None
        Daily temperature; needed where demand depends on it. [°C]
    rng : numpy.random.Generator
        Source of randomness.

    Returns
    -------
    (P, I) float64
        Demand; NaN where there are no readings. [kW]
    """
    kw = np.empty((block.size, margins.kw.shape[1]))
    for b in np.unique(block).tolist():
        rows = np.flatnonzero(block == b)
        for start in range(0, rows.size, ROWS):
            pick = rows[start : start + ROWS]
            score = copula.draw(b, pick.size, rng)
            kw[pick] = margins.demand_kw(b, score, None if temperature_c is None else temperature_c[pick])
    return kw
