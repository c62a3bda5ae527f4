"""Exceedance of each rating in every demand interval of every class of days: what the report's map shows."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import GroupDemand
from loadsum.intake.readings import read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class HourMap:
    """Exceedance of the loading allowed of each rating, for each class of days and interval of the day.

    Parameters
    ----------
    ratings_kva : (R,) float64
        Ratings. [kVA]
    season, day_type : tuple of str
        Names of the B classes of days.
    level_kva : (R, B) float64
        Loading allowed in normal service. [kVA]
    probability : (R, B, I) float64
        Predictive probability of exceedance; NaN where there are no readings. [-]
    floor : (B, I) float64
        Smallest probability that the record supports; NaN where there are no readings. [-]
    """

    ratings_kva: NDArray[np.float64]
    season: tuple[str, ...]
    day_type: tuple[str, ...]
    level_kva: NDArray[np.float64]
    probability: NDArray[np.float64]
    floor: NDArray[np.float64]

    def __post_init__(self) -> None:
        shape = (self.ratings_kva.size, len(self.season), self.floor.shape[-1])
        if self.probability.shape != shape or self.level_kva.shape != shape[:2]:
            raise ValueError(f"probability {self.probability.shape} must be {shape}")
        for array in (self.ratings_kva, self.level_kva, self.probability, self.floor):
            read_only(array)


def hour_map(demand: GroupDemand, ratings_kva: Sequence[float], allowed_pu: Mapping[str, float]) -> HourMap:
    """The map of a group's demand.

    Parameters
    ----------
    demand : GroupDemand
        Demand model.
    ratings_kva : sequence of float
        Ratings. [kVA]
    allowed_pu : mapping of str to float
        Loading allowed in normal service by season, "all" for every season without its own; 1 where neither is
        given. [pu of nameplate]
    """
    ratings = np.array(ratings_kva, dtype=np.float64)
    allowed = np.array([allowed_pu.get(block.season, allowed_pu.get("all", 1.0)) for block in demand.blocks])
    level = ratings[:, None] * allowed[None, :]
    intervals = 1440 // demand.interval_min
    probability = np.full((ratings.size, len(demand.blocks), intervals), np.nan)
    floor = np.full((len(demand.blocks), intervals), np.nan)
    for b, row in enumerate(demand.hours):
        for i, hour in enumerate(row):
            if hour is None:
                continue
            for r in range(ratings.size):
                found = hour.exceedance_kva(float(level[r, b]))
                probability[r, b, i] = found.value
                floor[b, i] = found.floor
    return HourMap(
        ratings_kva=ratings,
        season=tuple(block.season for block in demand.blocks),
        day_type=tuple(block.day_type for block in demand.blocks),
        level_kva=level,
        probability=probability,
        floor=floor,
    )
