"""Demand of every interval as a function of its score in the copula: tables that daily peaks and paths share."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.demand.hourly import Direction, GroupDemand
from loadsum.demand.lattice import LatticeMass
from loadsum.intake.readings import read_only
from loadsum.peak.copula import DayCopula
from loadsum.peak.weather import YearsOfDays

POINTS = 2049  # points of each table
NODES = 9  # temperatures at which the shift of each class is given
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
    kw : (B, I, K) float64
        Demand at each point, rising, without the shift by temperature; NaN where there are no readings. [kW]
    temperature_c : (B, M) float64 or None
        Daily temperatures at which the shift is given, rising; None where demand does not depend on it (M = 1). [°C]
    shift_kw : (B, M, I) float64
        Shift of demand at each temperature. [kW]
    stretch : (B, M, I) float64
        Spread of demand about its centre at each temperature, relative to that of the tables. [-]
    centre_kw : (B, I) float64
        Centre of the tables, about which they are stretched. [kW]
    kvar_per_kw : (B, I) float64
        Reactive demand of the group per kW. [kvar/kW]
    """

    heavy: bool
    place: NDArray[np.float64]
    exceeded_with: NDArray[np.float64]
    kw: NDArray[np.float64]
    temperature_c: NDArray[np.float64] | None
    shift_kw: NDArray[np.float64]
    stretch: NDArray[np.float64]
    centre_kw: NDArray[np.float64]
    kvar_per_kw: NDArray[np.float64]

    def __post_init__(self) -> None:
        if self.kw.ndim != 3 or self.kw.shape[2] != self.place.size:
            raise ValueError(f"kw must be (B, I, {self.place.size}), got {self.kw.shape}")
        if self.shift_kw.shape[::2] != self.kw.shape[:2]:
            raise ValueError(f"shift_kw {self.shift_kw.shape} must be (B, M, I) beside kw {self.kw.shape}")
        for array in (
            self.place,
            self.exceeded_with,
            self.kw,
            self.temperature_c,
            self.shift_kw,
            self.stretch,
            self.centre_kw,
            self.kvar_per_kw,
        ):
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
        found = np.full(self.shift_kw.shape, np.nan)
        log_tail = np.log(self.exceeded_with)
        for b, m, i in np.ndindex(*self.shift_kw.shape):
            table = self.kw[b, i]
            if np.isnan(table[0]):
                continue
            level_kw = float(level_kva[b] / np.hypot(1.0, self.kvar_per_kw[b, i]))
            shift, centre, stretch = float(self.shift_kw[b, m, i]), self.centre_kw[b, i], self.stretch[b, m, i]
            high, low = (float(centre + (end - shift - centre) / stretch) for end in (level_kw, -level_kw))
            delivered = _beyond(table, log_tail, high) if direction != "exported" else 0.0
            exported = _beyond(-table[::-1], log_tail, -low) if direction != "delivered" else 0.0
            found[b, m, i] = min(delivered + exported, 1.0)
        return found

    def highest_kva(self) -> float:
        """A level that no table reaches beyond. [kVA]"""
        away = np.nan_to_num(np.abs(self.kw - self.centre_kw[:, :, None])).max(axis=2)
        magnitude = np.abs(self.centre_kw)[:, None] + self.stretch * away[:, None] + np.abs(self.shift_kw)
        return 1.001 * float((magnitude * np.hypot(1.0, self.kvar_per_kw)[:, None]).max())

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
        kw = np.empty(score.shape)
        for i in range(score.shape[1]):
            table = self.kw[block, i]
            kw[:, i] = table[cell[:, i]] + place[:, i] * np.diff(table)[cell[:, i]]
        if self.temperature_c is not None:
            if temperature_c is None:
                raise ValueError("demand depends on temperature: give the temperature of each day")
            for i in range(score.shape[1]):
                shift, stretch = (
                    np.interp(temperature_c, self.temperature_c[block], table[block, :, i])
                    for table in (self.shift_kw, self.stretch)
                )
                kw[:, i] = self.centre_kw[block, i] + shift + stretch * (kw[:, i] - self.centre_kw[block, i])
        return kw


