"""The distribution of the coincident demand in each demand interval: what the later stages ask."""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.convolution import BracketedSum, DemandSum, plain_distributions
from loadsum.demand.lattice import LatticeMass, kernel_mass, normal_mass
from loadsum.demand.probability import Probabilities, Probability
from loadsum.demand.samplingerror import COVERS, Resamples
from loadsum.demand.settings import ModelSettings
from loadsum.demand.temperature import TemperatureResponse, stretched_mass
from loadsum.intake.hourclass import DayBlock

Direction = Literal["both", "delivered", "exported"]

DEEP = 1e-5  # below this the whole distribution is not accurate enough and the tail is computed at its own tilt
NOTHING = 1e-14  # below this nothing more is asked of a probability: the bracket says so


@dataclass(frozen=True, kw_only=True, eq=False)
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
        Days of readings behind the distribution: those of the customer with fewest. [d]
    total : BracketedSum
        The adopted model, mixed over the temperatures of the record, every term rounded down and up.
    whole_down, whole_up : LatticeMass
        The same as whole distributions.
    still : BracketedSum
        The adopted model without the terms that depend on the day's temperature.
    response : TemperatureResponse or None
        Response of the group to temperature; None where it is not in the model.
    independent : LatticeMass
        Exact convolution of the customers' own readings as if independent, for comparison.
    covariance_variance_kw2 : float
        Variance of the observed sum, smoothed along the day, for the normal law with covariance. [kW²]
    power_factor : float
        Power factor of the group. [-]
    mean_variance_kw2 : float
        Variance of the mean that the model carries. [kW²]
    can_export : bool
        Whether any reading is negative; without, no flow is reversed.
    own_terms : int
        How many of the terms of ``still``, from the first on, are customers. [-]
    shared : LatticeMass or None
        The term of ``still`` that all customers share, rounded up; None where there is none.
    resamples : Resamples or None
        What resampled weeks do to the distribution; None where no interval was asked for or weeks are too few.
    """

    season: str
    day_type: str
    interval: int
    interval_min: int
    n_days: int
    total: BracketedSum
    whole_down: LatticeMass
    whole_up: LatticeMass
    still: BracketedSum
    response: TemperatureResponse | None
    independent: LatticeMass
    covariance_variance_kw2: float
    power_factor: float
    mean_variance_kw2: float
    can_export: bool
    own_terms: int
    shared: LatticeMass | None
    resamples: Resamples | None

    @property
    def floor(self) -> float:
        """Smallest probability that the record supports. [-]"""
        return 1.0 / (self.n_days + 1)

    @cached_property
    def _moments(self) -> tuple[float, float, float]:
        """Mean, variance and third central moment, each the middle of its bracket. [kW, kW², kW³]"""
        down = self.whole_down.moments()
        up = down if self.whole_up is self.whole_down else self.whole_up.moments()
        return 0.5 * (down[0] + up[0]), 0.5 * (down[1] + up[1]), 0.5 * (down[2] + up[2])

    def mean_kw(self) -> float:
        """Mean coincident demand. [kW]"""
        return self._moments[0]

    def variance_kw2(self) -> float:
        """Variance of the coincident demand. [kW²]"""
        return self._moments[1]

    def skewness(self) -> float:
        """Skewness of the coincident demand; 0 for a constant. [-]"""
        _, second, third = self._moments
        return third / second**1.5 if second > 0.0 else 0.0

    def exceedance(self, level_kw: float) -> Probability:
        """Probability that demand is strictly above a level. [kW -> -]"""
        lower, upper = self.whole_down.above(level_kw), self.whole_up.above(level_kw)
        if upper < NOTHING:
            lower, upper = 0.0, NOTHING
        elif upper < DEEP:
            lower, upper = self.total.above(level_kw)
        return self._probability(lower, upper, self._interval(np.array([level_kw]), self.whole_up.above_many)[:, 0])

    def exceedances(self, levels_kw: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Lower and upper probability of demand strictly above each level, (L,) float64 each. [kW -> -]

        Accurate to 1e-15 absolute; for a figure in the far tail ask :meth:`exceedance`.
        """
        upper = self.whole_up.above_many(levels_kw)
        return np.minimum(self.whole_down.above_many(levels_kw), upper), upper

    def below(self, level_kw: float) -> Probability:
        """Probability that demand is strictly below a level. [kW -> -]"""
        lower, upper = self.whole_up.below(level_kw), self.whole_down.below(level_kw)
        if upper < NOTHING:
            lower, upper = 0.0, NOTHING
        elif upper < DEEP:
            lower, upper = self.total.below(level_kw)
        return self._probability(lower, upper, self._interval(np.array([level_kw]), self.whole_up.below_many)[:, 0])

    def quantile_kw(self, exceeded_with: float) -> float:
        """Smallest lattice level that demand exceeds with at most the probability given. [- -> kW]"""
        return float(self.quantiles_kw(np.array([exceeded_with]))[0])

    def quantiles_kw(self, exceeded_with: NDArray[np.float64]) -> NDArray[np.float64]:
        """Levels that demand exceeds with at most each probability, (n,) float64. [- -> kW]"""
        above = np.append(np.cumsum(self.whole_up.mass[::-1])[::-1][1:], 0.0)
        index = np.searchsorted(-above, -np.asarray(exceeded_with), side="left")
        return self.whole_up.points_kw[np.minimum(index, above.size - 1)]

    def exceedance_kva(self, level_kva: float, direction: Direction = "both") -> Probability:
        """Probability that the apparent power of the group is strictly above a level. [kVA -> -]"""
        limit_kw = level_kva * self.power_factor
        parts = []
        if direction != "exported":
            parts.append(self.exceedance(limit_kw))
        if direction == "exported" or (direction == "both" and self.can_export):
            parts.append(self.below(-limit_kw))
        lower, upper = (min(sum(end), 1.0) for end in ([p.lower for p in parts], [p.upper for p in parts]))
        ends = [(p.low, p.high) for p in parts if p.low is not None and p.high is not None]
        interval = (min(sum(e[0] for e in ends), 1.0), min(sum(e[1] for e in ends), 1.0)) if ends else (np.nan, np.nan)
        return self._probability(lower, upper, interval)

    def exceedances_kva(self, levels_kva: NDArray[np.float64], direction: Direction = "both") -> Probabilities:
        """Probability that the apparent power of the group is strictly above each level. [kVA -> -]

        Accurate to 1e-15 absolute; for a figure in the far tail ask :meth:`exceedance_kva`.
        """
        limits_kw = np.asarray(levels_kva, dtype=np.float64) * self.power_factor
        lower, upper, ends = np.zeros(limits_kw.size), np.zeros(limits_kw.size), np.zeros((2, limits_kw.size))
        if direction != "exported":
            lower, upper = self.exceedances(limits_kw)
            ends += self._interval(limits_kw, self.whole_up.above_many)
        if direction == "exported" or (direction == "both" and self.can_export):
            lower, upper = lower + self.whole_up.below_many(-limits_kw), upper + self.whole_down.below_many(-limits_kw)
            ends += self._interval(-limits_kw, self.whole_up.below_many)
        upper = np.minimum(upper, 1.0)
        low, high = np.minimum(ends, 1.0)
        return Probabilities(lower=np.minimum(lower, upper), upper=upper, low=low, high=high)

    def mean_square_kva2(self) -> float:
        """Mean of the squared apparent power, which load losses go by. [kVA²]"""
        return (self.variance_kw2() + self.mean_kw() ** 2) / self.power_factor**2

    def at_temperature(self, temperature_c: float) -> "HourDemand":
        """The distribution on a day of a given lagged daily mean; itself where temperature plays no part."""
        if self.response is None:
            return self
        at = np.array([temperature_c])
        shift, spread = float(self.response.shift_kw(at)[0]), float(np.sqrt(self.response.shift_variance_kw2(at)[0]))
        if self.response.power == 0.0:
            total = with_term(self.still, np.array([shift]), np.ones(1), spread)
        else:
            stretch = float(self.response.stretch(at)[0])
            laws = [stretched_mass(law, stretch, shift) for law in plain_distributions(self.still)]
            ends = [DemandSum(terms=(law,), counts=(1,)) for law in laws]
            total = with_normal(BracketedSum(down=ends[0], up=ends[1]), spread)
        down, up = plain_distributions(total)
        return replace(self, total=total, whole_down=down, whole_up=up)

    def without_temperature(self, spread_kw: float) -> "HourDemand":
        """The distribution at no shift by temperature, the response being uncertain by a standard deviation. [kW]"""
        if self.response is None:
            return self
        total = with_normal(self.still, spread_kw)
        down, up = plain_distributions(total)
        return replace(self, total=total, whole_down=down, whole_up=up)

    def independent_exceedance(self, level_kw: float) -> float:
        """Probability above a level if the customers were independent; for comparison only. [-]"""
        return self.independent.above(level_kw)

    def normal_exceedance(self, level_kw: float) -> float:
        """Probability above a level by the normal law with the covariance of the customers; for comparison only. [-]"""
        return _normal_above(level_kw, self._independent_moments[0], self.covariance_variance_kw2)

    def normal_independent_exceedance(self, level_kw: float) -> float:
        """Probability above a level by the normal law of independent customers; for comparison only. [-]"""
        return _normal_above(level_kw, *self._independent_moments)

    @cached_property
    def _independent_moments(self) -> tuple[float, float]:
        return self.independent.mean_kw(), self.independent.central_moment(2)

    def _interval(
        self, levels_kw: NDArray[np.float64], beyond: Callable[[NDArray[np.float64]], NDArray[np.float64]]
    ) -> NDArray[np.float64]:
        """Ends of the interval for the long-run probability beyond each level, (2, L) float64; NaN for none. [-]"""
        if self.resamples is None:
            return np.full((2, levels_kw.size), np.nan)
        variance = self.variance_kw2()
        share = np.sqrt(max(variance - self.mean_variance_kw2, 0.0) / variance) if variance > 0.0 else 1.0
        found = np.sort(beyond(self.resamples.levels_kw(levels_kw, self.mean_kw(), max(share, 0.05))), axis=1)
        place = (found.shape[1] - 1) * np.array([0.5 - 0.5 * COVERS, 0.5 + 0.5 * COVERS])
        first = np.minimum(place.astype(np.int64), max(found.shape[1] - 2, 0))
        last = np.minimum(first + 1, found.shape[1] - 1)
        part = place - first
        return np.asarray((found[:, first] * (1.0 - part) + found[:, last] * part).T, dtype=np.float64)

    def _probability(self, lower: float, upper: float, ends: Sequence[float] | NDArray[np.float64]) -> Probability:
        upper = min(upper, 1.0)
        lower = min(lower, upper)
        low, high = (None if np.isnan(end) else float(end) for end in ends)
        return Probability(value=0.5 * (lower + upper), lower=lower, upper=upper, low=low, high=high, floor=self.floor)


