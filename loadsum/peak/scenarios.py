"""Load to come, side by side: what each scenario does to the exceedance of each rating, and when it first fails."""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from loadsum.demand.hourly import Direction, GroupDemand
from loadsum.demand.planned import Planned
from loadsum.peak.additions import AddedLoad, scaled_demand, with_added
from loadsum.peak.exceedance import exceedance_hours

GrowthOf = Literal["every reading", "number of customers", "customer class"]

Meets = Callable[[GroupDemand, float], bool | None]
"""Whether a rating meets every criterion; None where the data do not decide."""

Rebuild = Callable[[Sequence[Planned], Mapping[str, float]], GroupDemand]
"""Demand model of the group with further customers, and with the readings of some classes multiplied."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Growth:
    """Growth of the load there is.

    Parameters
    ----------
    pct_per_year : float
        Growth, compound. [%/a]
    of : {"every reading", "number of customers", "customer class"}
        What grows.
    customer_class : str
        Class whose readings, or whose number, grow; all when empty and the number grows.
    customers : int
        Number of customers that grows. [-]
    """

    pct_per_year: float
    of: GrowthOf = "every reading"
    customer_class: str = ""
    customers: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Pickup:
    """Load picked up after an outage, when heating and other devices that wait start together.

    Parameters
    ----------
    factor : float
        Demand in the first hours after the supply returns, over the demand it would have been. [-]
    duration_h : float
        How long. [h]
    outages_per_year : float
        Outages long enough for it; 0 where unknown, and then no hours per year are given. [1/a]
    """

    factor: float
    duration_h: float
    outages_per_year: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Scenario:
    """One future of the load.

    Parameters
    ----------
    name, note : str
        What it is called, and what is assumed, in words.
    customers : tuple of Planned
        Customers to come.
    loads : tuple of AddedLoad
        Devices, generation and transferred load to come.
    growth : Growth or None
        Growth of the load there is, which starts in `first_year`.
    first_year, horizon_years : int
        Year from which growth is counted, and how many years are looked at. [-, a]
    pickup : Pickup or None
        Pickup after an outage.
    """

    name: str
    note: str = ""
    customers: tuple[Planned, ...] = ()
    loads: tuple[AddedLoad, ...] = ()
    growth: Growth | None = None
    first_year: int = 0
    horizon_years: int = 0
    pickup: Pickup | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ScenarioAtRating:
    """One scenario at one rating.

    Parameters
    ----------
    rating_kva : float
        Nameplate rating. [kVA]
    level_kva : tuple of float
        Level whose exceedance is counted, by class of days. [kVA]
    hours_per_year, hours_low, hours_high : float or None
        Expected exceedance hours in the first year, and their interval; with a pickup, none. [h]
    highest_probability : float
        Largest probability of any demand interval; with a pickup, of an interval after an outage. [-]
    pickup_hours_per_outage : float or None
        Expected hours above the level in the hours after an outage that falls anywhere in the year. [h]
    pickup_hours_per_year : float or None
        The same times the outages per year. [h]
    meets : bool or None
        Whether every criterion is met in the first year; None where it is not decided.
    first_year : int or None
        First year of the horizon in which some criterion is not met; None where none is.
    """

    rating_kva: float
    level_kva: tuple[float, ...]
    hours_per_year: float | None
    hours_low: float | None
    hours_high: float | None
    highest_probability: float
    pickup_hours_per_outage: float | None
    pickup_hours_per_year: float | None
    meets: bool | None
    first_year: int | None


@dataclass(frozen=True, slots=True, kw_only=True)
class ScenarioResult:
    """One scenario at every rating.

    Parameters
    ----------
    name, note : str
        What it is called, and what is assumed.
    by_rating : tuple of ScenarioAtRating
        At each rating.
    mean_kw, highest_mean_kw : float
        Mean demand over the covered hours, and of the interval with most. [kW]
    """

    name: str
    note: str
    by_rating: tuple[ScenarioAtRating, ...]
    mean_kw: float
    highest_mean_kw: float


def scenario_demand(demand: GroupDemand, scenario: Scenario, *, rebuild: Rebuild | None, year: int = 0) -> GroupDemand:
    """Demand of the group in one year of a scenario.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group as it is.
    scenario : Scenario
        What is to come.
    rebuild : callable or None
        Makes the demand model with further customers; needed where customers come or a class grows.
    year : int
        Years after the first. [a]

    Raises
    ------
    ValueError
        The scenario needs ``rebuild`` and there is none, or names more outages than it can.
    """
    planned, whole = list(scenario.customers), 1.0
    factors: dict[str, float] = {}
    if scenario.growth is not None and year:
        grown = (1.0 + scenario.growth.pct_per_year / 100.0) ** year
        if scenario.growth.of == "every reading":
            whole = grown
        elif scenario.growth.of == "customer class":
            factors[scenario.growth.customer_class] = grown
        else:
            more = round(scenario.growth.customers * (grown - 1.0))
            if more > 0:
                planned.append(Planned(customer_class=scenario.growth.customer_class, count=more))
    if planned or factors:
        if rebuild is None:
            raise ValueError(f"scenario {scenario.name!r} adds customers or scales a class: give the means to rebuild")
        demand = rebuild(planned, factors)
    return with_added(scaled_demand(demand, whole), scenario.loads)


def compare(
    demand: GroupDemand,
    scenarios: Sequence[Scenario],
    ratings_kva: Sequence[float],
    *,
    share: Sequence[float],
    meets: Meets | None,
    rebuild: Rebuild | None = None,
    direction: Direction = "both",
) -> tuple[ScenarioResult, ...]:
    """Scenarios side by side.

    Parameters
    ----------
    demand : GroupDemand
        Demand model of the group as it is.
    scenarios : sequence of Scenario
        Scenarios in the order asked; put one without additions first to see the load as it is.
    ratings_kva : sequence of float
        Ratings to compare. [kVA]
    share : sequence of B float
        Allowed loading of each class of days. [pu of nameplate]
    meets : callable or None
        Whether a rating meets every criterion for a demand; None where the study has no criterion.
    rebuild : callable or None
        As for :func:`scenario_demand`.
    direction : {"both", "delivered", "exported"}
        Direction of flow that counts.
    """
    return tuple(_one(demand, scenario, ratings_kva, share, meets, rebuild, direction) for scenario in scenarios)


def _one(
    demand: GroupDemand,
    scenario: Scenario,
    ratings_kva: Sequence[float],
    share: Sequence[float],
    meets: Meets | None,
    rebuild: Rebuild | None,
    direction: Direction,
) -> ScenarioResult:
    by_year: dict[int, GroupDemand] = {}

    def in_year(year: int) -> GroupDemand:
        if year not in by_year:
            by_year[year] = scenario_demand(demand, scenario, rebuild=rebuild, year=year)
        return by_year[year]

    start = in_year(0)
    hours = start.hours_in_year()
    means = np.array([[np.nan if h is None else h.mean_kw() for h in row] for row in start.hours])
    rows = []
    for rating in ratings_kva:
        level = rating * np.asarray(share, dtype=np.float64)
        rows.append(_at_rating(start, scenario, rating, level, direction, meets, in_year))
    covered = np.isfinite(means)
    return ScenarioResult(
        name=scenario.name,
        note=scenario.note,
        by_rating=tuple(rows),
        mean_kw=float((means * hours)[covered].sum() / hours[covered].sum()),
        highest_mean_kw=float(np.nanmax(means)),
    )


def _at_rating(
    start: GroupDemand,
    scenario: Scenario,
    rating: float,
    level: np.typing.NDArray[np.float64],
    direction: Direction,
    meets: Meets | None,
    in_year: Callable[[int], GroupDemand],
) -> ScenarioAtRating:
    pickup = scenario.pickup
    counted = level if pickup is None else level / pickup.factor
    table = exceedance_hours(start, {"level": counted}, direction)
    found = table["level"]
    largest = found.largest_probability
    per_outage = None
    if pickup is not None:
        per_outage = pickup.duration_h * found.year.expected_h / table.covered_h
    judged = meets if pickup is None else None
    first = None
    if judged is not None and scenario.growth is not None and scenario.growth.pct_per_year > 0.0:
        first = _first_failure(in_year, scenario, rating, judged)
    elif judged is not None and judged(start, rating) is False:
        first = scenario.first_year or None
    return ScenarioAtRating(
        rating_kva=rating,
        level_kva=tuple(level.tolist()),
        hours_per_year=found.year.expected_h if pickup is None else None,
        hours_low=found.year.low_h if pickup is None else None,
        hours_high=found.year.high_h if pickup is None else None,
        highest_probability=0.0 if largest is None else largest.value,
        pickup_hours_per_outage=per_outage,
        pickup_hours_per_year=None
        if pickup is None or per_outage is None or pickup.outages_per_year == 0.0
        else per_outage * pickup.outages_per_year,
        meets=None if judged is None else judged(start, rating),
        first_year=first,
    )


def _first_failure(
    in_year: Callable[[int], GroupDemand], scenario: Scenario, rating: float, meets: Meets
) -> int | None:
    """First year in which a criterion is not met, by halving: exceedance never falls as load that is there grows."""
    if meets(in_year(scenario.horizon_years), rating) is not False:
        return None
    low, high = -1, scenario.horizon_years
    while high - low > 1:
        middle = (low + high) // 2
        if meets(in_year(middle), rating) is False:
            high = middle
        else:
            low = middle
    return scenario.first_year + high