def margins(demand: GroupDemand, copula: DayCopula, *, years: YearsOfDays | None = None) -> Margins:
    """Tables of the quantiles of every interval.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    copula : DayCopula
        Its scores are what the tables run over.
    years : YearsOfDays or None
        Days whose temperatures the demand is asked at; None, or years without temperature, takes the distribution
        mixed over the record that the model was made with.

    Notes
    -----
    Where readings were rounded to the lattice, a table lies midway between those of the two roundings, as the
    predictive probability does. Between the points of a table demand is interpolated along the score, so a jump of
    the quantile is spread over 1/128 of a standard deviation: at most 2 % of a tail probability, and only where a
    level lies inside the jump. Beyond a probability of 1e-13 the tables are flat. The uncertainty of the response to
    temperature has its mean over the days of the class, not that of each day.
    """
    heavy = bool(np.isfinite(copula.degrees_of_freedom))
    reach = float(copula.score(np.array(SMALLEST)))
    reach = float(np.arcsinh(reach)) if heavy else reach
    place = np.linspace(-reach, reach, POINTS)
    exceeded_with = copula.tail(np.sinh(place) if heavy else place)
    warmth = None if years is None else _temperatures(demand, years)
    blocks, intervals = len(demand.blocks), len(demand.hours[0])
    kw = np.full((blocks, intervals, POINTS), np.nan)
    shift_kw = np.zeros((blocks, 1 if warmth is None else warmth.shape[1], intervals))
    stretch, centre_kw = np.ones(shift_kw.shape), np.zeros((blocks, intervals))
    kvar_per_kw = np.zeros((blocks, intervals))
    for b, row in enumerate(demand.hours):
        for i, hour in enumerate(row):
            if hour is None:
                continue
            kvar_per_kw[b, i] = np.tan(np.arccos(hour.power_factor))
            given = hour
            if years is not None and years.daily_c is not None and warmth is not None and hour.response is not None:
                shift_kw[b, :, i] = hour.response.shift_kw(warmth[b])
                stretch[b, :, i] = hour.response.stretch(warmth[b])
                days = years.daily_c[years.block == b]
                variance = float(hour.response.shift_variance_kw2(days).mean()) if days.size else 0.0
                given = hour.without_temperature(float(np.sqrt(variance)))
                centre_kw[b, i] = given.mean_kw()
            ends = [quantiles_of(whole, exceeded_with) for whole in (given.whole_down, given.whole_up)]
            kw[b, i] = 0.5 * (ends[0] + ends[1])
    return Margins(
        heavy=heavy,
        place=place,
        exceeded_with=exceeded_with,
        kw=kw,
        temperature_c=warmth,
        shift_kw=shift_kw,
        stretch=stretch,
        centre_kw=centre_kw,
        kvar_per_kw=kvar_per_kw,
    )


def quantiles_of(whole: LatticeMass, exceeded_with: NDArray[np.float64]) -> NDArray[np.float64]:
    """Lowest level that demand exceeds with at most each probability, (n,) float64. [- -> kW]"""
    above = np.append(np.cumsum(whole.mass[::-1])[::-1][1:], 0.0)
    place = np.searchsorted(-np.maximum.accumulate(above[::-1])[::-1], -exceeded_with, side="left")
    return np.asarray(whole.points_kw[np.minimum(place, above.size - 1)], dtype=np.float64)


def _temperatures(demand: GroupDemand, years: YearsOfDays) -> NDArray[np.float64] | None:
    """Temperatures, equally spaced over the days of each class, (B, M) float64; None where they play no part. [°C]"""
    responds = any(hour is not None and hour.response is not None for row in demand.hours for hour in row)
    if years.daily_c is None or not responds:
        return None
    rows = []
    for b in range(len(demand.blocks)):
        days = years.daily_c[years.block == b]
        low, high = (float(days.min()), float(days.max())) if days.size else (0.0, 0.0)
        rows.append(np.linspace(low, max(high, low + 1e-3), NODES))
    return np.array(rows)


def _beyond(table: NDArray[np.float64], log_tail: NDArray[np.float64], level_kw: float) -> float:
    """Probability above a level, its logarithm interpolated between the points of a rising table."""
    above = int(np.searchsorted(table, level_kw, side="right"))
    if above in (0, table.size):
        return 1.0 if above == 0 else 0.0
    part = (level_kw - table[above - 1]) / (table[above] - table[above - 1])
    return float(np.exp(log_tail[above - 1] + part * (log_tail[above] - log_tail[above - 1])))