def _normal_above(level_kw: float, mean_kw: float, variance_kw2: float) -> float:
    if variance_kw2 <= 0.0:
        return float(mean_kw > level_kw)
    return 0.5 * math.erfc((level_kw - mean_kw) / math.sqrt(2.0 * variance_kw2))


def with_term(
    total: BracketedSum, centres_kw: NDArray[np.float64], weights: NDArray[np.float64], spread_kw: float
) -> BracketedSum:
    """A sum with one more independent term: a mixture of normal laws of one width, discretised outward."""
    if spread_kw == 0.0 and np.all(centres_kw == 0.0):
        return total
    step = total.up.step_kw
    down, up = (kernel_mass(centres_kw, weights, spread_kw, step, way) for way in ("down", "up"))
    return BracketedSum(
        down=DemandSum(terms=(*total.down.terms, down), counts=(*total.down.counts, 1)),
        up=DemandSum(terms=(*total.up.terms, up), counts=(*total.up.counts, 1)),
    )


def with_normal(total: BracketedSum, spread_kw: float) -> BracketedSum:
    """A sum with one more independent zero-mean normal term, discretised outward."""
    if spread_kw == 0.0:
        return total
    step = total.up.step_kw
    return BracketedSum(
        down=DemandSum(
            terms=(*total.down.terms, normal_mass(0.0, spread_kw, step, "down")), counts=(*total.down.counts, 1)
        ),
        up=DemandSum(terms=(*total.up.terms, normal_mass(0.0, spread_kw, step, "up")), counts=(*total.up.counts, 1)),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class BlockDiagnostics:
    """What justifies the model on one class of days.

    Parameters
    ----------
    season, day_type : str
        Class of days.
    days : int
        Days of readings. [d]
    correlation : float
        Mean correlation between customers over the day, as metered. [-]
    correlation_low, correlation_high : float
        Its 90 % interval by leaving out one week at a time; NaN where weeks or customers are too few. [-]
    variance_ratio : float
        Variance of the model over that of the observed sum, summed over the day; NaN where the group is not the
        metered customers alone. [-]
    temperature_explains : float
        Share of the sum's variance that the temperature response explains, mean over the day. [-]
    record_days_outside : int
        Days of the temperature record outside the metered range. [d]
    share_below_zero : float
        Largest probability of demand below zero in any interval of a group without export. [-]
    """

    season: str
    day_type: str
    days: int
    correlation: float
    correlation_low: float
    correlation_high: float
    variance_ratio: float
    temperature_explains: float
    record_days_outside: int
    share_below_zero: float


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
    diagnostics : tuple of BlockDiagnostics
        What justifies the model, one for each block.
    """

    interval_min: int
    blocks: tuple[DayBlock, ...]
    hours: tuple[tuple[HourDemand | None, ...], ...]
    sums_kw: tuple[NDArray[np.float64], ...]
    settings: ModelSettings
    diagnostics: tuple[BlockDiagnostics, ...]

    def hours_in_year(self) -> NDArray[np.float64]:
        """Hours per average year of each interval of each block, (B, I) float64. [h]"""
        length = self.interval_min / 60.0
        return np.array([[block.days_per_year * length] * block.kw.shape[2] for block in self.blocks])

    def covered(self) -> NDArray[np.bool_]:
        """Whether each interval of each block has readings, (B, I) bool."""
        return np.array([[hour is not None for hour in row] for row in self.hours])
