"""From the demand of every interval to days and years: copula, tables, weather and peaks of one group."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from loadsum.demand.hourly import Direction, GroupDemand
from loadsum.intake.hourclass import Calendar, DayBlock
from loadsum.intake.readings import TemperatureRecord
from loadsum.peak.chronology import draw_paths
from loadsum.peak.copula import DayCopula, choose_copula, weather_free_sums
from loadsum.peak.margins import Margins, margins
from loadsum.peak.passing import Passing
from loadsum.peak.paths import DemandPaths
from loadsum.peak.peaks import Peaks, peaks
from loadsum.peak.weather import YearsOfDays, calendar_years, record_years

FEWEST_DAYS = 20  # whole days of the group needed to fit a copula to its own sums


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DayAndYear:
    """What is needed to say anything about days and years of one group.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    copula : DayCopula
        Dependence between the intervals of a day.
    copula_scores : mapping of float to float
        Mean log density on left-out days by degrees of freedom; empty where no copula could be fitted. [nat]
    margins : Margins
        Tables of the demand of every interval.
    years : YearsOfDays
        Calendar years and their weather.
    metered_years : YearsOfDays or None
        Weather of the metered years, where a longer record stands in `years`.
    """

    demand: GroupDemand
    copula: DayCopula
    copula_scores: Mapping[float, float]
    margins: Margins
    years: YearsOfDays
    metered_years: YearsOfDays | None

    def peaks(
        self, levels_kva: Mapping[str, ArrayLike], rng: np.random.Generator, *, direction: Direction = "delivered"
    ) -> Peaks:
        """Daily and annual peaks, and how often the levels by name are passed."""
        return peaks(
            self.margins,
            self.copula,
            self.years,
            levels_kva=levels_kva,
            record_days=float(sum(np.unique(block.day).size for block in self.demand.blocks)),
            rng=rng,
            direction=direction,
            metered_years=self.metered_years,
        )

    def year_probability(self, level_kva: NDArray[np.float64], seed: int, direction: Direction) -> float:
        """Probability that a year passes the level of each class of days, days independent within class and weather."""
        passing = Passing(margins=self.margins, copula=self.copula, years=self.years, seed=seed, direction=direction)
        return passing.at(level_kva).year

    def paths(self, years: int, rng: np.random.Generator) -> DemandPaths:
        """Random years of coincident demand with the weather of the same days."""
        return draw_paths(self.demand, copula=self.copula, margins=self.margins, years=self.years, count=years, rng=rng)


def day_and_year(
    demand: GroupDemand,
    *,
    calendar: Calendar,
    calendar_years_metered: Sequence[int],
    metered: TemperatureRecord | None = None,
    record: TemperatureRecord | None = None,
    reference: Sequence[DayBlock] = (),
) -> DayAndYear:
    """Copula, tables and weather of one group.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group.
    calendar : Calendar
        Sorts days into the classes of the demand model.
    calendar_years_metered : sequence of int
        Calendar years to draw days from where no temperature is given.
    metered, record : TemperatureRecord or None
        Temperature of the metered years, and a longer record; the one given stands where the other is None.
    reference : sequence of DayBlock
        Readings of further metered customers; their sums stand in where nobody served is metered.
    """
    copula, scores = _copula(demand, reference)
    over = record if record is not None else metered
    years = None if over is None else record_years(calendar, over)
    if years is None:
        years = calendar_years(calendar, calendar_years_metered)
    tables = margins(demand, copula, years=years)
    before = None
    if record is not None and metered is not None and record is not metered and tables.temperature_c is not None:
        before = record_years(calendar, metered)
    return DayAndYear(
        demand=demand,
        copula=copula,
        copula_scores=scores,
        margins=tables,
        years=years,
        metered_years=before,
    )


def _copula(demand: GroupDemand, reference: Sequence[DayBlock]) -> tuple[DayCopula, Mapping[float, float]]:
    """The copula from the group's own sums; failing them, from the mean of whoever was metered."""
    sums: Sequence[NDArray[np.float64]] = weather_free_sums(demand)
    days = [block.day for block in demand.blocks]
    source = "normal scores of the observed sums"
    if _whole_days(sums, demand.covered()) < FEWEST_DAYS:
        sums = [_mean_of_present(block.kw) for block in demand.blocks]
        source = "normal scores of the mean of the customers present, because whole days of the group are few"
    if _whole_days(sums, demand.covered()) < FEWEST_DAYS and reference:
        sums, days = [_mean_of_present(block.kw) for block in reference], [block.day for block in reference]
        source = "normal scores of the mean of the metered customers that lend their class"
    if _whole_days(sums, demand.covered()) < FEWEST_DAYS:
        intervals = len(demand.hours[0])
        independent = DayCopula(
            correlation=np.repeat(np.eye(intervals)[None], len(demand.blocks), axis=0),
            degrees_of_freedom=np.inf,
            days=np.zeros(len(demand.blocks), dtype=np.int64),
            source="none: too few whole days, intervals are taken as independent; only the bounds can be relied on",
        )
        return independent, {}
    chosen, scores = choose_copula(sums, [(day + 3) // 7 for day in days])
    return replace(chosen, correlation=chosen.correlation.copy(), days=chosen.days.copy(), source=source), scores


def _whole_days(sums: Sequence[NDArray[np.float64]], covered: NDArray[np.bool_]) -> int:
    """Days on which every covered interval has a sum. [d]"""
    return sum(
        int(np.isfinite(block[:, there]).all(axis=1).sum())
        for block, there in zip(sums, covered, strict=True)
        if there.any()
    )


def _mean_of_present(kw: NDArray[np.float64]) -> NDArray[np.float64]:
    """Mean of the customers that have a reading, (D, I) float64; NaN where none has. [kW]"""
    known = np.isfinite(kw)
    count = known.sum(axis=0)
    total = np.where(known, kw, 0.0).sum(axis=0)
    return np.asarray(np.divide(total, count, out=np.full(count.shape, np.nan), where=count > 0), dtype=np.float64)
