"""Expected exceedance hours: a sum over demand intervals that needs no assumption about dependence between them."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import Direction, GroupDemand
from loadsum.intake.readings import read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Exceedance:
    """Exceedance of one level over the year.

    Parameters
    ----------
    level_kva : (B,) float64
        Level in each block of days. [kVA]
    probability, lower, upper : (B, I) float64
        Probability in each demand interval with its bracket; NaN where there are no readings. [-]
    floor : (B, I) float64
        Smallest probability that the record supports. [-]
    hours_per_year : float
        Expected exceedance hours in the covered hours of a year. [h]
    """

    level_kva: NDArray[np.float64]
    probability: NDArray[np.float64]
    lower: NDArray[np.float64]
    upper: NDArray[np.float64]
    floor: NDArray[np.float64]
    hours_per_year: float

    def __post_init__(self) -> None:
        for array in (self.level_kva, self.probability, self.lower, self.upper, self.floor):
            read_only(array)


def exceedance_hours(demand: GroupDemand, level_kva: Sequence[float], direction: Direction) -> Exceedance:
    """Exceedance of a level, one for each block of days, over the covered hours of the year."""
    shape = demand.hours_in_year().shape
    found = np.full((4, *shape), np.nan)
    for b, row in enumerate(demand.hours):
        for i, hour in enumerate(row):
            if hour is not None:
                p = hour.exceedance_kva(level_kva[b], direction)
                found[:, b, i] = p.value, p.lower, p.upper, p.floor
    hours = float(np.nansum(demand.hours_in_year() * found[0]))
    return Exceedance(
        level_kva=np.asarray(level_kva, dtype=np.float64),
        probability=found[0],
        lower=found[1],
        upper=found[2],
        floor=found[3],
        hours_per_year=hours,
    )
