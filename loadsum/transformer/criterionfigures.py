"""Figures that criteria on whole years, temperatures and ageing are held against."""

from collections.abc import Sequence

import numpy as np

from loadsum.demand.hourly import Direction
from loadsum.peak.dayandyear import DayAndYear
from loadsum.study.thermalchecks import missing_thermal
from loadsum.study.unittables import AllowedLoading, Criterion, Transformer
from loadsum.transformer.life import QUANTILES, Life, LifeAtRating, life
from loadsum.transformer.loading import allowed_pu
from loadsum.transformer.selection import Figure, FigureSource
from loadsum.transformer.thermal import Guide, ThermalData
from loadsum.transformer.thermalkeys import ambient_of, data_for_other, other_guide, thermal_data

YEARS = 200  # drawn for temperatures
RAREST = 0.5 / QUANTILES  # smallest probability per year that the figures kept of them answer
WHOLE_YEAR = "this figure is of the whole year; no part of it is judged"
BOTH_WAYS = "temperature and ageing go by the loading in both directions; one alone is not judged"


def annual_probability(together: DayAndYear, allowed: Sequence[AllowedLoading], seed: int) -> FigureSource:
    """Probability that a year passes the loading of a criterion, days independent within their class and weather."""

    def figure(criterion: Criterion, rating_kva: float) -> Figure:
        if criterion.season != "all":
            return Figure(value=float("nan"), reason=WHOLE_YEAR)
        level = rating_kva * allowed_pu(together.demand, criterion.of, allowed)
        if np.isnan(level).any():
            return Figure(value=float("nan"), reason=f"the study file states no {criterion.of} for every season")
        direction: Direction = criterion.direction  # type: ignore[assignment]
        return Figure(value=together.year_probability(level, seed, direction))

    return figure


def missing_for_life(unit: Transformer) -> str:
    """Why temperatures are not computed; empty where they are."""
    if not unit.loading_guide:
        return "the study file names no loading guide and no thermal data"
    missing = missing_thermal(unit)
    return f"the study file leaves out {', '.join(missing)}" if missing else ""


def life_of(
    unit: Transformer,
    criteria: Sequence[Criterion],
    together: DayAndYear,
    ratings_kva: Sequence[float],
    rng: np.random.Generator,
) -> tuple[Life | None, Life | None]:
    """Temperatures and ageing of every rating, and by the other guide where asked for; from the same drawn years.

    None where thermal data, ambient or readings are missing.
    """
    data = thermal_data(unit)
    if data is None or not together.demand.covered().all():
        return None, None
    paths = together.paths(YEARS, rng)
    ambient, words = ambient_of(unit, paths)
    if ambient is None:
        return None, None
    limit = next((c.limit for c in criteria if c.quantity == "hot-spot temperature"), None)
    assumed = [
        words,
        f"thermal data the same per unit for every rating: {unit.thermal_source or 'no source given'}",
        f"{YEARS} years drawn",
        f"load is taken as constant within {paths.interval_min} min; what it does inside is hidden",
    ]
    if unit.derating_pu < 1.0:
        assumed.append(f"altitude and enclosure: {unit.derating_pu:g} of nameplate, stated")
    guide: Guide = unit.loading_guide  # type: ignore[assignment]

    def by(which: Guide, own: ThermalData, also: Sequence[str]) -> Life:
        return life(
            paths,
            ambient,
            ratings_kva,
            own,
            which,
            unit.paper,  # type: ignore[arg-type]
            derating_pu=unit.derating_pu,
            hot_spot_limit_c=limit,
            assumed=[*assumed, *also],
        )

    beside = None
    if unit.both_guides:
        said = f"winding exponent restated from {guide}: 2 m stands for y; constants k11, k21, k22 as stated"
        beside = by(other_guide(guide), data_for_other(data, guide), [said])
    return by(guide, data, ()), beside


def temperature_figures(lived: Life | None, missing: str) -> dict[str, FigureSource]:
    """Sources of figures for criteria on temperature and ageing."""
    reason = missing or "ambient temperature or readings for part of the year are missing"

    def at(rating_kva: float) -> LifeAtRating | None:
        return None if lived is None else next(row for row in lived.by_rating if row.rating_kva == rating_kva)

    def why_not(criterion: Criterion, row: LifeAtRating | None) -> str:
        if row is None:
            return reason
        if criterion.season != "all":
            return WHOLE_YEAR
        return BOTH_WAYS if criterion.direction != "both" else ""

    def hottest(criterion: Criterion, rating_kva: float) -> Figure:
        row = at(rating_kva)
        why = why_not(criterion, row)
        if not why and criterion.probability < RAREST:
            why = f"{YEARS} drawn years answer no probability per year below {RAREST:g}"
        if row is None or why:
            return Figure(value=float("nan"), reason=why)
        oil = criterion.quantity == "top-oil temperature"
        highest = row.top_oil_quantiles_c if oil else row.hot_spot_quantiles_c
        share = (np.arange(highest.size) + 0.5) / highest.size
        return Figure(value=float(np.interp(1.0 - criterion.probability, share, highest)))

    def aged(criterion: Criterion, rating_kva: float) -> Figure:
        row = at(rating_kva)
        why = why_not(criterion, row)
        return Figure(value=float("nan"), reason=why) if row is None or why else Figure(value=row.ageing_pu)

    return {"hot-spot temperature": hottest, "top-oil temperature": hottest, "ageing per year": aged}
