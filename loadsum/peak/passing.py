"""Probability that days and years pass a level, averaged over calendar and weather."""

from dataclasses import dataclass, fields
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import Direction
from loadsum.peak.anyinterval import AnyInterval, DrawnDays, any_interval, drawn_days
from loadsum.peak.copula import DayCopula
from loadsum.peak.margins import Margins
from loadsum.peak.weather import YearsOfDays

GRID = 13  # levels of a curve

Period = Literal["day", "year"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Chance:
    """Probabilities of passing one level.

    Parameters
    ----------
    day, year : float
        Probability that a day drawn from the year, and a year, passes the level. [-]
    day_error, year_error : float
        Standard errors of the simulation. [-]
    day_at_least, day_at_most, year_at_least, year_at_most : float
        Bounds that hold whatever the dependence. [-]
    blocks : tuple of AnyInterval
        A day of each class, averaged over the temperatures of its days.
    """

    day: float
    day_error: float
    day_at_least: float
    day_at_most: float
    year: float
    year_error: float
    year_at_least: float
    year_at_most: float
    blocks: tuple[AnyInterval, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Curve:
    """Probabilities of passing against the level.

    Parameters
    ----------
    level_kva_at : (G,) float64
        Levels, rising. [kVA]
    chances : tuple of Chance
        Probabilities at each level, by the same draws.
    """

    level_kva_at: NDArray[np.float64]
    chances: tuple[Chance, ...]

    def level_kva(self, part: str, probability: float) -> float:
        """Level at which a falling probability reaches the one given, its logarithm interpolated. [kVA]"""
        value = np.minimum.accumulate([getattr(chance, part) for chance in self.chances])
        last = int(np.argmax(value <= probability)) if value[-1] <= probability else value.size - 1
        if last == 0:
            return float(self.level_kva_at[0])
        ends = np.log(np.maximum(value[last - 1 : last + 1], 1e-300))
        part_of = (np.log(probability) - ends[0]) / (ends[1] - ends[0]) if ends[1] < ends[0] else 1.0
        low, high = self.level_kva_at[last - 1 : last + 1]
        return float(low + part_of * (high - low))

    def standard_error(self, period: Period, level_kva: float) -> float:
        """Standard error of the simulation in the probability at a level. [kVA -> -]"""
        return float(np.interp(level_kva, self.level_kva_at, [getattr(c, f"{period}_error") for c in self.chances]))


@dataclass(frozen=True, kw_only=True, eq=False)
class Passing:
    """What is needed to say how often days and years pass a level.

    Parameters
    ----------
    margins, copula, years
        Demand of every interval, dependence within the day, calendar and weather.
    seed : int
        Seed of the draws; every level is judged by the same ones. [-]
    direction : {"both", "delivered", "exported"}
        Direction of flow that counts.
    """

    margins: Margins
    copula: DayCopula
    years: YearsOfDays
    seed: int
    direction: Direction

    @cached_property
    def _drawn(self) -> tuple[DrawnDays, ...]:
        blocks = self.margins.kw.shape[0]
        return tuple(drawn_days(self.copula, b, np.random.default_rng([self.seed, b])) for b in range(blocks))

    def at(self, level_kva: NDArray[np.float64], *, runs: bool = True) -> Chance:
        """Probabilities of passing the level of each class of days, (B,) float64, and runs where asked. [kVA]"""
        single = self.margins.exceedance(level_kva, self.direction)
        found = [
            [any_interval(p, drawn, runs=runs) for p in row] for drawn, row in zip(self._drawn, single, strict=True)
        ]
        days = self.years.block.size
        value = self._each_day(found, "value")
        at_least = self._each_day(found, "at_least")
        expected = self._each_day(found, "expected_intervals")
        error = self._each_day(found, "standard_error")
        stays = np.exp(np.log1p(-np.minimum(value, 1.0 - 1e-16)).sum(axis=1))
        slope = stays[:, None] / np.maximum(1.0 - value, 1e-16)
        # One simulation serves all days of a class: its errors add within the class, and not across classes.
        own = [self.years.block == b for b in range(len(found))]
        day_error = np.sqrt(sum(float((error * mask).sum() / days) ** 2 for mask in own))
        year_error = np.sqrt(sum(float((slope * error * mask).sum(axis=1).mean()) ** 2 for mask in own))
        return Chance(
            day=float(value.mean()),
            day_error=float(day_error),
            day_at_least=float(at_least.mean()),
            day_at_most=float(np.minimum(expected, 1.0).mean()),
            year=float(1.0 - stays.mean()),
            year_error=float(year_error),
            year_at_least=float(at_least.max(axis=1).mean()),
            year_at_most=float(np.minimum(expected.sum(axis=1), 1.0).mean()),
            blocks=tuple(_averaged(row, self._weight(b)) for b, row in enumerate(found)),
        )

    def curve(self, *, largest_day: float, smallest_year: float) -> Curve:
        """Probabilities against the level, over the levels that the two probabilities ask for."""
        low = self._bounded("day", largest_day)
        high = self._bounded("year", smallest_year)
        level = np.linspace(low, max(high, low * (1.0 + 1e-9) + 1e-9), GRID)
        blocks = self.margins.kw.shape[0]
        return Curve(level_kva_at=level, chances=tuple(self.at(np.full(blocks, kva), runs=False) for kva in level))

    def _bounded(self, period: Period, probability: float) -> float:
        """A level at which the lower bound for days is at least, or the upper bound for years at most, as given."""
        blocks = self.margins.kw.shape[0]
        low, high = 0.0, self.margins.highest_kva()
        for _ in range(12):
            middle = 0.5 * (low + high)
            single = np.nan_to_num(self.margins.exceedance(np.full(blocks, middle), self.direction))
            if period == "day":
                bound = float(self._read(single.max(axis=2)).mean())
            else:
                bound = float(self._read(single.sum(axis=2)).sum(axis=1).mean())
            low, high = (middle, high) if bound > probability else (low, middle)
        return low if period == "day" else high

    def _each_day(self, found: list[list[AnyInterval]], part: str) -> NDArray[np.float64]:
        return self._read(np.array([[getattr(one, part) for one in row] for row in found]))

    def _read(self, table: NDArray[np.float64]) -> NDArray[np.float64]:
        """A figure of each class and temperature, (B, M), for each day of each year, (Y, 365)."""
        warmth = self.margins.temperature_c
        if warmth is None or self.years.daily_c is None:
            return np.asarray(table[self.years.block, 0], dtype=np.float64)
        out = np.empty(self.years.block.shape)
        for b in np.unique(self.years.block).tolist():
            own = self.years.block == b
            out[own] = np.interp(self.years.daily_c[own], warmth[b], table[b])
        return out

    def _weight(self, block: int) -> NDArray[np.float64]:
        """Weight of each temperature of the tables on the days of a class, (M,) float64; NaN where it has no day."""
        nodes = self.margins.shift_kw.shape[1]
        warmth = self.margins.temperature_c
        if warmth is None or self.years.daily_c is None:
            return np.asarray(np.eye(nodes)[0], dtype=np.float64)
        days = self.years.daily_c[self.years.block == block]
        hats = [np.interp(days, warmth[block], unit).sum() for unit in np.eye(nodes)]
        share = np.array(hats, dtype=np.float64) / max(days.size, 1)
        return share if days.size else np.full(nodes, np.nan)


def _averaged(row: list[AnyInterval], weight: NDArray[np.float64]) -> AnyInterval:
    if len(row) == 1:
        return row[0]
    mean = {f.name: weight @ np.array([getattr(one, f.name) for one in row]) for f in fields(AnyInterval)}
    runs = tuple(float(run) for run in mean.pop("runs_per_day"))
    return AnyInterval(**{name: float(value) for name, value in mean.items()}, runs_per_day=runs)
