"""The distribution of the coincident demand in each demand interval: what the later stages ask."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.stats import norm

from loadsum.demand.convolution import sum_distribution
from loadsum.demand.dependence import common_variance
from loadsum.demand.lattice import LatticeMass, lattice_mass
from loadsum.demand.probability import Probability
from loadsum.demand.settings import ModelSettings
from loadsum.intake.hourclass import DayBlock

Direction = Literal["both", "delivered", "exported"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class HourDemand:
    """Distribution of the coincident demand in one demand interval of the days of one season and day type.

    Parameters
    ----------
    season, day_type : str
        Class of days.
    interval : int
        Position of the demand interval in the day, from 0. [-]
    interval_min : int
        Demand interval. [min]
    n_days : int
        Days of readings behind the distribution. [d]
    rounded_down, rounded_up : LatticeMass
        The distribution with every term rounded down and up; the truth lies between.
    independent : LatticeMass
        Exact convolution of the customers as if independent, rounded up, for comparison.
    power_factor : float
        Power factor of the group. [-]
    """

    season: str
    day_type: str
    interval: int
    interval_min: int
    n_days: int
    rounded_down: LatticeMass
    rounded_up: LatticeMass
    independent: LatticeMass
    power_factor: float

    def mean_kw(self) -> float:
        """Mean coincident demand. [kW]"""
        return 0.5 * (self.rounded_down.mean_kw() + self.rounded_up.mean_kw())

    def variance_kw2(self) -> float:
        """Variance of the coincident demand. [kW²]"""
        return 0.5 * (self.rounded_down.central_moment(2) + self.rounded_up.central_moment(2))

    def skewness(self) -> float:
        """Skewness of the coincident demand; 0 for a constant. [-]"""
        variance = self.rounded_up.central_moment(2)
        return self.rounded_up.central_moment(3) / variance**1.5 if variance > 0.0 else 0.0

    def exceedance(self, level_kw: float) -> Probability:
        """Probability that demand is strictly above a level. [kW -> -]"""
        return _between(self.rounded_down.above(level_kw), self.rounded_up.above(level_kw), self.n_days)

    def below(self, level_kw: float) -> Probability:
        """Probability that demand is strictly below a level. [kW -> -]"""
        return _between(self.rounded_up.below(level_kw), self.rounded_down.below(level_kw), self.n_days)

    def quantile_kw(self, exceeded_with: float) -> float:
        """Smallest lattice level that demand exceeds with at most the probability given. [kW]"""
        tail = np.cumsum(self.rounded_up.mass[::-1])[::-1]
        index = int(np.searchsorted(-np.append(tail[1:], 0.0), -exceeded_with, side="left"))
        return float(self.rounded_up.points_kw[min(index, tail.size - 1)])

    def exceedance_kva(self, level_kva: float, direction: Direction = "both") -> Probability:
        """Probability that the apparent power of the group is strictly above a level. [kVA -> -]"""
        limit_kw = level_kva * self.power_factor
        above, below = self.exceedance(limit_kw), self.below(-limit_kw)
        parts = {"delivered": [above], "exported": [below], "both": [above, below]}[direction]
        value = min(sum(p.value for p in parts), 1.0)
        lower, upper = min(sum(p.lower for p in parts), value), max(min(sum(p.upper for p in parts), 1.0), value)
        return Probability(value=value, lower=lower, upper=upper, floor=parts[0].floor)

    def mean_square_kva2(self) -> float:
        """Mean of the squared apparent power, which load losses go by. [kVA²]"""
        return (self.variance_kw2() + self.mean_kw() ** 2) / self.power_factor**2

    def independent_exceedance(self, level_kw: float) -> float:
        """Probability above a level if the customers were independent; for comparison only. [-]"""
        return self.independent.above(level_kw)

    def normal_exceedance(self, level_kw: float) -> float:
        """Probability above a level by the normal law with the model's mean and variance; for comparison only. [-]"""
        return float(norm.sf(level_kw, self.mean_kw(), np.sqrt(self.variance_kw2())))

    def normal_independent_exceedance(self, level_kw: float) -> float:
        """Probability above a level by the normal law of independent customers; for comparison only. [-]"""
        return float(norm.sf(level_kw, self.independent.mean_kw(), np.sqrt(self.independent.central_moment(2))))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class GroupDemand:
    """Distribution of the coincident demand over the whole year, one class of days after the other.

    Parameters
    ----------
    interval_min : int
        Demand interval. [min]
    blocks : tuple of DayBlock
        Readings of the group behind it, one block for each season and day type.
    hours : tuple of tuple of HourDemand or None
        ``hours[b][i]`` is the demand of interval i on the days of block b; None where there are no readings.
    sums_kw : tuple of (D, I) float64
        Observed time-aligned sum of the metered customers for each block; NaN where one is missing. [kW]
    settings : ModelSettings
        Settings the model was made with.
    """

    interval_min: int
    blocks: tuple[DayBlock, ...]
    hours: tuple[tuple[HourDemand | None, ...], ...]
    sums_kw: tuple[NDArray[np.float64], ...]
    settings: ModelSettings

    def hours_in_year(self) -> NDArray[np.float64]:
        """Hours per average year of each interval of each block, (B, I) float64. [h]"""
        length = self.interval_min / 60.0
        return np.array(
            [[block.days_per_year * length] * len(row) for block, row in zip(self.blocks, self.hours, strict=True)]
        )

    def covered(self) -> NDArray[np.bool_]:
        """Whether each interval of each block has readings, (B, I) bool."""
        return np.array([[hour is not None for hour in row] for row in self.hours])


