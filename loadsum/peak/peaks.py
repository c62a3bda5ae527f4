"""Daily and annual peaks: how often a day or a year passes a level, and the levels passed rarely."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from loadsum.demand.hourly import Direction
from loadsum.intake.readings import read_only
from loadsum.peak.anyinterval import AnyInterval
from loadsum.peak.copula import DayCopula
from loadsum.peak.margins import Margins
from loadsum.peak.passing import Curve, Passing, Period
from loadsum.peak.weather import DAYS, YearsOfDays

DAILY_SHARES = (0.50, 0.10, 0.05, 0.01)
YEARS = (2, 5, 10, 20)
DAYS_INDEPENDENT = (
    "days independent within their class and temperature; where days cluster this overstates the annual probability,"
    " and where the record lacks weather that differs from year to year it understates it"
)


@dataclass(frozen=True, slots=True, kw_only=True)
class RareLevel:
    """Level that is passed with a stated probability per day or year, between levels that hold for any dependence.

    Parameters
    ----------
    probability : float
        Probability that a day, or a year, passes the level. [-]
    level_kva : float
        The level. [kVA]
    standard_error : float
        Of the simulation, in the probability at the level. [-]
    lowest_kva, highest_kva : float
        Levels at which the lower and the upper bound reach the probability: whatever the dependence between intervals,
        and between days, the level lies between them. [kVA]
    supported : bool
        Whether the record is long enough for a probability this small.
    shift_kva : float or None
        What the temperature record adds to the level that the metered years alone give. [kVA]
    """

    probability: float
    level_kva: float
    standard_error: float
    lowest_kva: float
    highest_kva: float
    supported: bool
    shift_kva: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LevelPeaks:
    """How often days and years pass one level.

    Parameters
    ----------
    name : str
        What the level is.
    level_kva : (B,) float64
        Level in each class of days. [kVA]
    day : tuple of AnyInterval
        Probability for a day of each class.
    days_per_year, days_standard_error : float
        Expected days per year that pass it, and the standard error of the simulation behind them. [d]
    year : float
        Probability that a year passes it, under `assumption`. [-]
    year_at_least, year_at_most : float
        Bounds that hold whatever the dependence. [-]
    """

    name: str
    level_kva: NDArray[np.float64]
    day: tuple[AnyInterval, ...]
    days_per_year: float
    days_standard_error: float
    year: float
    year_at_least: float
    year_at_most: float

    def __post_init__(self) -> None:
        read_only(self.level_kva)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Peaks:
    """Daily and annual peaks of a group.

    Parameters
    ----------
    copula : str
        Copula that joins the intervals of a day, in words.
    assumption : str
        What annual figures assume.
    direction : str
        Direction of flow that counts.
    levels : tuple of LevelPeaks
        Levels asked.
    daily, annual : tuple of RareLevel
        Levels passed on a stated share of days, and in 1 year of 2, 5, 10 and 20.
    time_of_peak : (B, I) float64
        Share of days of each class on which the interval holds the day's highest demand; NaN without readings. [-]
    weather_years : int
        Years of temperature behind the annual figures; 0 where demand does not depend on temperature. [-]
    """

    copula: str
    assumption: str
    direction: Direction
    levels: tuple[LevelPeaks, ...]
    daily: tuple[RareLevel, ...]
    annual: tuple[RareLevel, ...]
    time_of_peak: NDArray[np.float64]
    weather_years: int

    def __post_init__(self) -> None:
        read_only(self.time_of_peak)


def peaks(
    margins: Margins,
    copula: DayCopula,
    years: YearsOfDays,
    *,
    levels_kva: Mapping[str, ArrayLike],
    record_days: float,
    rng: np.random.Generator,
    direction: Direction = "delivered",
    metered_years: YearsOfDays | None = None,
    shares: Sequence[float] = DAILY_SHARES,
    one_year_in: Sequence[int] = YEARS,
) -> Peaks:
    """Daily and annual peaks.

    Parameters
    ----------
    margins : Margins
        Tables of the demand of every interval.
    copula : DayCopula
        Dependence between the intervals of a day.
    years : YearsOfDays
        Calendar years, with their temperatures where demand depends on them, over which the figures are averaged.
    levels_kva : mapping of str to float or (B,) float64
        Levels by name. [kVA]
    record_days : float
        Days of readings behind the model. [d]
    rng : numpy.random.Generator
        Source of randomness; every level is judged by the same draws.
    direction : {"both", "delivered", "exported"}
        Direction of flow that counts.
    metered_years : YearsOfDays or None
        The years metered, for the shift that a longer record makes.
    shares, one_year_in : sequence of float, of int
        Shares of days, and numbers of years, to find levels for. [-, a]

    Notes
    -----
    Figures are limited to covered hours: intervals without readings have no demand here, not a demand of zero.
    """
    seed = int(rng.integers(2**62))
    over = Passing(margins=margins, copula=copula, years=years, seed=seed, direction=direction)
    metered = None if metered_years is None else replace(over, years=metered_years)
    asked = []
    for name, given in levels_kva.items():
        level = np.broadcast_to(np.asarray(given, dtype=np.float64), margins.kw.shape[0]).copy()
        found = over.at(level)
        asked.append(
            LevelPeaks(
                name=name,
                level_kva=level,
                day=found.blocks,
                days_per_year=found.day * DAYS,
                days_standard_error=found.day_error * DAYS,
                year=found.year,
                year_at_least=found.year_at_least,
                year_at_most=found.year_at_most,
            )
        )
    yearly = [1.0 / number for number in one_year_in]
    curve = over.curve(largest_day=max(shares), smallest_year=min(yearly))
    before = None if metered is None else metered.curve(largest_day=max(shares), smallest_year=min(yearly))
    return Peaks(
        copula=copula.family,
        assumption=DAYS_INDEPENDENT,
        direction=direction,
        levels=tuple(asked),
        daily=tuple(_rare(curve, None, "day", p, p >= 1.0 / (record_days + 1.0)) for p in shares),
        annual=tuple(_rare(curve, before, "year", p, p >= 1.0 / (record_days / DAYS + 1.0)) for p in yearly),
        time_of_peak=time_of_peak(margins, copula, years, np.random.default_rng(seed)),
        weather_years=0 if margins.temperature_c is None else years.year.size,
    )


def time_of_peak(
    margins: Margins, copula: DayCopula, years: YearsOfDays, rng: np.random.Generator, *, days: int = 2000
) -> NDArray[np.float64]:
    """Share of drawn days on which each interval holds the day's highest demand, (B, I) float64; NaN without readings.

    Equal highest demands share the day.
    """
    shape = margins.kw.shape[:2]
    share = np.full(shape, np.nan)
    for b in range(shape[0]):
        known = np.isfinite(margins.kw[b, :, 0])
        if not known.any():
            continue
        warmth = None
        if years.daily_c is not None:
            of_class = years.daily_c[years.block == b]
            warmth = rng.choice(of_class, days) if of_class.size else None
        if margins.temperature_c is not None and warmth is None:
            continue
        kw = margins.demand_kw(b, copula.draw(b, days, rng), warmth)[:, known]
        top = kw == kw.max(axis=1, keepdims=True)
        share[b, known] = (top / top.sum(axis=1, keepdims=True)).mean(axis=0)
    return share


def _rare(curve: Curve, before: Curve | None, period: Period, probability: float, supported: bool) -> RareLevel:
    level = curve.level_kva(period, probability)
    return RareLevel(
        probability=probability,
        level_kva=level,
        standard_error=curve.standard_error(period, level),
        lowest_kva=curve.level_kva(f"{period}_at_least", probability),
        highest_kva=curve.level_kva(f"{period}_at_most", probability),
        supported=supported,
        shift_kva=None if before is None else level - before.level_kva(period, probability),
    )
