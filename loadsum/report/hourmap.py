"""Exceedance of each rating in every demand interval of every class of days: what the report's map shows."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.intake.hourclass import DayBlock
from loadsum.intake.readings import read_only
from loadsum.peak.exceedance import LevelExceedance


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class HourMap:
    """Exceedance of one level of each rating, for each class of days and interval of the day.

    Parameters
    ----------
    ratings_kva : (R,) float64
        Ratings. [kVA]
    season, day_type : tuple of str
        Names of the B classes of days.
    level_kva : (R, B) float64
        Level of each rating in each class of days. [kVA]
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


def hour_map(blocks: Sequence[DayBlock], ratings_kva: Sequence[float], levels: Sequence[LevelExceedance]) -> HourMap:
    """The map of exceedances that were computed already.

    Parameters
    ----------
    blocks : sequence of DayBlock
        Classes of days, in the order of the levels' first axis.
    ratings_kva : sequence of float
        Ratings. [kVA]
    levels : sequence of LevelExceedance
        Exceedance of the level of each rating, in the order of the ratings.
    """
    if len(ratings_kva) != len(levels) or not levels:
        raise ValueError(f"need one level for each rating, got {len(levels)} for {len(ratings_kva)}")
    return HourMap(
        ratings_kva=np.array(ratings_kva, dtype=np.float64),
        season=tuple(block.season for block in blocks),
        day_type=tuple(block.day_type for block in blocks),
        level_kva=np.array([level.level_kva for level in levels]),
        probability=np.array([level.probability for level in levels]),
        floor=np.array(levels[0].floor),
    )