def _between(lower: float, upper: float, n_days: int) -> Probability:
    lower, upper = min(lower, 1.0), min(max(lower, upper), 1.0)
    return Probability(value=upper, lower=lower, upper=upper, floor=1.0 / (n_days + 1))


def group_demand(
    blocks: Sequence[DayBlock], *, interval_min: int, power_factor: float, settings: ModelSettings
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
    """
    hours, sums = [], []
    for block in blocks:
        sums.append(block.kw.sum(axis=0))
        variance = common_variance(block.kw, settings.neighbour_hours)
        row: list[HourDemand | None] = []
        for i in range(block.kw.shape[2]):
            columns = [customer[np.isfinite(customer)] for customer in block.kw[:, :, i]]
            if any(column.size == 0 for column in columns):
                row.append(None)
                continue
            step = settings.lattice_kw or 0.01
            spread = float(np.sqrt(variance[i])) if settings.common_component else 0.0
            down, up = ([lattice_mass(column, step, way) for column in columns] for way in ("down", "up"))
            independent = sum_distribution(up)
            row.append(
                HourDemand(
                    season=block.season,
                    day_type=block.day_type,
                    interval=i,
                    interval_min=interval_min,
                    n_days=min(column.size for column in columns),
                    rounded_down=sum_distribution([*down, _normal(spread, step, 0.0)]),
                    rounded_up=sum_distribution([*up, _normal(spread, step, 1.0)]),
                    independent=independent,
                    power_factor=power_factor,
                )
            )
        hours.append(tuple(row))
    return GroupDemand(
        interval_min=interval_min, blocks=tuple(blocks), hours=tuple(hours), sums_kw=tuple(sums), settings=settings
    )


def _normal(spread_kw: float, step_kw: float, shift: float) -> LatticeMass:
    """Zero-mean normal term, its mass between lattice points moved down (shift 0) or up (shift 1)."""
    reach = int(np.ceil(8.0 * spread_kw / step_kw))
    if reach == 0:
        return LatticeMass(step_kw=step_kw, offset=0, mass=np.ones(1))
    edges = norm.cdf(np.arange(-reach, reach + 1) * step_kw / spread_kw)
    mass = np.diff(edges)
    return LatticeMass(step_kw=step_kw, offset=-reach + int(shift), mass=mass / mass.sum())
