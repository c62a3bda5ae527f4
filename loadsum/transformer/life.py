"""Temperatures and ageing of every rating over drawn years."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from loadsum.peak.paths import DemandPaths
from loadsum.transformer.ageing import Paper
from loadsum.transformer.thermal import Guide, ThermalData
from loadsum.transformer.thermalyears import parts_of, run_figures, start_left_k, warm_up_days

QUANTILES = 50
DAYS = 365
# Largest hot spot that IEC 60076-7:2018, table 2, names: short-time emergency loading (read in a restatement). [°C]
LARGEST_NAMED_C = 160.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LifeAtRating:
    """What a year does to one rating.

    Parameters
    ----------
    rating_kva : float
        Nameplate rating. [kVA]
    hot_spot_quantiles_c, top_oil_quantiles_c : (50,) float64
        Highest temperature of a year, by share of years from low to high. [°C]
    ageing_quantiles_pu : (50,) float64
        Ageing of a year against normal ageing, by share of years. [-]
    hot_spot_yearly_high_c, top_oil_yearly_high_c : float
        Median over years of the year's highest. [°C]
    hot_spot_1_year_in_10_c, top_oil_1_year_in_10_c : float
        Highest of the year that one year in ten passes. [°C]
    ageing_pu : float
        Mean ageing of a year against normal ageing. [-]
    probability_above_limit : float or None
        Share of years whose hot spot passes the limit of the first hot-spot criterion; None without one. [-]
    """

    rating_kva: float
    hot_spot_quantiles_c: NDArray[np.float64]
    top_oil_quantiles_c: NDArray[np.float64]
    ageing_quantiles_pu: NDArray[np.float64]
    hot_spot_yearly_high_c: float
    top_oil_yearly_high_c: float
    hot_spot_1_year_in_10_c: float
    top_oil_1_year_in_10_c: float
    ageing_pu: float
    probability_above_limit: float | None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Life:
    """Temperatures and ageing of every rating.

    Parameters
    ----------
    model : str
        Loading guide and paper.
    years : int
        Years drawn. [-]
    hot_spot_limit_c : float or None
        Limit of the first hot-spot criterion. [°C]
    assumed : tuple of str
        What the figures rest on.
    by_rating : tuple of LifeAtRating
        One for each rating.
    """

    model: str
    years: int
    hot_spot_limit_c: float | None
    assumed: tuple[str, ...]
    by_rating: tuple[LifeAtRating, ...]


def life(
    paths: DemandPaths,
    ambient_c: NDArray[np.float64],
    ratings_kva: Sequence[float],
    data: ThermalData,
    guide: Guide,
    paper: Paper,
    *,
    derating_pu: float = 1.0,
    hot_spot_limit_c: float | None = None,
    assumed: Sequence[str] = (),
) -> Life:
    """Temperatures and ageing of every rating over whole drawn years, each continuous from its first hour to its last.

    Each year starts from the steady state of its mean loading. Its first days are warm-up and count for nothing: as
    many as it takes until the start cannot change the hot spot by more than 0.05 K.

    Parameters
    ----------
    paths : DemandPaths
        Whole years of coincident demand.
    ambient_c : (P, I) float64
        Ambient temperature of the same days. [°C]
    ratings_kva : sequence of float
        Ratings. [kVA]
    data : ThermalData
        Thermal data, the same per unit for every rating.
    guide, paper : str
        Loading guide and insulation paper.
    derating_pu : float
        Altitude and enclosure: rating that counts over nameplate. [pu]
    hot_spot_limit_c : float or None
        Limit of a hot-spot criterion. [°C]
    assumed : sequence of str
        What the caller assumed.
    """
    intervals = paths.kw.shape[1]
    years = paths.kw.shape[0] // DAYS
    load = paths.kva().reshape(years, DAYS * intervals)
    air = ambient_c.reshape(years, DAYS * intervals)
    if not np.all(np.isfinite(load)):
        raise ValueError("demand paths with intervals without readings have no temperature")
    warm_up = warm_up_days(data, guide)
    if warm_up >= DAYS:
        raise ValueError(f"an oil time constant of {data.oil_time_constant_min:g} min needs {warm_up} days of warm-up")
    parts = parts_of(paths.interval_min, data)
    found = run_figures(
        load,
        air,
        paths.interval_min,
        np.array(ratings_kva, dtype=np.float64) * derating_pu,
        data,
        guide,
        paper,
        warm_up=warm_up * intervals,
        parts=parts,
    )
    share = (np.arange(QUANTILES) + 0.5) / QUANTILES
    rows = []
    for r, rating in enumerate(ratings_kva):
        highest, highest_oil, ageing = found.hot_spot_c[:, r], found.top_oil_c[:, r], found.ageing_pu[:, r]
        rows.append(
            LifeAtRating(
                rating_kva=rating,
                hot_spot_quantiles_c=np.quantile(highest, share),
                top_oil_quantiles_c=np.quantile(highest_oil, share),
                ageing_quantiles_pu=np.quantile(ageing, share),
                hot_spot_yearly_high_c=float(np.median(highest)),
                top_oil_yearly_high_c=float(np.median(highest_oil)),
                hot_spot_1_year_in_10_c=float(np.quantile(highest, 0.9)),
                top_oil_1_year_in_10_c=float(np.quantile(highest_oil, 0.9)),
                ageing_pu=float(ageing.mean()),
                probability_above_limit=None
                if hot_spot_limit_c is None
                else float((highest > hot_spot_limit_c).mean()),
            )
        )
    beyond = [row.rating_kva for row in rows if row.hot_spot_1_year_in_10_c > LARGEST_NAMED_C]
    extrapolated = [
        f"{', '.join(f'{rating:g}' for rating in beyond)} kVA: hot spots above {LARGEST_NAMED_C:g} °C, the largest that"
        " IEC 60076-7 names for short emergencies, extrapolate the equations: they say no more"
        " than that the rating is too small"
    ]
    return Life(
        model=f"{guide}, {paper} paper",
        years=years,
        hot_spot_limit_c=hot_spot_limit_c,
        assumed=(
            *assumed,
            f"warm-up: the first {warm_up} d of each year; whether from no load or from rated load, the start then"
            f" changes the hot spot by no more than {start_left_k(data, guide, warm_up):.2g} K",
            f"ageing is integrated at {parts} parts of each {paths.interval_min} min, because the winding responds"
            f" within {data.winding_time_constant_min:g} min",
            *(extrapolated if beyond else ()),
        ),
        by_rating=tuple(rows),
    )
