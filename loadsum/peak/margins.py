"""Demand of every interval as a function of its score in the copula: tables that daily peaks and paths share."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import Direction, GroupDemand, HourDemand
from loadsum.intake.readings import read_only
from loadsum.peak.copula import DayCopula

POINTS = 2049  # points of each table
SMALLEST = 1e-13  # probability beyond which a table is flat; below it a plain convolution is noise


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Margins:
    """Quantiles of every interval, at the temperatures given or over the whole class of days.

    Parameters
    ----------
    heavy : bool
        Whether the tables run over the inverse hyperbolic sine of the score, which heavy tails need.
    place : (K,) float64
        Equally spaced scores, or their inverse hyperbolic sines. [-]
    exceeded_with : (K,) float64
        Exceedance probability at each point, falling. [-]
    kw : (B, M, I, K) float64
        Demand at each point for each temperature, rising; NaN where there are no readings. [kW]
    temperature_c : (B, M) float64 or None
        Daily temperatures of the tables, rising; None where demand does not depend on temperature (M = 1). [°C]
    kvar_per_kw : (B, I) float64
        Reactive demand of the group per kW. [kvar/kW]
    """

    heavy: bool
    place: NDArray[np.float64]
    exceeded_with: NDArray[np.float64]
    kw: NDArray[np.float64]
    temperature_c: NDArray[np.float64] | None
    kvar_per_kw: NDArray[np.float64]

    def __post_init__(self) -> None:
        if self.kw.ndim != 4 or self.kw.shape[3] != self.place.size:
            raise ValueError(f"kw must be (B, M, I, {self.place.size}), got {self.kw.shape}")
        for array in (self.place, self.exceeded_with, self.kw, self.temperature_c, self.kvar_per_kw):
            if array is not None:
                read_only(array)

    def exceedance(self, level_kva: NDArray[np.float64], direction: Direction = "delivered") -> NDArray[np.float64]:
        """Probability that apparent power is above the level of each class of days.

        Parameters
        ----------
        level_kva : (B,) float64
            Levels. [kVA]
        direction : {"both", "delivered", "exported"}
            Direction of flow that counts.

        Returns
        -------
        (B, M, I) float64
            Probabilities; NaN where there are no readings. [-]
        """
        found = np.full(self.kw.shape[:3], np.nan)
        log_tail = np.log(self.exceeded_with)
        for b, m, i in np.ndindex(*self.kw.shape[:3]):
            table = self.kw[b, m, i]
            if np.isnan(table[0]):
                continue
            level_kw = float(level_kva[b] / np.hypot(1.0, self.kvar_per_kw[b, i]))
            delivered = _beyond(table, log_tail, level_kw) if direction != "exported" else 0.0
            exported = _beyond(-table[::-1], log_tail, level_kw) if direction != "delivered" else 0.0
            found[b, m, i] = min(delivered + exported, 1.0)
        return found

    def demand_kw(
        self, block: int, score: NDArray[np.float64], temperature_c: NDArray[np.float64] | None
    ) -> NDArray[np.float64]:
        """Demand of drawn days.

        Parameters
        ----------
        block : int
            Class of days. [-]
        score : (D, I) float64
            Scores drawn from the copula. [-]
        temperature_c : (D,) float64 or None
            Temperature of each day; needed where the tables depend on it. Outside the range of the tables the
            nearest table stands. [°C]

        Returns
        -------
        (D, I) float64
            Demand; NaN where there are no readings. [kW]
        """
        place = np.arcsinh(score) if self.heavy else score.copy()
        place -= self.place[0]
        place *= 1.0 / (self.place[1] - self.place[0])
        np.clip(place, 0.0, self.place.size - 1.001, out=place)
        cell = place.astype(np.int32)
        place -= cell
        nodes = self.kw.shape[1]
        if self.temperature_c is None or nodes == 1:
            return self._read(block, 0, cell, place)
        if temperature_c is None:
            raise ValueError("demand depends on temperature: give the temperature of each day")
        warmth = np.interp(temperature_c, self.temperature_c[block], np.arange(nodes))
        low = np.minimum(warmth.astype(np.int64), nodes - 2)
        out = np.empty(score.shape)
        for node in np.unique(low).tolist():
            pick = low == node
            part = (warmth[pick] - node)[:, None]
            out[pick] = (1.0 - part) * self._read(block, node, cell[pick], place[pick])
            out[pick] += part * self._read(block, node + 1, cell[pick], place[pick])
        return out

    def _read(self, block: int, node: int, cell: NDArray[np.int32], part: NDArray[np.float64]) -> NDArray[np.float64]:
        out = np.empty(part.shape)
        for i in range(part.shape[1]):
            table = self.kw[block, node, i]
            rise = np.diff(table)
            out[:, i] = table[cell[:, i]] + part[:, i] * rise[cell[:, i]]
        return out


def margins(demand: GroupDemand, copula: DayCopula, *, temperature_c: NDArray[np.float64] | None = None) -> Margins:
    """Tables of the quantiles of every interval.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    copula : DayCopula
        Its scores are what the tables run over.
    temperature_c : (B, M) float64 or None
        Daily temperatures to make tables at, rising; None takes the distribution over the whole class of days. [°C]

    Notes
    -----
    Between the points of a table demand is interpolated along the score, so a jump of the quantile is spread over
    1/128 of a standard deviation: at most 2 % of a tail probability, and only where a level lies inside the jump.
    Beyond a probability of 1e-13 the tables are flat.
    """
    heavy = bool(np.isfinite(copula.degrees_of_freedom))
    reach = float(copula.score(np.array(SMALLEST)))
    reach = float(np.arcsinh(reach)) if heavy else reach
    place = np.linspace(-reach, reach, POINTS)
    exceeded_with = copula.tail(np.sinh(place) if heavy else place)
    nodes = 1 if temperature_c is None else temperature_c.shape[1]
    intervals = len(demand.hours[0])
    kw = np.full((len(demand.blocks), nodes, intervals, POINTS), np.nan)
    kvar_per_kw = np.zeros((len(demand.blocks), intervals))
    for b, row in enumerate(demand.hours):
        for i, hour in enumerate(row):
            if hour is None:
                continue
            kvar_per_kw[b, i] = np.tan(np.arccos(hour.power_factor))
            for m in range(nodes):
                given = hour if temperature_c is None else _at(hour, float(temperature_c[b, m]))
                kw[b, m, i] = np.maximum.accumulate(given.quantiles_kw(exceeded_with))
    return Margins(
        heavy=heavy,
        place=place,
        exceeded_with=exceeded_with,
        kw=kw,
        temperature_c=temperature_c,
        kvar_per_kw=kvar_per_kw,
    )


def _at(hour: HourDemand, temperature_c: float) -> HourDemand:
    given: HourDemand = hour.at_temperature(temperature_c)
    return given


def _beyond(table: NDArray[np.float64], log_tail: NDArray[np.float64], level_kw: float) -> float:
    """Probability above a level, its logarithm interpolated between the points of a rising table."""
    above = int(np.searchsorted(table, level_kw, side="right"))
    if above in (0, table.size):
        return 1.0 if above == 0 else 0.0
    part = (level_kw - table[above - 1]) / (table[above] - table[above - 1])
    return float(np.exp(log_tail[above - 1] + part * (log_tail[above] - log_tail[above - 1])))
